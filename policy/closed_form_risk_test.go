package policy

import (
	"fmt"
	"math"
	"testing"

	"pgregory.net/rapid"
)

// Derived: the finite-horizon and infinite-horizon formulas evaluated apart to ten
// digits; R = 1.03, β = 0.96, α = 2, μ = 1, σ = 0.2, m = 2, y = 1.2.
func TestCARANormal(t *testing.T) {
	years := []int{1, 2, 5, 20, 60}
	for _, tt := range []struct {
		rho      float64
		want     [5]float64
		infinite float64
	}{
		{0, [5]float64{1.4904589144, 1.3290495658, 1.1779067104, 1.1069261805, 1.1523991551}, 1.2157149698},
		{0.5, [5]float64{1.5397199981, 1.3703897337, 1.1945110388, 1.1070073421, 1.1532433840}, 1.2180696140},
		{1, [5]float64{1.5889810818, 1.4408954467, 1.2604171036, 0.9437134916, 0.4959248259}, 0.0776875089},
	} {
		p := CARANormal{Utility: CARA{2}, Discount: 0.96, Gross: 1.03, Mean: 1, Autocorrelation: tt.rho, InnovationSD: 0.2}
		for i, n := range years {
			if got := p.Consumption(n, 2, 1.2); math.Abs(got-tt.want[i]) > 6e-11 {
				t.Errorf("ρ = %g, %d years ahead: %.11f, want %.10f", tt.rho, n, got, tt.want[i])
			}
		}
		got, err := p.Infinite(2, 1.2)
		if err != nil || math.Abs(got-tt.infinite) > 6e-11 {
			t.Errorf("ρ = %g, endless life: %.11f (%v), want %.10f", tt.rho, got, err, tt.infinite)
		}
		if far := p.Consumption(2000, 2, 1.2); math.Abs(far-got) > 1e-9 {
			t.Errorf("ρ = %g: 2000 years ahead %.11f, endless %.11f", tt.rho, far, got)
		}
	}
	if _, err := (CARANormal{Utility: CARA{2}, Discount: 1, Gross: 1}).Infinite(1, 1); err == nil {
		t.Error("an endless life at return 0 is no error")
	}
}

// Derived: T = 40 ahead, ρ = 0.9, evaluated apart to ten digits.
func TestCARANormalWithoutRisk(t *testing.T) {
	p := CARANormal{Utility: CARA{2}, Discount: 0.96, Gross: 1.03, Mean: 1, Autocorrelation: 0.9, InnovationSD: 0.2}
	if got := p.Consumption(40, 2, 1); math.Abs(got-1.0107282511) > 6e-11 {
		t.Errorf("with risk %.11f, want 1.0107282511", got)
	}
	p.InnovationSD = 0
	if got := p.Consumption(40, 2, 1); math.Abs(got-1.1313469875) > 6e-11 {
		t.Errorf("without risk %.11f, want 1.1313469875", got)
	}
}

// twoStates is an income of 0.1 or 1 with one outcome a node over the given years.
func twoStates(years int, income [2]float64, transition []float64, discount, gross float64) Prospects {
	var p Prospects
	for t := range years {
		p.Income = append(p.Income, [][]float64{{income[0]}, {income[1]}})
		p.Weight = append(p.Weight, [][]float64{{1}, {1}})
		if t > 0 {
			p.Transition = append(p.Transition, transition)
			p.Discount, p.Gross = append(p.Discount, discount), append(p.Gross, gross)
		}
	}
	return p
}

// Derived: the recursion evaluated apart to 12 digits.
func TestCARAChain(t *testing.T) {
	p := twoStates(31, [2]float64{0.1, 1}, []float64{0.5, 0.5, 0.075, 0.925}, 0.99, 1.01)
	r := CARAChain(CARA{1.5}, p)
	for j, want := range []float64{0.808741959145, 0.833966565350} {
		if math.Abs(r.Level[0][j]-want) > 6e-13 {
			t.Errorf("g_0(%d) = %.13f, want %.12f", j, r.Level[0][j], want)
		}
	}
	if got := 1 / r.Propensity[0]; math.Abs(got-26.807708221288) > 6e-12 {
		t.Errorf("A_0 = %.13f, want 26.807708221288", got)
	}
}

