package pension_test

import (
	"math"
	"testing"

	"cistern/policy/pension"
)

// By hand: average earnings of the cohort born in 1980, which is 20 in 2000: 30000 in
// 2020, a hundredth more or less for every year from it.
func TestWages(t *testing.T) {
	l := law(t, rules(), cohort(makeham(0, 0.001, 1.1, 20, 100)))
	for _, tt := range []struct {
		t    int
		want float64
	}{{20, 30000}, {21, 30300}, {22, 30603}, {19, 30000 / 1.01}, {0, 30000 / math.Pow(1.01, 20)}} {
		near(t, "average earnings", l.Wage(tt.t), tt.want, 1e-9)
	}
	// Growth of 2 % in 2010 and of 3 % in 2022 only: 2010 is the year after 2009.
	r := rules()
	r.Wages.Growth = pension.Parameter{Table: &pension.Table{Rows: []pension.Row{{From: pension.Always, To: 2009}, {From: 2010, To: 2010, Value: 0.02},
		{From: 2011, To: 2021}, {From: 2022, To: 2022, Value: 0.03}, {From: 2023, To: pension.Forever}}}}
	l = law(t, r, cohort(makeham(0, 0.001, 1.1, 20, 100)))
	for _, tt := range []struct {
		year int
		want float64
	}{{2009, 30000 / 1.02}, {2010, 30000}, {2021, 30000}, {2022, 30900}} {
		near(t, "average earnings", l.Wage(tt.year-2000), tt.want, 1e-9)
	}
}

// Derived: an index that mixes wages and prices with weight ω moves, under inflation
// π, by (1+π)·(ω·(1+g) + 1−ω) in money of the day, which is 1 + ω·g in real terms; an
// amount that stays the same in money of the day loses 1/(1+π) a year.
func TestIndexation(t *testing.T) {
	const g, π = 0.01, 0.04
	tests := []struct {
		name  string
		index pension.Index
		want  float64 // real, over ten years
	}{
		{"prices", pension.WithPrices(), 1},
		{"wages", pension.WithWages(), math.Pow(1+g, 10)},
		{"half and half", pension.Index{Wages: constant(0.5)}, math.Pow((1+π)*(0.5*(1+g)+0.5)/(1+π), 10)},
		{"none", pension.AtRate(1/(1+π) - 1), math.Pow(1/(1+π), 10)},
		{"wages less a norm", pension.Index{Wages: constant(1), Rate: constant(1/1.016 - 1)}, math.Pow((1+g)/1.016, 10)},
		{"wages, prices from 2030 on", pension.Index{Wages: pension.Parameter{Table: &pension.Table{Rows: []pension.Row{
			{From: pension.Always, To: 2029, Value: 1}, {From: 2030, To: pension.Forever, Value: 0}}}}}, math.Pow(1+g, 4)},
	}
	for _, tt := range tests {
		r := rules()
		r.Claim = pension.ClaimAt(45) // in 2025
		r.FinalEarnings = &pension.FinalEarnings{Rate: constant(0.5), Indexation: tt.index}
		l := law(t, r, cohort(makeham(0, 0.001, 1.1, 20, 100)))
		near(t, tt.name+", at once", l.Pension(25, 25, pension.Entitlement{}, 40000), 20000, 1e-11)
		near(t, tt.name+", ten years on", l.Pension(25, 35, pension.Entitlement{}, 40000), 20000*tt.want, 1e-9)
	}
	r := rules()
	r.Flat = &pension.Flat{Amount: constant(1000), Uprating: pension.WithWages()}
	l := law(t, r, cohort(makeham(0, 0.001, 1.1, 20, 100)))
	near(t, "a flat pension of the base year, thirty years on", l.Pension(45, 50, pension.Entitlement{}, 0), 1000*math.Pow(1.01, 30), 1e-9)
}

// By hand: two ages, two meanings of a profile.
func TestCohortProfile(t *testing.T) {
	w := rules().Wages
	stated := []float64{100, 200}
	got, err := w.CohortProfile(stated, pension.CrossSection, 0, 1990, 20) // 20 in 2010, 21 in 2011
	if err != nil {
		t.Fatal(err)
	}
	near(t, "cross-section, at 20", got[0], 100/math.Pow(1.01, 10), 1e-12)
	near(t, "cross-section, at 21", got[1], 200/math.Pow(1.01, 9), 1e-12)
	got, err = w.CohortProfile(stated, pension.Lifetime, 1980, 1990, 20)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "lifetime, ten years later, at 20", got[0], 100*math.Pow(1.01, 10), 1e-12)
	near(t, "lifetime, ten years later, at 21", got[1], 200*math.Pow(1.01, 10), 1e-12)
	w.Growth = pension.Parameter{Table: &pension.Table{Rows: []pension.Row{{From: 2015, To: pension.Forever, Value: 0.01}}}}
	_, err = w.CohortProfile(stated, pension.CrossSection, 0, 1990, 20)
	wantFaults(t, err, "Wages.Growth.Table: is without year 2014")
	_, err = w.CohortProfile(stated, pension.Lifetime, 1980, 99999, 20)
	wantFaults(t, err, "Birth: within 1000 years")
	w.Growth.Table.By = pension.BirthYear
	_, err = w.CohortProfile(stated, pension.CrossSection, 0, 1990, 20)
	wantFaults(t, err, "Wages.Growth.Table.By: year: wages grow by calendar year")
}
