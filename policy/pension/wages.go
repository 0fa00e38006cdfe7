package pension

import "fmt"

// Wages is the level of earnings by calendar year,
//
//	W_y = Average·Π_{k=BaseYear+1}^{y} (1 + g_k),   and its inverse before BaseYear.
type Wages struct {
	Average  float64   // average earnings in BaseYear, money
	Growth   Parameter // g, real, a year, above −1; by calendar year
	BaseYear int       // calendar year in whose money and wage level amounts are stated
}

// years that the base year and a cohort's life may lie apart, so that a slip of the
// pen does not become a loop without end.
const mostYears = 1000

func (w Wages) validate(f *faults) {
	if !(w.Average > 0) || !finite.ok(w.Average) {
		f.add("Wages.Average", w.Average, "positive and finite")
	}
	w.Growth.validate(f, "Wages.Growth", finiteRate)
	if t := w.Growth.Table; t != nil && t.By == BirthYear {
		f.add("Wages.Growth.Table.By", t.By.String(), "year: wages grow by calendar year")
	}
}

// A Profile says whose earnings by age a profile holds.
type Profile int

const (
	// CrossSection is what people of each age earn in the base year: a cohort's
	// earnings at age a are P_a·W_{b+a}/W_base.
	CrossSection Profile = iota
	// Lifetime is what the cohort of a reference birth year earns over its life,
	// growth included: another cohort's are P_a·W_{b+a}/W_{ref+a}.
	Lifetime
)

// CohortProfile returns a cohort's earnings by age, in real money, from those that
// the profile states, [t] from firstAge. reference is the birth year of a Lifetime
// profile. In form level the deviations of the shocks, being money, scale by the
// same ratios. Growth without a value for a year that is needed is a *FieldError.
func (w Wages) CohortProfile(profile []float64, is Profile, reference, birth, firstAge int) ([]float64, error) {
	var f faults
	if w.validate(&f); f != nil {
		return nil, f.err()
	}
	own := resolver{wages: w, cohort: Cohort{Birth: birth, FirstAge: firstAge, Survival: make([]float64, len(profile))}, f: &f}
	other := own
	other.cohort.Birth = reference
	if is == CrossSection {
		reference = w.BaseYear - firstAge
	}
	for _, b := range []int{birth, reference} {
		if off := b + firstAge - w.BaseYear; off > mostYears || off < -mostYears {
			f.add("Birth", b, fmt.Sprintf("within %d years of the base year %d", mostYears, w.BaseYear))
		}
	}
	if f != nil {
		return nil, f.err()
	}
	level := own.levels("Wages.Growth", WithWages())
	scaled := make([]float64, len(profile))
	if is == CrossSection {
		for t, p := range profile {
			scaled[t] = p * level[t]
		}
		return scaled, f.err()
	}
	stated := other.levels("Wages.Growth", WithWages())
	for t, p := range profile {
		scaled[t] = p * (level[t] / stated[t])
	}
	return scaled, f.err()
}