// anyProspects draws up to 8 years, 3 nodes and 3 outcomes, everything changing by
// year and node.
func anyProspects(t *rapid.T) Prospects {
	years, n := rapid.IntRange(2, 8).Draw(t, "years"), rapid.IntRange(1, 3).Draw(t, "nodes")
	shares := func(k int) []float64 {
		w := rapid.SliceOfN(rapid.Float64Range(0.01, 1), k, k).Draw(t, "weights")
		sum := 0.0
		for _, x := range w {
			sum += x
		}
		for i := range w {
			w[i] /= sum
		}
		return w
	}
	p := Prospects{Income: make([][][]float64, years), Weight: make([][][]float64, years)}
	for i := range years {
		for range n {
			k := rapid.IntRange(1, 3).Draw(t, "outcomes")
			p.Income[i] = append(p.Income[i], rapid.SliceOfN(rapid.Float64Range(0, 3), k, k).Draw(t, "income"))
			p.Weight[i] = append(p.Weight[i], shares(k))
		}
		if i == years-1 {
			break
		}
		var move []float64
		for range n {
			move = append(move, shares(n)...)
		}
		p.Transition = append(p.Transition, move)
		p.Discount = append(p.Discount, rapid.Float64Range(0.8, 1.05).Draw(t, "discount"))
		p.Gross = append(p.Gross, rapid.Float64Range(0.95, 1.1).Draw(t, "gross"))
	}
	return p
}

// ahead returns E f(c_{t+1}, z′, m′) for a household at a node with assets.
func (p Prospects) ahead(r LinearRule, t, node int, assets float64, f func(c float64) float64) float64 {
	n := len(p.Income[t])
	sum := 0.0
	for j, q := range p.Transition[t][node*n : node*n+n] {
		for k, y := range p.Income[t+1][j] {
			sum += q * p.Weight[t+1][j][k] * f(r.Consumption(t+1, j, p.Gross[t]*assets+y))
		}
	}
	return sum
}

// The rules for risk satisfy the Euler equation u′(c) = βR·E u′(c′) in every year,
// node and state, and spend everything in the last year, for chains, outcomes,
// discount factors and returns that change by year (derived: the conditions define
// the solution). The value is the expected sum of utilities.
func TestRiskRules(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := anyProspects(t)
		years, nodes := p.check()
		cash := rapid.Float64Range(-5, 20).Draw(t, "cash")
		for _, s := range []struct {
			u Utility
			r LinearRule
		}{
			{CARA{1.3}, CARAChain(CARA{1.3}, p)},
			{Quadratic{60}, QuadraticChain(Quadratic{60}, p)},
		} {
			for year := range years {
				for j := range nodes {
					c := s.r.Consumption(year, j, cash)
					if year == years-1 {
						if math.Abs(c-cash) > 1e-12 {
							t.Errorf("%s consumes %g of %g in the last year", s.u.Family(), c, cash)
						}
						continue
					}
					want := p.Discount[year] * p.Gross[year] * p.ahead(s.r, year, j, cash-c, s.u.Marginal)
					if got := s.u.Marginal(c); relative(got, want) > 1e-11 {
						t.Errorf("%s year %d node %d: u′ = %.15g, expected %.15g", s.u.Family(), year, j, got, want)
					}
				}
			}
		}
	})
}

func TestCARAValue(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := anyProspects(t)
		u := CARA{1.3}
		r := CARAChain(u, p)
		a := AnnuityFactors(p.Gross)
		c := r.Consumption(0, 0, 2)
		want := u.Value(c) + p.Discount[0]*p.ahead(r, 0, 0, 2-c, func(next float64) float64 { return CARAValue(u, a[1], next) })
		if got := CARAValue(u, a[0], c); relative(got, want) > 1e-12 {
			t.Errorf("V = %.15g, this year's utility and the discounted rest %.15g", got, want)
		}
	})
}

// One node and one outcome leave no risk: the rules for risk and those for certain
// income are derived apart and agree.
func TestRiskRulesWithoutRisk(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l := anyLifetime(t)
		p := Prospects{Discount: l.Discount, Gross: l.Gross}
		for i, y := range l.Income {
			p.Income, p.Weight = append(p.Income, [][]float64{{y}}), append(p.Weight, [][]float64{{1}})
			if i > 0 {
				p.Transition = append(p.Transition, []float64{1})
			}
		}
		for _, s := range []struct {
			name        string
			risk, plain LinearRule
		}{
			{"cara", CARAChain(CARA{2}, p), CertainCARA(CARA{2}, l)},
			{"quadratic", QuadraticChain(Quadratic{50}, p), CertainQuadratic(Quadratic{50}, l)},
		} {
			if got, want := s.risk.Consumption(0, 0, 3), s.plain.Consumption(0, 0, 3); math.Abs(got-want) > 1e-11*(1+math.Abs(want)) {
				t.Errorf("%s: %.15g with risk switched off, %.15g without", s.name, got, want)
			}
		}
	})
}

