package pension

// FinalEarnings pays a share of the last working year's earnings,
//
//	pension claimed in year c = factor(c)·Rate_c·(final earnings),
//
// whatever the career before; it needs no entitlement. Final earnings are in the
// money of the last working year.
type FinalEarnings struct {
	Rate       Parameter // at least 0
	Indexation Index     // of pensions in payment
}

// Flat pays every pensioner the same in a calendar year,
//
//	factor(c)·Amount_t, uprated,
//
// whenever it was claimed but for the factor of the claim age.
type Flat struct {
	Amount   Parameter // money a year in the base year, at least 0
	Uprating Index
}

func (p *FinalEarnings) validate(f *faults) {
	if p == nil {
		return
	}
	p.Rate.validate(f, "FinalEarnings.Rate", notBelow0)
	p.Indexation.validate(f, "FinalEarnings.Indexation")
}

func (p *Flat) validate(f *faults) {
	if p == nil {
		return
	}
	p.Amount.validate(f, "Flat.Amount", notBelow0)
	p.Uprating.validate(f, "Flat.Uprating")
}
