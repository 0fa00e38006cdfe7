package pension_test

import (
	"fmt"
	"testing"

	"cistern/policy/pension"
)

func byBirth(rows ...pension.Row) pension.Parameter {
	return pension.Parameter{Table: &pension.Table{By: pension.BirthYear, Rows: rows}}
}

// Published: US Social Security Administration, effect of claiming early or late:
// 5/9 % a month for 36 months before the full retirement age, 5/12 % a month beyond,
// 2/3 % a month after it.
func TestClaimFactorsPublished(t *testing.T) {
	full := func(age float64) pension.Rules {
		r := rules()
		r.Claim = pension.Claim{Statutory: constant(age), Earliest: constant(62), Latest: constant(70),
			Reduction: []pension.Band{{Years: 3, Rate: constant(12 * 5. / 900)}, {Years: inf(), Rate: constant(12 * 5. / 1200)}},
			Increase:  pension.FlatRate(12 * 2. / 300)}
		r.FinalEarnings = &pension.FinalEarnings{Rate: constant(1)}
		return r
	}
	l := law(t, full(67), cohort(makeham(0, 0.001, 1.1, 20, 100)))
	for i, want := range []float64{.70, .75, .80, .866666666667, .933333333333, 1, 1.08, 1.16, 1.24} {
		near(t, fmt.Sprintf("full age 67, claimed at %d", 62+i), l.Pension(42+i, 42+i, pension.Entitlement{}, 1), want, 1e-12)
	}
	l = law(t, full(66), cohort(makeham(0, 0.001, 1.1, 20, 100)))
	near(t, "full age 66, claimed at 62", l.Pension(42, 42, pension.Entitlement{}, 1), .75, 1e-14)
	near(t, "full age 66, claimed at 70", l.Pension(50, 50, pension.Entitlement{}, 1), 1.32, 1e-14)
	// Published, the same rule by months: full age 66 and 4 months, claimed at 62: 52
	// months early, 36·5/9 + 16·5/12 %; at 67, 8 months late.
	l = law(t, full(66+4./12), cohort(makeham(0, 0.001, 1.1, 20, 100)))
	near(t, "full age 66 and 4 months, claimed at 62", l.Pension(42, 42, pension.Entitlement{}, 1), 1-.2-16*5./1200, 1e-12)
	near(t, "full age 66 and 4 months, claimed at 67", l.Pension(47, 47, pension.Entitlement{}, 1), 1+8*2./300, 1e-12)
	if normal, earliest, latest := l.Claims(); normal != 47 || earliest != 42 || latest != 50 {
		t.Errorf("claims at years %d, %d, %d", normal, earliest, latest)
	}
}

// The claim age follows the birth year.
func TestClaimAgeByBirthYear(t *testing.T) {
	r := rules()
	age := byBirth(pension.Row{From: pension.Always, To: 1964, Value: 65}, pension.Row{From: 1965, To: 1974, Value: 66}, pension.Row{From: 1975, To: pension.Forever, Value: 67})
	r.Claim = pension.Claim{Statutory: age, Earliest: age, Latest: age}
	for birth, want := range map[int]int{1900: 45, 1964: 45, 1965: 46, 1974: 46, 1975: 47, 2050: 47} {
		c := cohort(makeham(0, 0.001, 1.1, 20, 100))
		c.Birth = birth
		if normal, _, _ := law(t, r, c).Claims(); normal != want {
			t.Errorf("born in %d: claim in year %d, want %d", birth, normal, want)
		}
	}
}

func TestClaimFaults(t *testing.T) {
	gap := byBirth(pension.Row{From: pension.Always, To: 1964, Value: 65}, pension.Row{From: 1970, To: pension.Forever, Value: 67})
	r := rules()
	r.Claim = pension.ClaimAt(100) // the last age will do
	law(t, r, cohort(makeham(0, 0.001, 1.1, 20, 100)))
	tests := []struct {
		name string
		c    pension.Claim
		want []string
	}{
		{"before the first age", pension.ClaimAt(20), []string{"Claim.Statutory: is 20, want above the first age, 20, and at most the last, 100 (birth year 1980)", "Claim.Earliest: above the first age", "Claim.Latest: above the first age"}},
		{"after the last", pension.ClaimAt(101), []string{"Claim.Statutory: at most the last, 100", "Claim.Earliest: at most the last", "Claim.Latest: at most the last"}},
		{"no age", pension.ClaimAt(0), []string{"Claim.Statutory: is 0, want an age from 1 to 150", "Claim.Earliest: an age", "Claim.Latest: an age"}},
		{"earliest too late", pension.Claim{Statutory: constant(65), Earliest: constant(66), Latest: constant(70)}, []string{"Claim.Earliest: is 66, want at most the statutory age, 65 (birth year 1980)"}},
		{"latest too early", pension.Claim{Statutory: constant(65.5), Earliest: constant(60), Latest: constant(65.75)}, []string{"Claim.Latest: is 65.75, want at least the whole age at which the statutory age is claimed, 66"}},
		{"gap", pension.Claim{Statutory: gap, Earliest: constant(60), Latest: constant(70)}, []string{"Claim.Statutory.Table.Rows[1]: without a gap"}},
		{"by calendar year", pension.Claim{Statutory: pension.Parameter{Table: &pension.Table{Rows: []pension.Row{{From: pension.Always, To: pension.Forever, Value: 65}}}}, Earliest: constant(60), Latest: constant(70)},
			[]string{"Claim.Statutory.Table.By: is year, want birth_year"}},
		{"reduction too large", pension.Claim{Statutory: constant(65), Earliest: constant(50), Latest: constant(70), Reduction: pension.FlatRate(0.08)},
			[]string{"Claim: is a factor of -0.2, want one of at least 0 at claim age 50"}},
		{"bands", pension.Claim{Statutory: constant(65), Earliest: constant(60), Latest: constant(70), Reduction: []pension.Band{{Years: inf(), Rate: constant(0.01)}, {Years: 0, Rate: constant(-1)}}},
			[]string{"Claim.Reduction[0].Years: without end only in the last band", "Claim.Reduction[1].Years: positive", "Claim.Reduction[1].Rate: at least 0"}},
		{"fair and more", pension.Claim{Statutory: constant(65), Earliest: constant(60), Latest: constant(70), Increase: pension.FlatRate(0.01), Fair: &pension.Fair{Rate: constant(-1)}},
			[]string{"Claim.Fair: one way", "Claim.Fair.Rate: above -1"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			r := rules()
			r.Claim, r.FinalEarnings = tt.c, &pension.FinalEarnings{Rate: constant(0.5)}
			_, err := r.For(cohort(makeham(0, 0.001, 1.1, 20, 100)))
			wantFaults(t, err, tt.want...)
		})
	}
}

