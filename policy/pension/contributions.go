package pension

import "math"

// Contributions are what pays for pensions, as shares of contributory earnings
//
//	max(0, min(earnings, ceiling)).
//
// Earnings are gross: before the employee's part; the employer pays its part on
// top of them, and what it pays does not change them.
type Contributions struct {
	Employee   Parameter // rate, at least 0, below 1
	Employer   Parameter // rate, at least 0
	Pensioner  Parameter // rate on pensions up to the ceiling, at least 0, below 1
	Ceiling    Parameter // money in the base year, positive; +Inf where there is none
	Uprating   Index     // of the ceiling
	Deductible Parameter // share of the employee's and pensioner's part that lowers taxable income, 0 to 1
	OnBenefits bool      // the benefit in a year of job loss counts as earnings: both parts are paid on it and it is credited
}

// NoContributions returns contributions of nothing on earnings without a ceiling.
func NoContributions() Contributions { return Contributions{Ceiling: Constant(math.Inf(1))} }

func (c Contributions) validate(f *faults) {
	c.Employee.validate(f, "Contributions.Employee", belowOne)
	c.Employer.validate(f, "Contributions.Employer", notBelow0)
	c.Pensioner.validate(f, "Contributions.Pensioner", belowOne)
	c.Ceiling.validate(f, "Contributions.Ceiling", positive)
	c.Deductible.validate(f, "Contributions.Deductible", fraction)
	c.Uprating.validate(f, "Contributions.Uprating")
}

// capped returns max(0, min(x, ceiling)).
func capped(x, ceiling float64) float64 { return max(0, min(x, ceiling)) }

// cappedSlope returns its slope on one side of x.
func cappedSlope(x, ceiling float64, side Side) float64 {
	if side.past(x, 0) && !side.past(x, ceiling) {
		return 1
	}
	return 0
}
