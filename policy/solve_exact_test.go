package policy

import (
	"context"
	"errors"
	"fmt"
	"math"
	"testing"

	"cistern/income"
)

// certainHousehold has a known income by year and no pension: it works to the end.
func certainHousehold(t *testing.T, u Utility, y func(int) float64, years int, beta, r float64, limit Limit) Household {
	t.Helper()
	e := process{years: years, profile: y, form: income.Level}.build(t, 25)
	return Household{FirstAge: 25, Survival: alive(years), Utility: u, DiscountFactor: beta, Return: r, Limit: limit,
		Earnings: e, Pension: Pension{ClaimAge: 25 + years}}
}

func hump(i int) float64 {
	if i >= 40 {
		return 0.6
	}
	x := float64(i)
	return 1 + 0.03*x - 0.0006*x*x
}

// With certain income and the natural limit consumption is κ_t·(m_t + H_t), the
// path satisfies the Euler equation, and its present value is lifetime resources.
// Expected c_0 and c_T are derived from that closed form.
func TestCertainCRRANaturalLimit(t *testing.T) {
	for _, tt := range []struct{ gamma, c0, cT float64 }{
		{0.5, 1.754613219589, 0.454146871153},
		{2, 1.297219940881, 0.925267586335},
		{5, 1.211329512512, 1.058190336816},
	} {
		t.Run(fmt.Sprint("gamma=", tt.gamma), func(t *testing.T) {
			const years, r, beta = 61, 0.03, 0.96
			h := certainHousehold(t, family(t)(NewCRRA(tt.gamma)), hump, years, beta, r, Limit{Kind: LimitNatural})
			rule := solve(t, h, DefaultOptions())
			m, spent, resources, discount := 1.5, 0.0, 1.5-hump(0), 1.0
			var first, c float64
			for i := range years {
				c = rule.Consumption(i, 0, m)
				if i == 0 {
					first = c
				}
				spent += c * discount
				resources += hump(i) * discount
				discount /= 1 + r
				if i < years-1 {
					m = (1+r)*(m-c) + hump(i+1)
				}
			}
			if relative(first, tt.c0) > 1e-11 || relative(c, tt.cT) > 1e-9 {
				t.Errorf("c_0 = %.12f, c_T = %.12f; want %.12f, %.12f (derived: closed form)", first, c, tt.c0, tt.cT)
			}
			if relative(spent, resources) > 1e-10 {
				t.Errorf("present value of consumption %.12f, of resources %.12f", spent, resources)
			}
		})
	}
}

// With certain income and a limit of 0 consumption is the minimum over horizons
// of resources up to the horizon over its annuity factor: every later binding of
// the limit is a kink. Expected values derived from that lower envelope.
func TestCertainCRRALimitKinks(t *testing.T) {
	y := func(i int) float64 {
		if i >= 42 {
			return 0.5
		}
		x := float64(i)
		return 1 + 0.05*x - 0.0009*x*x
	}
	const years, r, beta = 61, 0.03, 0.94
	for _, tt := range []struct{ gamma, at4, at20 float64 }{
		{0.7, 1.818987353054, 3.678198749322},
		{2, 1.637794781603, 2.694664449157},
		{5, 1.566411618229, 2.252511021565},
	} {
		t.Run(fmt.Sprint("gamma=", tt.gamma), func(t *testing.T) {
			rule := solve(t, certainHousehold(t, family(t)(NewCRRA(tt.gamma)), y, years, beta, r, Limit{}), DefaultOptions())
			for _, p := range []struct{ m, want float64 }{{1, 1}, {4, tt.at4}, {20, tt.at20}} {
				if got := rule.Consumption(0, 0, p.m); relative(got, p.want) > 1e-9 {
					t.Errorf("c_0(%g) = %.12f, want %.12f (derived: lower envelope)", p.m, got, p.want)
				}
			}
			worst := 0.0
			for i := range 4000 {
				m := 0.2 + 0.005*float64(i)
				best, res, den := math.Inf(1), m, 1.0
				for h := 0; ; h++ {
					best = math.Min(best, res/den)
					if h == years-1 {
						break
					}
					res += y(h+1) * math.Pow(1+r, -float64(h+1))
					den += math.Pow(1+r, -float64(h+1)) * math.Pow(beta*(1+r), float64(h+1)/tt.gamma)
				}
				worst = math.Max(worst, relative(rule.Consumption(0, 0, m), best))
			}
			if worst > 1e-9 {
				t.Errorf("off the grid the rule misses the lower envelope by up to %.1e", worst)
			}
		})
	}
}