// Claims at any age are worth the same under the fair factor, for every pillar that
// it applies to: the present value at 20, summed year by year here, of a household
// that is credited nothing after 45.
func TestFairClaimLeavesPensionWealth(t *testing.T) {
	r := rules()
	r.Claim = pension.Claim{Statutory: constant(65), Earliest: constant(60), Latest: constant(70), Fair: &pension.Fair{Rate: constant(0.02)}}
	r.CareerAverage = &pension.CareerAverage{Accrual: constant(0.01), Revaluation: pension.Index{Wages: constant(0.3)}, Indexation: pension.Index{Wages: constant(0.5)}}
	r.Points = &pension.Points{Cap: constant(inf()), Value: constant(0.01)}
	r.FinalEarnings = &pension.FinalEarnings{Rate: constant(0.2), Indexation: pension.AtRate(-0.01)}
	r.Flat = &pension.Flat{Amount: constant(1000), Uprating: pension.WithWages()}
	s := makeham(3e-4, 8e-6, 1.115, 20, 110)
	l := law(t, r, cohort(s))
	worth := func(e pension.Entitlement, final, flat float64, claim int) float64 {
		for t := 26; t < claim; t++ {
			e = l.Next(t, e, 0, false)
		}
		flow := make([]float64, len(s))
		for k := claim; k < len(s); k++ {
			p := l.Parts(claim, k, e, final)
			flow[k] = p.Pillars[0] + p.Pillars[1] + p.Final + flat*p.Flat
		}
		return pension.PresentValue(s, flow, 0.02)
	}
	for _, tt := range []struct {
		name        string
		e           pension.Entitlement
		final, flat float64
	}{{"career average", pension.Entitlement{0.3, 0}, 0, 0}, {"points", pension.Entitlement{0, 25}, 0, 0}, {"final earnings", pension.Entitlement{}, 40000, 0}, {"flat", pension.Entitlement{}, 0, 1}} {
		want := worth(tt.e, tt.final, tt.flat, 45)
		if !(want > 0) {
			t.Fatalf("%s is worth %v", tt.name, want)
		}
		for claim := 40; claim <= 50; claim++ {
			near(t, fmt.Sprintf("%s claimed at %d against 65", tt.name, 20+claim), worth(tt.e, tt.final, tt.flat, claim)/want, 1, 1e-12)
		}
	}
}

// With a pension that nothing changes but the fair factor, it is [FairFactor]; at a
// statutory age between two whole ones claims at these are as far from it as each
// other, in logarithms of worth.
func TestFairFactorOfARule(t *testing.T) {
	s := makeham(3e-4, 8e-6, 1.115, 20, 110)
	r := rules()
	r.FinalEarnings = &pension.FinalEarnings{Rate: constant(1), Indexation: pension.AtRate(0.005)}
	r.Claim = pension.Claim{Statutory: constant(65), Earliest: constant(62), Latest: constant(70), Fair: &pension.Fair{Rate: constant(0.03)}}
	l := law(t, r, cohort(s))
	for _, c := range []int{42, 45, 50} {
		near(t, "factor", l.Pension(c, c, pension.Entitlement{}, 1), pension.FairFactor(s, 0.03, 0.005, 45, c), 1e-13)
	}
	r.Claim.Statutory = constant(65.5)
	l = law(t, r, cohort(s))
	late := pension.FairFactor(s, 0.03, 0.005, 45, 46)
	product := l.Pension(45, 45, pension.Entitlement{}, 1) * l.Pension(46, 46, pension.Entitlement{}, 1)
	near(t, "half a year early times half a year late", product, 1, 1e-13)
	near(t, "half a year late squared", l.Pension(46, 46, pension.Entitlement{}, 1)*l.Pension(46, 46, pension.Entitlement{}, 1), late, 1e-13)
}
