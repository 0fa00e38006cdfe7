package pension

// A ConsumptionFloor is the least that anybody is left with: a household whose
// cash-on-hand m, all income and assets counted, is below Amount is given the rest,
//
//	max(0, Amount − m)
//
// (Hubbard, Skinner and Zeldes 1995, Journal of Political Economy 103).
type ConsumptionFloor struct {
	Amount   Parameter // money in the base year, at least 0
	Uprating Index
}

func (c *ConsumptionFloor) validate(f *faults) {
	if c == nil {
		return
	}
	c.Amount.validate(f, "Floor.Amount", notBelow0)
	c.Uprating.validate(f, "Floor.Uprating")
}

// Floor returns the cash-on-hand below which nobody is left in year t, in money;
// false where there is none. Cash-on-hand after the transfer is max(m, floor), flat
// below its only kink, the floor itself.
func (l *Law) Floor(t int) (floor float64, ok bool) { return l.years[t].floor, l.rules.Floor != nil }