// Quadratic utility with βR = 1 and no limit: certainty equivalence, so the risky
// household consumes what its certain twin does at the same expected resources
// (derived; Hall 1978, Journal of Political Economy 86).
func TestQuadraticCertaintyEquivalence(t *testing.T) {
	chain := rouwenhorst(t, 5, 0.9, 10)
	e := process{years: 30, profile: constant(100), form: income.Level, chain: chain,
		transitory: income.Transitory{SD: 15, Nodes: 15}, jobLoss: income.JobLoss{Probability: 0.05, BenefitRate: 0.4}}.build(t, 30)
	h := Household{FirstAge: 30, Survival: alive(40), Utility: family(t)(NewQuadratic(1000)), DiscountFactor: 1 / 1.04, Return: 0.04,
		Limit: Limit{Kind: LimitNone}, Earnings: e, Pension: Pension{ClaimAge: 60, FinalEarningsRate: 0.5}}
	rule := solve(t, h, DefaultOptions())
	for year := range h.Years() {
		for j := range h.Nodes() {
			human := expectedIncome(h, year, j)
			annuity := 0.0
			for k := year; k < h.Years(); k++ {
				annuity += math.Pow(1.04, -float64(k-year))
			}
			for _, m := range []float64{-300, 0, 137, 900, 4000} {
				want := (m + human) / annuity
				if got := rule.Consumption(year, j, m); math.Abs(got-want) > 1e-8 {
					t.Fatalf("year %d node %d: c(%g) = %.10f, want %.10f", year, j, m, got, want)
				}
			}
		}
	}
}

// expectedIncome is the expected present value, in year t at node j, of the
// income of later years.
func expectedIncome(h Household, t, j int) float64 {
	nz := h.Nodes()
	next := make([]float64, nz)
	for k := h.Years() - 2; k >= t; k-- {
		now := make([]float64, nz)
		for i := range now {
			pay := func(n int) float64 {
				sum := next[n]
				values, weights := h.Income(k+1, n)
				for q, y := range values {
					sum += weights[q] * y
				}
				return sum
			}
			if !h.Moves(k) {
				now[i] = pay(i) / (1 + h.Return)
				continue
			}
			for n, p := range h.Earnings.Chain.Row(i) {
				now[i] += p * pay(n) / (1 + h.Return)
			}
		}
		next = now
	}
	return next[j]
}

// A bequest motive in the last year: u′(c) = βR·w·u′(R(m−c)+shift) gives
// c = (R·m + shift)/(R + (βRw)^(1/γ)) where that leaves an estate (derived).
func TestBequestLastYear(t *testing.T) {
	const gamma, beta, r, weight, shift = 2.5, 0.95, 0.02, 3.0, 0.7
	h := certainHousehold(t, family(t)(NewCRRA(gamma)), constant(1), 2, beta, r, Limit{})
	h.Bequest = Bequest{Weight: weight, Shift: shift}
	rule := solve(t, h, DefaultOptions())
	for _, m := range []float64{0.05, 0.3, 1, 4, 30} {
		want := math.Min(m, ((1+r)*m+shift)/(1+r+math.Pow(beta*(1+r)*weight, 1/gamma)))
		if got := rule.Consumption(1, 0, m); relative(got, want) > 1e-10 {
			t.Errorf("c(%g) = %.12f, want %.12f", m, got, want)
		}
	}
}

func TestSolveStops(t *testing.T) {
	ctx, cancel := context.WithCancelCause(context.Background())
	stop := errors.New("enough")
	o := DefaultOptions()
	o.OnAge = func(age int) {
		if age == 80 {
			cancel(stop)
		}
	}
	if _, err := Solve(ctx, riskyHousehold(t), o); !errors.Is(err, stop) {
		t.Errorf("got %v, want the cause of the stop", err)
	}
}

// A Solver's memory is reused: the second solution must not see the first.
func TestSolverReuse(t *testing.T) {
	s := NewSolver(10)
	ctx := context.Background()
	h := riskyHousehold(t)
	want := solve(t, h, DefaultOptions())
	other := h
	other.DiscountFactor, other.Limit = 0.99, Limit{Kind: LimitNatural}
	for _, x := range []Household{other, h} {
		got, err := s.Solve(ctx, x, DefaultOptions())
		if err != nil {
			t.Fatal(err)
		}
		if x.DiscountFactor != h.DiscountFactor {
			continue
		}
		for year := range want.Curves {
			for j := range want.Curves[year] {
				a, b := want.Curves[year][j], got.Curves[year][j]
				if fmt.Sprint(a) != fmt.Sprint(b) {
					t.Fatalf("year %d node %d differs on reused memory", year, j)
				}
			}
		}
	}
}
