package pension_test

import (
	"fmt"
	"math"
	"testing"

	"cistern/income"
	"cistern/policy/pension"
)

// Published, from memory: Dickson, Hardy and Waters, Actuarial Mathematics for Life
// Contingent Risks (2nd edition 2013), appendix D: Standard Ultimate Survival Model,
// μ_x = 0.00022 + 2.7e-6·1.124^x, annuities-due at 5 %, four decimals; and Bowers et
// al., Actuarial Mathematics (2nd edition 1997), Illustrative Life Table, μ_x = 0.0007
// + 0.00005·10^(0.04x), at 6 %, four decimals.
func TestAnnuityPublished(t *testing.T) {
	tests := []struct {
		a, b, c, rate float64
		age           int
		want          float64
	}{
		{0.00022, 2.7e-6, 1.124, 0.05, 20, 19.9664},
		{0.00022, 2.7e-6, 1.124, 0.05, 50, 17.0245},
		{0.00022, 2.7e-6, 1.124, 0.05, 60, 14.9041},
		{0.00022, 2.7e-6, 1.124, 0.05, 65, 13.5498},
		{0.00022, 2.7e-6, 1.124, 0.05, 70, 12.0083},
		{0.0007, 0.00005, math.Pow(10, 0.04), 0.06, 65, 9.8969},
	}
	for _, tt := range tests {
		got := pension.Annuity(makeham(tt.a, tt.b, tt.c, tt.age, 140), tt.rate, 0)
		near(t, fmt.Sprintf("annuity-due at %d and %v", tt.age, tt.rate), got, tt.want, 0.00006)
	}
}

// Derived: an independent program with hazard 3e-4 + 8e-6·1.115^x, to age 130,
// tolerance 1e-9.
func TestAnnuityAgainstAHazard(t *testing.T) {
	at := func(age int) []float64 { return makeham(3e-4, 8e-6, 1.115, age, 130) }
	for _, tt := range []struct{ rate, want float64 }{{0, 19.9795314808}, {0.016, 16.8195468770}, {0.02, 16.1562847938}, {0.03, 14.6772839782}} {
		near(t, fmt.Sprintf("annuity-due at 65 and %v", tt.rate), pension.Annuity(at(65), tt.rate, 0), tt.want, 1e-9)
	}
	for _, tt := range []struct {
		age          int
		rate, uplift float64
	}{{62, 0.02, .05964477}, {65, 0.02, .06597923}, {67, 0.02, .07100542}, {69, 0.02, .07682204},
		{62, 0.03, .0667110}, {65, 0.03, .07311393}, {67, 0.03, .07820265}, {69, 0.03, .08409730}} {
		got := pension.FairFactor(at(20), tt.rate, 0, tt.age-20, tt.age-19) - 1
		near(t, fmt.Sprintf("neutral uplift of a year at %d and %v", tt.age, tt.rate), got, tt.uplift, 1e-8)
	}
}

// Closed forms: with a constant chance s to live on, ä of n years is a geometric
// sum of s(1+i)/(1+r); growth at the discount rate leaves life expectancy; the
// certain annuity of n years at rate r is (1 − v^n)/(1 − v).
func TestAnnuityClosedForms(t *testing.T) {
	s := make([]float64, 400)
	for t := range s {
		s[t] = 0.97
	}
	q := 0.97 * 1.01 / 1.03
	near(t, "constant hazard", pension.Annuity(s, 0.03, 0.01), (1-math.Pow(q, 400))/(1-q), 1e-11)
	near(t, "growth at the rate", pension.Annuity(s, 0.03, 0.03), (1-math.Pow(0.97, 400))/0.03, 1e-11)
	v := 1 / 1.03
	near(t, "certain", pension.AnnuityCertain(20, 0.03, 0), (1-math.Pow(v, 20))/(1-v), 1e-12)
	near(t, "certain, growth at the rate", pension.AnnuityCertain(20, 0.03, 0.03), 20, 1e-12)
	ones := make([]float64, 400)
	for k := range ones {
		ones[k] = math.Pow(1.01, float64(k))
	}
	near(t, "present value of the payments", pension.PresentValue(s, ones, 0.03), pension.Annuity(s, 0.03, 0.01), 1e-10)
}

// Published, from memory: remaining years of life at 65, United States Life Tables,
// 2010 (National Vital Statistics Reports 63-7, Table A, one decimal): an annuity-due
// without interest pays them and half a year more, deaths being spread over the year.
func TestAnnuityOfPublishedLifeTables(t *testing.T) {
	tables := readLifeTables(t, "../../testdata/income/us_mortality_extract.csv")
	for _, tt := range []struct {
		table           string
		want, tolerance float64
	}{{"male 1940", 12.07, 0.0051}, {"female 1940", 13.57, 0.0051}, {"male 2010", 17.7, 0.051}, {"female 2010", 20.3, 0.051}} {
		s, err := tables[tt.table].Survival(65, 110)
		if err != nil {
			t.Fatal(err)
		}
		near(t, tt.table, pension.Annuity(s, 0, 0)-0.5, tt.want, tt.tolerance)
	}
}

