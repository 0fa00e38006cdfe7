package pension_test

import (
	"fmt"
	"math"
	"testing"

	"cistern/policy/pension"
)

// hump is earnings by age in money, [t] over 45 years, of the cohort of l.
func hump(l *pension.Law) []float64 {
	y := make([]float64, 45)
	for t := range y {
		y[t] = l.Wage(t) * (0.6 + 0.04*float64(t) - 0.0007*float64(t*t))
	}
	return y
}

// Derived (Samuelson 1958; Aaron 1966): where benefits are paid out of contributions
// in a steady state, contribution rate × contributory earnings = benefits, and each
// cohort earns the growth of the wage bill, (1+g)(1+n) − 1, on what it pays in, by
// whatever formula benefits are paid.
func TestPayAsYouGoSteadyState(t *testing.T) {
	s := mortal()
	for _, n := range []float64{0, 0.01, -0.005} {
		for _, tt := range []struct {
			name string
			set  func(*pension.Rules)
		}{
			{"career average, prices in payment", func(r *pension.Rules) {
				r.CareerAverage = &pension.CareerAverage{Accrual: constant(0.01), Revaluation: pension.WithWages()}
			}},
			{"points with a ceiling and a minimum", func(r *pension.Rules) {
				r.Points = &pension.Points{Cap: constant(1.1), Value: constant(0.008), Indexation: pension.WithWages()}
				r.Contributions.Ceiling, r.Contributions.Uprating = constant(40000), pension.WithWages()
				r.Minimum = &pension.MinimumPension{Amount: constant(10000), Taper: constant(0.8), Uprating: pension.WithWages()}
			}},
			{"final earnings and a flat pension", func(r *pension.Rules) {
				r.FinalEarnings = &pension.FinalEarnings{Rate: constant(0.3), Indexation: pension.Index{Wages: constant(0.5)}}
				r.Flat = &pension.Flat{Amount: constant(4000), Uprating: pension.WithWages()}
			}},
		} {
			name := fmt.Sprintf("%s, n = %v", tt.name, n)
			r := rules()
			tt.set(&r)
			l := law(t, r, cohort(s))
			before, err := l.SteadyState(hump(l), 45, n)
			if err != nil {
				t.Fatal(err)
			}
			if !(before.BalancingRate > 0.03 && before.BalancingRate < 0.5) {
				t.Fatalf("%s: balancing rate %v", name, before.BalancingRate)
			}
			r.Contributions.Employee = constant(before.BalancingRate / 2)
			r.Contributions.Employer = constant(before.BalancingRate / 2)
			l = law(t, r, cohort(s))
			after, err := l.SteadyState(hump(l), 45, n)
			if err != nil {
				t.Fatal(err)
			}
			near(t, name+": contributions less benefits", after.Contributions, after.Benefits, 1e-10)
			near(t, name+": rate times contributory earnings", before.BalancingRate*after.Contributory, after.Benefits, 1e-10)

			// The cohort's own life, apart from the cross-section.
			flow, alive := make([]float64, len(s)), 1.0
			var e pension.Entitlement
			y := hump(l)
			for k := range flow {
				if k < 45 {
					a := l.Account(k, pension.Receipts{Earnings: y[k], Employed: true}, 0)
					flow[k] = -alive * (a.Employee + a.Employer)
					e = l.Next(k, e, y[k], true)
				} else {
					a := l.Account(k, pension.Receipts{Pension: l.Pension(45, k, e, y[44]), Claimed: true}, 0)
					flow[k] = alive * (a.Pension + a.TopUp)
				}
				alive *= s[k]
			}
			internal, err := pension.InternalReturn(flow)
			if err != nil {
				t.Fatal(err)
			}
			near(t, name+": internal return", internal, 1.01*(1+n)-1, 1e-10)
		}
	}
}

// Derived: notional accounts whose return and divisor are at the growth of the wage
// bill, deaths shared, pay out in a steady state what is paid in, without anybody
// solving for a rate.
func TestNotionalAccountsBalance(t *testing.T) {
	const n = 0.004
	growth := 1.01*(1+n) - 1
	for _, indexation := range []pension.Index{pension.WithPrices(), pension.WithWages(), {Wages: constant(1), Rate: constant(1/1.016 - 1)}} {
		r := rules()
		r.Contributions.Employee, r.Contributions.Employer = constant(0.08), constant(0.08)
		r.NotionalAccount = &pension.NotionalAccount{Credit: constant(0.16), Return: pension.Index{Wages: constant(1), Rate: constant(n)},
			DivisorRate: constant(growth), Indexation: indexation, ShareDeaths: true}
		l := law(t, r, cohort(mortal()))
		s, err := l.SteadyState(hump(l), 45, n)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "benefits over contributions", s.Benefits/s.Contributions, 1, 1e-12)
		near(t, "balancing rate", s.BalancingRate, 0.16, 1e-12)
	}
}

// What a funded account takes and pays is not in the budget; pensioners' contributions
// are.
func TestSteadyStateWithoutFundedAccounts(t *testing.T) {
	r := rules()
	r.Contributions.Employee, r.Contributions.Pensioner = constant(0.1), constant(0.02)
	r.FundedAccount = &pension.FundedAccount{Credit: constant(0.1)}
	l := law(t, r, cohort(mortal()))
	s, err := l.SteadyState(hump(l), 45, 0)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "benefits", s.Benefits, 0, 1e-15)
	if !(s.Contributions > 1e-4) || s.Contributions > 0.02 {
		t.Errorf("contributions %v, want those of pensioners alone", s.Contributions)
	}
	if _, err := l.SteadyState(hump(l)[1:], 45, 0); err == nil {
		t.Error("earnings of too few years")
	}
	if _, err := l.SteadyState(hump(l), 45, -1); err == nil {
		t.Error("growth of -1")
	}
}

// Closed form: with a constant chance s to live on and growth n, ages are geometric in
// s/(1+n); average earnings of two ages by hand.
func TestAges(t *testing.T) {
	s := []float64{0.9, 0.9, 0.9, 0}
	w := pension.Ages(s, 0.05)
	q := 0.9 / 1.05
	for k := range w {
		near(t, "weight", w[k], math.Pow(q, float64(k))*(1-q)/(1-math.Pow(q, 4)), 1e-15)
	}
	near(t, "average", pension.AverageEarnings([]float64{100, 200}, s, 0.05), (100+200*q)/(1+q), 1e-12)
}
