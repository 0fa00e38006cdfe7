package pension

// An Index says how a real amount changes from one year to the next, when wages
// grow by g in real terms:
//
//	factor = (1 + Wages·g)·(1 + Rate).
//
// Wages 1 follows wages, 0 prices; Rate is a real rate on top: population growth in
// a notional return, minus a norm in the indexation of pensions, 1/(1+π) − 1 for
// amounts that are not uprated under inflation π.
type Index struct {
	Wages Parameter // weight on wage growth, 0 to 1; the rest is on prices
	Rate  Parameter // a year, above −1
}

// WithPrices returns the index that keeps an amount's purchasing power.
func WithPrices() Index { return Index{} }

// WithWages returns the index that keeps an amount's ratio to average earnings.
func WithWages() Index { return Index{Wages: Constant(1)} }

// AtRate returns the index that grows by a real rate a year.
func AtRate(rate float64) Index { return Index{Rate: Constant(rate)} }

func (x Index) validate(f *faults, field string) {
	x.Wages.validate(f, field+".Wages", fraction)
	x.Rate.validate(f, field+".Rate", finiteRate)
}