// A fair factor leaves the present value of a claim unchanged, growth in payment
// counted: against sums made here, year by year.
func TestFairFactor(t *testing.T) {
	s := makeham(3e-4, 8e-6, 1.115, 20, 130)
	worth := func(claim int, amount float64) float64 {
		flow := make([]float64, len(s))
		for k := claim; k < len(s); k++ {
			flow[k] = amount * math.Pow(1.007, float64(k-claim))
		}
		return pension.PresentValue(s, flow, 0.025)
	}
	for _, to := range []int{40, 44, 45, 50} {
		f := pension.FairFactor(s, 0.025, 0.007, 45, to)
		near(t, fmt.Sprintf("worth of a claim %d years later", to-45), worth(to, f)/worth(45, 1), 1, 1e-13)
	}
}

// By hand: lend 100 and get back 55 and 60.5, which is 10 %; and a loan of many
// years at a rate drawn.
func TestInternalReturn(t *testing.T) {
	r, err := pension.InternalReturn([]float64{-100, 55, 60.5})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "two payments", r, 0.1, 1e-14)
	r, err = pension.InternalReturn([]float64{-100, 0, 0, 50})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "half of it lost over three years", r, math.Cbrt(0.5)-1, 1e-14)
	r, err = pension.InternalReturn([]float64{0, 0, -100, 55, 60.5, 0})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "begun later", r, 0.1, 1e-14)
	for _, flow := range [][]float64{{1, 2}, {-1, 2, -1}, {0, 0}, nil, {-1, math.NaN()}, {-1, inf()}} {
		if r, err := pension.InternalReturn(flow); err == nil {
			t.Errorf("%v has the return %v", flow, r)
		}
	}
}

func TestMortality(t *testing.T) {
	tables := readLifeTables(t, "../../configs/data/us_mortality_decennial.csv")
	m := pension.Mortality{Improvement: 0.01}
	for _, y := range []int{1940, 1950, 1960, 1970, 1980, 1990, 2000, 2010} {
		m.Years, m.Tables = append(m.Years, y), append(m.Tables, tables[fmt.Sprintf("female %d", y)])
	}
	s, err := m.Survival(1940, 0, 100)
	if err != nil {
		t.Fatal(err)
	}
	q := func(y, age int) float64 { return tables[fmt.Sprintf("female %d", y)].Q[age] }
	// The table of the year in which an age is reached, and between two tables the
	// geometric mean of their probabilities, by definition.
	near(t, "at 0 in 1940", s[0], 1-q(1940, 0), 1e-15)
	near(t, "at 30 in 1970", s[30], 1-q(1970, 30), 1e-15)
	near(t, "at 65 in 2005", s[65], 1-math.Sqrt(q(2000, 65)*q(2010, 65)), 1e-15)
	near(t, "at 90 in 2030", s[90], 1-q(2010, 90)*math.Pow(0.99, 20), 1e-15)
	near(t, "last age", s[100], 0, 0)
	q0, q1 := income.LifeTable{Q: []float64{0}}, income.LifeTable{Q: []float64{0.4}}
	none, err := pension.Mortality{Years: []int{2000, 2010}, Tables: []income.LifeTable{q0, q1}}.Survival(2003, 0, 1)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "between a table where nobody dies and one where four tenths do", none[0], 1-0.3*0.4, 1e-15)
	old, err := m.Survival(1880, 50, 100)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "before the first table", old[0], 1-q(1940, 50), 0)

	// Mortality having fallen, a cohort outlives the period table of its birth year.
	period, err := tables["female 1940"].Survival(0, 100)
	if err != nil {
		t.Fatal(err)
	}
	if c, p := pension.Annuity(s, 0, 0), pension.Annuity(period, 0, 0); !(c > p+5) {
		t.Errorf("the cohort of 1940 lives %v years, its period table says %v", c, p)
	}
	_, err = pension.Mortality{Years: []int{2000, 2000}, Tables: []income.LifeTable{{Q: []float64{0.1}}, {Q: []float64{2}}}, Improvement: 1}.Survival(1940, 0, 5)
	wantFaults(t, err, "Improvement: is 1", "Tables[0]: every age from 0 to 4", "Years[1]: above 2000", "Tables[1]: every age", "Tables[1].Q[0] (age 0): is 2")
}