// A fine chain comes near the normal law: Rouwenhorst's binomial tails are thin, so
// consumption is too high by an amount that falls like 1/n (derived: both closed
// forms evaluated apart, T = 40).
func TestCARAChainApproachesNormal(t *testing.T) {
	normal := CARANormal{Utility: CARA{2}, Discount: 0.96, Gross: 1.03, Mean: 1, Autocorrelation: 0.9, InnovationSD: 0.2}
	exact := normal.Consumption(40, 2, 1)
	for _, tt := range []struct {
		points      int
		excess, tol float64
	}{{3, 6.1e-3, 5e-5}, {7, 2.2e-3, 5e-5}, {25, 5.6e-4, 5e-6}} {
		chain := rouwenhorst(t, tt.points, 0.9, 0.2)
		var p Prospects
		for i := range 41 {
			income, weight := make([][]float64, tt.points), make([][]float64, tt.points)
			for j, z := range chain.Nodes {
				income[j], weight[j] = []float64{1 + z}, []float64{1}
			}
			p.Income, p.Weight = append(p.Income, income), append(p.Weight, weight)
			if i > 0 {
				p.Transition = append(p.Transition, chain.Transition)
				p.Discount, p.Gross = append(p.Discount, 0.96), append(p.Gross, 1.03)
			}
		}
		got := CARAChain(CARA{2}, p).Consumption(0, tt.points/2, 2) - exact
		if math.Abs(got-tt.excess) > tt.tol {
			t.Errorf("%d points: chain less normal %.3e, want %.1e", tt.points, got, tt.excess)
		}
	}
}

// Derived: ratios of annuity sums evaluated apart to ten digits, R = 1.04.
func TestShockPropensity(t *testing.T) {
	for _, tt := range []struct {
		rho   float64
		years int
		want  float64
	}{
		{0, 1, 0.5098039216}, {0, 20, 0.0685385629}, {0, 40, 0.0480936313},
		{0.9, 1, 0.9509803922}, {0.9, 20, 0.4846961993}, {0.9, 40, 0.3563151243},
		{1, 1, 1}, {1, 40, 1}, {0.9, 0, 1},
	} {
		if got := ShockPropensity(tt.rho, 1.04, tt.years); math.Abs(got-tt.want) > 6e-11 {
			t.Errorf("ρ = %g, %d years ahead: ψ = %.11f, want %.10f", tt.rho, tt.years, got, tt.want)
		}
	}
	for _, tt := range []struct {
		work, life int
		want       float64
	}{{35, 70, 0.7377986197}, {20, 55, 0.5556598655}, {10, 45, 0.3479058218}, {1, 36, 0.0444697031}} {
		if got := PermanentPropensity(1.03, tt.work, tt.life); math.Abs(got-tt.want) > 6e-11 {
			t.Errorf("%d of %d years: ψ = %.11f, want %.10f", tt.work, tt.life, got, tt.want)
		}
	}
}

// The propensity to consume a shock is what the certainty-equivalent rule does with
// it: a shock to an AR(1) moves cash-on-hand and human wealth (derived).
func TestShockPropensityIsTheRule(t *testing.T) {
	const rho, gross, ahead = 0.9, 1.04, 20
	shocked := steady(ahead+1, func(t int) float64 { return 1 + 0.3*math.Pow(rho, float64(t)) }, 1/gross, gross)
	plain := steady(ahead+1, constant(1), 1/gross, gross)
	u := Quadratic{100}
	got := CertainQuadratic(u, shocked).Consumption(0, 0, 2.3) - CertainQuadratic(u, plain).Consumption(0, 0, 2)
	if want := 0.3 * ShockPropensity(rho, gross, ahead); math.Abs(got-want) > 1e-12 {
		t.Errorf("consumption moves by %.13f, want %.13f", got, want)
	}
}

// Derived: evaluated apart to 12 digits; returns 1.30 or 0.85 with even chances,
// β = 0.96. γ = 1 does not see the returns.
func TestReturnRiskCRRA(t *testing.T) {
	years := []int{1, 2, 10, 40}
	for _, tt := range []struct {
		gamma float64
		want  [4]float64
	}{
		{0.5, [4]float64{0.505114725847, 0.340175982828, 0.100490781989, 0.035667641082}},
		{3, [4]float64{0.504416242719, 0.339238839568, 0.099149351576, 0.033978971969}},
		{8, [4]float64{0.485832222322, 0.314626392764, 0.067384436052, 0.006327250867}},
	} {
		for i, n := range years {
			discount := steady(n+1, constant(0), 0.96, 1).Discount
			if got := ReturnRiskCRRA(CRRA{tt.gamma}, discount, []float64{1.3, 0.85}, []float64{0.5, 0.5})[0]; math.Abs(got-tt.want[i]) > 6e-13 {
				t.Errorf("γ = %g, %d years ahead: κ = %.13f, want %.12f", tt.gamma, n, got, tt.want[i])
			}
		}
	}
	k := ReturnRiskCRRA(CRRA{1}, steady(11, constant(0), 0.96, 1).Discount, []float64{3, 0.2}, []float64{0.5, 0.5})
	if math.Abs(k[0]-0.110570339393) > 6e-13 {
		t.Errorf("γ = 1: κ = %.13f, want 0.110570339393", k[0])
	}
}

