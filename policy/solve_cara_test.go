package policy

import (
	"fmt"
	"math"
	"testing"

	"cistern/income"
)

// exponentialHousehold has exponential utility, every kind of income risk,
// mortality and no limit.
func exponentialHousehold(t *testing.T, form income.Form, chain *income.Chain) Household {
	t.Helper()
	shock, scale := 0.2, 1.0
	if form == income.Level {
		shock, scale = 3000, 20000
	}
	e := process{years: 35, form: form, profile: func(i int) float64 { return scale * (1 + 0.03*float64(i) - 0.0006*float64(i*i)) },
		chain: chain, transitory: income.Transitory{SD: shock, Nodes: 15},
		jobLoss: income.JobLoss{Probability: 0.05, BenefitRate: 0.5}}.build(t, 30)
	survival, err := income.Gompertz{ModalAge: 85, Dispersion: 9}.Survival(30, 95)
	if err != nil {
		t.Fatal(err)
	}
	return Household{FirstAge: 30, Survival: survival, Utility: family(t)(NewCARA(2 / scale)), DiscountFactor: 0.97, Return: 0.03,
		Limit: Limit{Kind: LimitNone}, Earnings: e, Pension: Pension{ClaimAge: 65, FinalEarningsRate: 0.4, Flat: 0.1 * scale}}
}

// With exponential utility and no limit consumption is m/A_t + g_t(z) for any
// chain and any income by age (derived: the intercept recursion of CARAChain). The
// rule is linear in cash-on-hand, so the endogenous grid must meet it to rounding
// at every node and beyond the grid: 1e-9 relative to the scale of consumption.
func TestSolveCARAChain(t *testing.T) {
	money := func(points int, sd float64) *income.Chain { return rouwenhorst(t, points, 0.95, sd) }
	for _, tt := range []struct {
		name  string
		form  income.Form
		chain *income.Chain
		scale float64
	}{
		{"log, 7 nodes", income.Log, money(7, 0.15), 1},
		{"level, 7 nodes", income.Level, money(7, 2000), 20000},
		{"level, no persistent risk", income.Level, income.Degenerate(), 20000},
	} {
		for _, method := range []Interpolation{Cubic, Linear} {
			t.Run(fmt.Sprint(tt.name, ", ", method), func(t *testing.T) {
				h := exponentialHousehold(t, tt.form, tt.chain)
				o := DefaultOptions()
				o.Interpolation = method
				rule, exact := solve(t, h, o), CARAChain(h.Utility.(CARA), h.Prospects())
				worst := 0.0
				for year := range rule.Curves {
					for j := range rule.Curves[year] {
						cash := rule.Curves[year][j].Cash
						states := append([]float64{cash[0] - tt.scale, 3 * cash[len(cash)-1]}, cash...)
						for _, m := range states {
							want := exact.Consumption(year, j, m)
							worst = math.Max(worst, math.Abs(rule.Consumption(year, j, m)-want)/(tt.scale+math.Abs(want)))
						}
					}
				}
				if worst > 1e-9 {
					t.Errorf("the rule misses the closed form by up to %.1e, relative", worst)
				}
			})
		}
	}
}

// The step of a certain exponential path is ln(βR)/α every year, and only the
// present value of income matters, not its timing (derived from the Euler
// equation).
func TestSolveCARACertainPath(t *testing.T) {
	const years, beta, r, alpha = 40, 0.96, 0.05, 0.0002
	early := func(i int) float64 { return 30000 }
	late := func(i int) float64 { // 1000 less in year 3, R^7 times as much more in year 10
		switch i {
		case 3:
			return 29000
		case 10:
			return 30000 + 1000*math.Pow(1+r, 7)
		}
		return 30000
	}
	var paths [2][]float64
	for k, y := range []func(int) float64{early, late} {
		h := certainHousehold(t, family(t)(NewCARA(alpha)), y, years, beta, r, Limit{Kind: LimitNone})
		rule := solve(t, h, DefaultOptions())
		m := 40000.0
		for i := range years {
			c := rule.Consumption(i, 0, m)
			paths[k] = append(paths[k], c)
			if i < years-1 {
				m = (1+r)*(m-c) + y(i+1)
			}
		}
	}
	for i, c := range paths[0] {
		if relative(paths[1][i], c) > 1e-9 {
			t.Errorf("year %d: consumption %.6f with early income, %.6f with late", i, c, paths[1][i])
		}
		if want := math.Log(beta*(1+r)) / alpha; i > 0 && math.Abs(c-paths[0][i-1]-want) > 1e-6 {
			t.Errorf("year %d: step %.8f, want %.8f", i, c-paths[0][i-1], want)
		}
	}
}
