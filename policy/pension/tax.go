package pension

import "fmt"

// Taxes are what the state takes beside contributions. Earnings, the benefit in a
// year of job loss and pensions are taxed together.
type Taxes struct {
	Income      IncomeTax
	Pensions    Parameter // share of pensions that is taxable, 0 to 1
	Interest    Parameter // rate on the return of assets, at least 0, below 1
	Consumption Parameter // rate on top of the price of consumption, at least 0
}

// NoTaxes returns taxes that take nothing.
func NoTaxes() Taxes { return Taxes{Pensions: Constant(1)} }

// IncomeTax is one of brackets and the power form, or neither where there is no
// income tax.
type IncomeTax struct {
	Brackets []Bracket
	Uprating Index // of the edges of brackets
	Power    *PowerTax
}

// Bracket is the rate on taxable income between From and the next bracket's From.
type Bracket struct {
	From Parameter // money in the base year; the first 0
	Rate Parameter // above −1, below 1
}

// PowerTax holds the parameters of [Power].
type PowerTax struct {
	Level         Parameter // λ > 0: share of average earnings that is kept
	Progressivity Parameter // τ, above −1 and below 1; 0 is proportional
}

// A Schedule is a tax on taxable income. It must be 0 up to 0 and have slopes
// below 1.
type Schedule interface {
	// Tax returns the tax on x.
	Tax(x float64) float64
	// Marginal returns its slope on one side of x.
	Marginal(x float64, side Side) float64
	// Kinks returns where it bends.
	Kinks() []float64
}

var bracketRate = limits{"above -1 and below 1", func(x float64) bool { return x > -1 && x < 1 }}

func (x Taxes) validate(f *faults) {
	x.Income.validate(f)
	x.Pensions.validate(f, "Taxes.Pensions", fraction)
	x.Interest.validate(f, "Taxes.Interest", belowOne)
	x.Consumption.validate(f, "Taxes.Consumption", notBelow0)
}

func (x IncomeTax) validate(f *faults) {
	if x.Power != nil {
		if len(x.Brackets) > 0 {
			f.add("Taxes.Income", "brackets and power", "one of them")
		}
		x.Power.Level.validate(f, "Taxes.Income.Power.Level", powerLevel)
		x.Power.Progressivity.validate(f, "Taxes.Income.Power.Progressivity", powerProgress)
		return
	}
	x.Uprating.validate(f, "Taxes.Income.Uprating")
	for i, b := range x.Brackets {
		at := fmt.Sprintf("Taxes.Income.Brackets[%d]", i)
		b.From.validate(f, at+".From", notBelow0)
		b.Rate.validate(f, at+".Rate", bracketRate)
	}
}

// schedules returns the schedule of every year, [T], nil where there is no tax.
func (x IncomeTax) schedules(r *resolver, wage []float64) []Schedule {
	all := make([]Schedule, len(wage))
	switch {
	case x.Power != nil:
		for t := range all {
			all[t] = newPower(r.at("Taxes.Income.Power.Level", x.Power.Level, t), r.at("Taxes.Income.Power.Progressivity", x.Power.Progressivity, t), wage[t])
		}
	case len(x.Brackets) > 0:
		uprating := r.levels("Taxes.Income.Uprating", x.Uprating)
		before := len(*r.f)
		for t := range all {
			from, rate := make([]float64, len(x.Brackets)), make([]float64, len(x.Brackets))
			for i, b := range x.Brackets {
				at := fmt.Sprintf("Taxes.Income.Brackets[%d]", i)
				from[i] = r.at(at+".From", b.From, t) * uprating[t]
				rate[i] = r.at(at+".Rate", b.Rate, t)
			}
			if len(*r.f) == before {
				if validateEdges(r.f, func(i int) string { return fmt.Sprintf("Taxes.Income.Brackets[%d].From", i) }, r.when(t), from); len(*r.f) > before {
					return all
				}
			}
			all[t] = newPiecewise(from, rate)
		}
	}
	return all
}

// powerReach is the least income, as a multiple of average earnings, up to which
// net income must rise with gross income under the power form.
const powerReach = 100

// checkMargin reports a year in which a crown more of earnings or pension would
// leave a household less. Contributions at rate κ up to a ceiling, a share δ of them
// deductible, leave (1−T′)·(1−δκ) − κ·(1−δ) of it.
func checkMargin(f *faults, s Schedule, year int, ceiling, reach float64, field string, κ, δ float64) {
	if κ == 0 {
		return
	}
	switch s := s.(type) {
	case *Piecewise:
		if takes := κ + s.steepest()*(1-δ*κ); !(takes < 1) {
			f.add(field, κ, fmt.Sprintf("less: with the highest tax rate of %d, %v, it takes %.6g of a further crown, want below 1", year, s.steepest(), takes))
		}
	case *Power:
		if top := s.reach(κ * (1 - δ) / (1 - δ*κ)); top < min(ceiling, reach) {
			f.add(field, κ, fmt.Sprintf("less, or more of it deductible: with the tax of %d a further crown above %.6g leaves less than nothing, want that not below the ceiling nor %d times average earnings", year, top, powerReach))
		}
	}
}
