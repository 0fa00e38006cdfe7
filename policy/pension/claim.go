package pension

import (
	"fmt"
	"math"
)

// Claim says when pensions can be claimed and what claiming early or late does to
// them. A pension claimed at age c, the statutory age being S, is multiplied by
//
//	1 − Σ_i reduction_i·(years of S − c in band i)   if c < S,
//	1 + Σ_i increase_i·(years of c − S in band i)    if c > S,
//
// or by the actuarially fair factor. Accounts need neither: their annuity is
// reckoned at the claim age. Ages may have parts of years, and bands are measured
// from the statutory age exactly; households claim at whole ages.
type Claim struct {
	Statutory Parameter // age; usually by birth year
	Earliest  Parameter // age, at most Statutory
	Latest    Parameter // age, at least Statutory
	Reduction []Band    // from the statutory age downwards
	Increase  []Band    // and upwards
	Fair      *Fair     // in place of both
}

// A Band is the change of a pension a year for the next Years years.
type Band struct {
	Years float64   // positive; the last band may be +Inf
	Rate  Parameter // share of the pension a year, at least 0
}

// FlatRate returns the single band of a rate that holds for any number of years.
func FlatRate(rate float64) []Band { return []Band{{math.Inf(1), Constant(rate)}} }

// Fair makes late and early claims worth the same as one at the statutory age: the
// factor at age c is V(S)/V(c), V(x) the present value at the first age, survival
// counted, of what claiming at x without further credits would pay. Between whole
// ages ln V is linear.
type Fair struct {
	Rate Parameter // real discount rate a year, above −1; constant or by birth year
}

// ClaimAt returns the rule of a single claim age.
func ClaimAt(age float64) Claim {
	return Claim{Statutory: Constant(age), Earliest: Constant(age), Latest: Constant(age)}
}

func (c Claim) validate(f *faults) {
	c.Statutory.validate(f, "Claim.Statutory", someAge)
	c.Earliest.validate(f, "Claim.Earliest", someAge)
	c.Latest.validate(f, "Claim.Latest", someAge)
	byBirth(f, "Claim.Statutory", c.Statutory)
	byBirth(f, "Claim.Earliest", c.Earliest)
	byBirth(f, "Claim.Latest", c.Latest)
	if c.Fair != nil {
		if c.Reduction != nil || c.Increase != nil {
			f.add("Claim.Fair", "beside reduction or increase", "one way to change pensions")
		}
		c.Fair.Rate.validate(f, "Claim.Fair.Rate", finiteRate)
		byBirth(f, "Claim.Fair.Rate", c.Fair.Rate)
		return
	}
	validateBands(f, "Claim.Reduction", c.Reduction)
	validateBands(f, "Claim.Increase", c.Increase)
}

// byBirth refuses a table by calendar year where a cohort has one value.
func byBirth(f *faults, field string, p Parameter) {
	if p.Table != nil && p.Table.By != BirthYear {
		f.add(field+".Table.By", p.Table.By.String(), "birth_year: a cohort has one value")
	}
}

func validateBands(f *faults, field string, bands []Band) {
	for i, b := range bands {
		at := fmt.Sprintf("%s[%d]", field, i)
		if !(b.Years > 0) || math.IsInf(b.Years, 1) && i < len(bands)-1 {
			f.add(at+".Years", b.Years, "positive; without end only in the last band")
		}
		b.Rate.validate(f, at+".Rate", notBelow0)
	}
}

// A claims is the claim ages of one cohort.
type claims struct {
	statutory                float64 // age
	normal, earliest, latest int     // years t of the first pension
}

// claims resolves the claim ages. A statutory age with months is claimed at the
// first whole age that is not before it.
func (c Claim) claims(r *resolver) claims {
	at := func(field string, p Parameter) float64 { return r.at(field, p, 0) }
	s, low, high := at("Claim.Statutory", c.Statutory), at("Claim.Earliest", c.Earliest), at("Claim.Latest", c.Latest)
	if len(*r.f) > 0 { // no value for the birth year
		return claims{}
	}
	first, last := float64(r.cohort.FirstAge), float64(r.cohort.FirstAge+len(r.cohort.Survival)-1)
	born := fmt.Sprintf(" (birth year %d)", r.cohort.Birth)
	whole := func(age float64) int { return int(math.Ceil(age)) - r.cohort.FirstAge }
	out := claims{s, whole(s), whole(low), int(math.Floor(high)) - r.cohort.FirstAge}
	for _, a := range []struct {
		field string
		age   float64
	}{{"Claim.Statutory", s}, {"Claim.Earliest", low}, {"Claim.Latest", high}} {
		if a.age <= first || a.age > last {
			r.f.add(a.field, a.age, fmt.Sprintf("above the first age, %v, and at most the last, %v%s", first, last, born))
		}
	}
	if low > s {
		r.f.add("Claim.Earliest", low, fmt.Sprintf("at most the statutory age, %v%s", s, born))
	}
	if high < s || out.latest < out.normal {
		r.f.add("Claim.Latest", high, fmt.Sprintf("at least the whole age at which the statutory age is claimed, %d%s", out.normal+r.cohort.FirstAge, born))
	}
	return out
}

// factor returns what claiming in year t does to a pension, by the bands.
func (c Claim) factor(r *resolver, statutory float64, t int) float64 {
	late := float64(r.cohort.FirstAge+t) - statutory
	if late < 0 {
		return 1 - bandSum(r, "Claim.Reduction", c.Reduction, -late, t)
	}
	return 1 + bandSum(r, "Claim.Increase", c.Increase, late, t)
}

// bandSum returns the sum over bands, at the rates of those who claim in year t.
func bandSum(r *resolver, field string, bands []Band, years float64, t int) float64 {
	sum := 0.0
	for i, b := range bands {
		part := min(years, b.Years)
		if part <= 0 {
			break
		}
		sum += part * r.at(fmt.Sprintf("%s[%d].Rate", field, i), b.Rate, t)
		years -= part
	}
	return sum
}
