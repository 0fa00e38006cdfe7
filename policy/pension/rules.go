package pension

import "fmt"

// Rules are the public rules as they are written down. Pillars and guarantees that
// are nil are not there. The zero Rules are not valid: begin from [NoRules].
type Rules struct {
	Wages           Wages
	Contributions   Contributions
	Claim           Claim
	CareerAverage   *CareerAverage
	Points          *Points
	NotionalAccount *NotionalAccount
	FundedAccount   *FundedAccount
	FinalEarnings   *FinalEarnings
	Flat            *Flat
	Minimum         *MinimumPension
	Assistance      *Assistance
	Floor           *ConsumptionFloor
	Taxes           Taxes
}

// NoRules returns rules that take and give nothing, with average earnings of 1 in 2000 that
// do not grow and a claim age of 65.
func NoRules() Rules {
	return Rules{Wages: Wages{Average: 1, BaseYear: 2000}, Contributions: NoContributions(), Claim: ClaimAt(65), Taxes: NoTaxes()}
}

// pillars returns the pillars that accrue an entitlement, in the order of their
// kinds.
func (r *Rules) pillars() []pillar {
	var p []pillar
	if r.CareerAverage != nil {
		p = append(p, r.CareerAverage)
	}
	if r.Points != nil {
		p = append(p, r.Points)
	}
	if r.NotionalAccount != nil {
		p = append(p, r.NotionalAccount)
	}
	if r.FundedAccount != nil {
		p = append(p, r.FundedAccount)
	}
	return p
}

// Validate reports every fault that shows without a cohort, each as a *FieldError.
func (r *Rules) Validate() error {
	var f faults
	r.Wages.validate(&f)
	r.Contributions.validate(&f)
	r.Claim.validate(&f)
	pillars := r.pillars()
	for _, p := range pillars {
		p.validate(&f)
	}
	if n := len(pillars); n > MaxPillars {
		names := ""
		for i, p := range pillars {
			if i > 0 {
				names += ", "
			}
			names += p.kind().String()
		}
		f.add("Pillars", names, fmt.Sprintf("at most %d that accrue an entitlement: each is a dimension of the household's problem", MaxPillars))
	}
	r.FinalEarnings.validate(&f)
	r.Flat.validate(&f)
	r.Minimum.validate(&f)
	r.Assistance.validate(&f)
	r.Floor.validate(&f)
	r.Taxes.validate(&f)
	return f.err()
}

// Cohort is the people whom rules are made concrete for.
type Cohort struct {
	Birth    int       // calendar year
	FirstAge int       // years, at the beginning of year t = 0
	Survival []float64 // [T] chance to live from t to t+1; the last is 0
	Return   float64   // market return of funded accounts before tax, real, a year, above −1
	Returns  []float64 // [T] that of each year, where it differs; nil: Return in all
}

func (c *Cohort) returnIn(t int) float64 {
	if c.Returns != nil {
		return c.Returns[t]
	}
	return c.Return
}

func (c *Cohort) validate(f *faults, w Wages) {
	if len(c.Survival) < 2 {
		f.add("Cohort.Survival", fmt.Sprintf("%d years", len(c.Survival)), "at least two years of life")
	}
	for t, s := range c.Survival {
		if !fraction.ok(s) {
			f.add(fmt.Sprintf("Cohort.Survival[%d]", t), s, fraction.want)
		}
	}
	if n := len(c.Survival); n > 0 && c.Survival[n-1] != 0 {
		f.add("Cohort.Survival[last]", c.Survival[n-1], "0: nobody outlives the last age")
	}
	if c.FirstAge < 0 || c.FirstAge > 150 {
		f.add("Cohort.FirstAge", c.FirstAge, "from 0 to 150")
	}
	if off := c.Birth - w.BaseYear; off > mostYears || off < -mostYears {
		f.add("Cohort.Birth", c.Birth, fmt.Sprintf("within %d years of the base year %d", mostYears, w.BaseYear))
	}
	if !finiteRate.ok(c.Return) {
		f.add("Cohort.Return", c.Return, finiteRate.want)
	}
	if n := len(c.Returns); c.Returns != nil && n != len(c.Survival) {
		f.add("Cohort.Returns", fmt.Sprintf("%d returns", n), fmt.Sprintf("%d, one for each year of life, or none", len(c.Survival)))
	}
	for t, r := range c.Returns {
		if !finiteRate.ok(r) {
			f.add(fmt.Sprintf("Cohort.Returns[%d]", t), r, finiteRate.want)
		}
	}
}
