package pension_test

import (
	"math"
	"math/rand"
	"slices"
	"testing"

	"cistern/income"
	"cistern/policy"
	"cistern/policy/pension"
)

// dockers live from 25 to 85 and work until 65 at mean earnings of 30000 crowns.
func dockers(t *testing.T) policy.Household {
	t.Helper()
	chain, err := income.Rouwenhorst{Points: 5}.Discretise(income.AR1{Autocorrelation: 0.95, InnovationSD: 0.15})
	if err != nil {
		t.Fatal(err)
	}
	p := income.Process{FirstAge: 25, Profile: slices.Repeat([]float64{30000}, 40), Chain: chain, Initial: chain.Stationary(),
		Transitory: income.Transitory{SD: 0.2, Nodes: 21}, JobLoss: income.JobLoss{Probability: 0.05, BenefitRate: 0.5}}
	e, err := p.Build()
	if err != nil {
		t.Fatal(err)
	}
	u, err := policy.NewCRRA(2)
	if err != nil {
		t.Fatal(err)
	}
	return policy.Household{FirstAge: 25, Survival: income.Certain(25, 85), Utility: u, DiscountFactor: 0.96, Return: 0.03, Earnings: e,
		Pension: policy.Pension{ClaimAge: 65}}
}

// claiming makes rules the laws of dockers.
func claiming(t *testing.T, h *policy.Household, r pension.Rules) {
	t.Helper()
	c, err := law(t, r, pension.Cohort{Birth: 1990, FirstAge: 25, Survival: h.Survival, Return: h.Return}).Claimant(40, pension.Entitlement{}, pension.Entitlement{}, 30000)
	if err != nil {
		t.Fatal(err)
	}
	h.Laws = c
}

func solveRule(t *testing.T, h policy.Household) *policy.Rule {
	t.Helper()
	rule, err := policy.Solve(t.Context(), h, policy.DefaultOptions())
	if err != nil {
		t.Fatal(err)
	}
	return rule
}

// live follows a household whose luck is drawn by random and calls yield with every
// year's state, net income and consumption.
func live(rule *policy.Rule, random *rand.Rand, yield func(t int, s policy.State, income, consumption float64)) {
	h, e := rule.Household, pension.Entitlement{}
	draw := func(p []float64) (j int) {
		for u := random.Float64(); j < len(p)-1 && u >= p[j]; j++ {
			u -= p[j]
		}
		return j
	}
	z, assets := draw(h.Earnings.Distribution[0]), 0.0
	for t := range h.Years() {
		y := 0.0
		switch {
		case !h.Working(t):
			y = h.Laws.Pension(t, e, h.Earnings.Final(z))
		case random.Float64() < h.Earnings.JobLossIn(t).Probability:
			y, e = h.Laws.Work(t, e, h.Earnings.Benefit[t][z], false)
		default:
			y, e = h.Laws.Work(t, e, h.Earnings.At(t, z, h.Earnings.TransitorySD(t)*random.NormFloat64()), true)
		}
		m := (1+h.Return)*assets + y
		c, _ := rule.At(t, z, e, m)
		yield(t, policy.State{Node: z, Cash: m, Entitlement: e}, y, c)
		if assets = m - c; h.Moves(t) {
			z = draw(h.Earnings.Chain.Row(z))
		}
	}
}

// Under rules of every kind the rule is accurate at the states of a simulation:
// Euler-equation errors judged with a continuous shock are 10^−4.5 on average, as
// required of the solver; the maximum is next to a bend of the pension.
func TestRulesAreSolvedAccurately(t *testing.T) {
	if testing.Short() {
		t.Skip("the fine quadrature takes seconds")
	}
	taxed := func(r *pension.Rules) {
		r.Contributions = pension.NoContributions()
		r.Contributions.Employee, r.Contributions.Employer = constant(0.09), constant(0.09)
		r.Contributions.Ceiling, r.Contributions.Deductible, r.Contributions.OnBenefits = constant(60000), constant(1), true
		r.Contributions.Uprating = pension.WithWages()
		r.Taxes.Income.Brackets = []pension.Bracket{{From: constant(0), Rate: constant(0)}, {From: constant(10000), Rate: constant(0.2)}, {From: constant(40000), Rate: constant(0.35)}}
		r.Taxes.Income.Uprating = pension.WithWages()
	}
	for _, tt := range []struct {
		name string
		set  func(r *pension.Rules)
	}{
		{"career average", func(r *pension.Rules) {
			r.CareerAverage = &pension.CareerAverage{Accrual: constant(0.01), Revaluation: pension.WithWages()}
		}},
		{"notional account", func(r *pension.Rules) {
			r.NotionalAccount = &pension.NotionalAccount{Credit: constant(0.16), Return: pension.WithWages()}
		}},
		{"career average with a minimum pension", func(r *pension.Rules) {
			r.CareerAverage = &pension.CareerAverage{Accrual: constant(0.01), Revaluation: pension.WithWages()}
			r.Minimum = &pension.MinimumPension{Amount: constant(9000), Taper: constant(1), Uprating: pension.WithWages()}
		}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			h := dockers(t)
			r := rules()
			taxed(&r)
			tt.set(&r)
			claiming(t, &h, r)
			rule := solveRule(t, h)
			judge, random := policy.NewJudge(rule, true), rand.New(rand.NewSource(1))
			var errors []float64
			for range 15 {
				live(rule, random, func(year int, s policy.State, _, _ float64) {
					if e, atLimit := judge.ErrorIn(year, s); !atLimit {
						errors = append(errors, e)
					}
				})
			}
			slices.Sort(errors)
			mean := 0.0
			for _, e := range errors {
				mean += e / float64(len(errors))
			}
			n := len(errors)
			t.Logf("%d states: mean %.2f, 99th percentile %.2f, maximum %.2f", n, math.Log10(mean), math.Log10(errors[n*99/100]), math.Log10(errors[n-1]))
			if !(math.Log10(mean) <= -4.5) || !(math.Log10(errors[n-1]) <= -2) {
				t.Errorf("mean %.2f, maximum %.2f, want at most -4.5 and -2", math.Log10(mean), math.Log10(errors[n-1]))
			}
		})
	}
}