// Derived: exp(γ·sd²/2) − 1 to ten digits.
func TestRiskCost(t *testing.T) {
	for _, tt := range []struct{ gamma, sd, want float64 }{
		{1, 0.032, 0.0005121311}, {4, 0.032, 0.0020500986}, {2, 0.2, 0.0408107742}, {5, 0.3, 0.2523227162},
	} {
		if got := RiskCost(CRRA{tt.gamma}, tt.sd); math.Abs(got-tt.want) > 6e-11 {
			t.Errorf("γ = %g, sd %g: λ = %.11f, want %.10f", tt.gamma, tt.sd, got, tt.want)
		}
	}
}

// Derived: evaluated apart to ten digits.
func TestJobLossTarget(t *testing.T) {
	for _, tt := range []struct {
		p    JobLossTarget
		want Target
	}{
		{JobLossTarget{CRRA{2}, 0.96, 1.03, 1.02, 0.05}, Target{26.1738523682, 1.2444063337, 0.0379566206}},
		{JobLossTarget{CRRA{2}, 0.90, 1.03, 1.03, 0.05}, Target{8.7733714992, 1.0000000000, 0.0836737873}},
	} {
		got, err := tt.p.Solve()
		if err != nil {
			t.Fatal(err)
		}
		for _, x := range [][2]float64{{got.Cash, tt.want.Cash}, {got.Consumption, tt.want.Consumption}, {got.Propensity, tt.want.Propensity}} {
			if math.Abs(x[0]-x[1]) > 6e-11 {
				t.Errorf("%+v: %s, want %+v", tt.p, fmt.Sprintf("%.11f %.11f %.11f", got.Cash, got.Consumption, got.Propensity), tt.want)
				break
			}
		}
	}
	for _, p := range []JobLossTarget{
		{CRRA{2}, 1.2, 0.9, 1.02, 0.05},    // would never spend
		{CRRA{2}, 0.99, 1.06, 1.0, 0.0001}, // too patient for the growth of income
	} {
		if got, err := p.Solve(); err == nil {
			t.Errorf("%+v: target %+v, want an error", p, got)
		}
	}
}

// At the target the Euler equation of the endless problem holds and assets stay
// where they are (derived: the conditions that define it).
func TestJobLossTargetStays(t *testing.T) {
	p := JobLossTarget{CRRA{3}, 0.93, 1.03, 1.02, 0.04}
	x, err := p.Solve()
	if err != nil {
		t.Fatal(err)
	}
	kappa := 1 - math.Pow(p.Discount*p.Gross, 1.0/3)/p.Gross
	a := x.Cash - x.Consumption
	if m := p.Gross/p.Growth*a + 1; relative(m, x.Cash) > 1e-12 {
		t.Errorf("cash-on-hand moves from %g to %g", x.Cash, m)
	}
	want := p.Discount * p.Gross * ((1-p.Probability)*p.Utility.Marginal(p.Growth*x.Consumption) +
		p.Probability*p.Utility.Marginal(kappa*p.Gross*a))
	if got := p.Utility.Marginal(x.Consumption); relative(got, want) > 1e-12 {
		t.Errorf("u′ = %.15g, expected %.15g", got, want)
	}
}

// What a household faces with risk and what its certain twin faces agree in the
// mean: human wealth averaged over the first year's nodes is that of mean income
// (derived: expectations commute with discounting). Mortality is in the discount
// factors.
func TestHouseholdProspects(t *testing.T) {
	h := riskyHousehold(t)
	start := h.Earnings.Process
	start.Initial = []float64{0.7, 0.2, 0.1, 0, 0} // far from stationary, so that the transitions matter
	e, err := start.Build()
	if err != nil {
		t.Fatal(err)
	}
	h.Earnings = e
	p, l := h.Prospects(), h.Lifetime()
	if years, nodes := p.check(); years != h.Years() || nodes != h.Nodes() {
		t.Errorf("%d years and %d nodes, want %d and %d", years, nodes, h.Years(), h.Nodes())
	}
	if got, want := dot(h.Earnings.Distribution[0], p.HumanWealth()[0]), l.HumanWealth()[0]; relative(got, want) > 1e-12 {
		t.Errorf("mean human wealth %.15g, of mean income %.15g", got, want)
	}
	for i, s := range h.Survival[:h.Years()-1] {
		if want := 0.96 * s; l.Discount[i] != want || p.Discount[i] != want || l.Gross[i] != 1.03 || p.Gross[i] != 1.03 {
			t.Errorf("year %d: discount factors %g and %g, returns %g and %g, want %g and 1.03", i, l.Discount[i], p.Discount[i], l.Gross[i], p.Gross[i], want)
		}
	}
}
