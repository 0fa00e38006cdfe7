package pension

// Interest returns the return on assets in year t after tax, r·(1 − τ). Losses and
// interest paid on debt lower the tax at the same rate, so that one return holds for
// assets of either sign.
func (l *Law) Interest(t int, r float64) float64 { return r * (1 - l.years[t].interest) }

// Spending returns what consumption worth c before tax costs in year t, (1 + τ)·c.
func (l *Law) Spending(t int, consumption float64) float64 {
	return consumption * (1 + l.years[t].consumption)
}

// Bought returns the consumption before tax that an outlay pays for in year t,
// outlay/(1 + τ); the rest of the outlay is the tax.
func (l *Law) Bought(t int, outlay float64) float64 { return outlay / (1 + l.years[t].consumption) }
