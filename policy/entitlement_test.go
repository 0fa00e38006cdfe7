package policy

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"cistern/income"
)

// careerAverage is laws for tests: a pension of rate times every year's earnings up
// to a ceiling, revalued by growth a year until the claim, plus a flat amount and no
// less than least. Net income is what net makes of gross earnings and pensions; nil:
// all of it.
type careerAverage struct {
	rate, ceiling, growth float64
	flat, least           float64
	net                   func(float64) float64
	bends                 []float64 // where net bends
	final                 float64   // share of final earnings paid on top
	low, high             float64   // entitlements to begin with
}

func (l careerAverage) Pillars() int { return 1 }

func (l careerAverage) Initial() (low, high Entitlement) {
	return Entitlement{l.low}, Entitlement{l.high}
}

func (l careerAverage) spendable(x float64) float64 {
	if l.net == nil {
		return x
	}
	return l.net(x)
}

func (l careerAverage) Work(_ int, e Entitlement, earnings float64, _ bool) (income float64, next Entitlement) {
	e[0] = e[0]*(1+l.growth) + l.rate*math.Min(earnings, l.ceiling)
	return l.spendable(earnings), e
}

func (l careerAverage) Pension(t int, e Entitlement, final float64) float64 {
	return l.spendable(l.GrossPension(t, e, final))
}

func (l careerAverage) GrossPension(_ int, e Entitlement, final float64) float64 {
	return math.Max(l.least, l.flat+e[0]+l.final*final)
}

func (l careerAverage) Bends(int) (x [MaxPillars][]float64) {
	if l.least > 0 {
		x[0] = []float64{l.least - l.flat}
	}
	for _, y := range l.bends {
		x[0] = append(x[0], y-l.flat)
	}
	return x
}

// noLaws take nothing and give what Pension does.
type noLaws struct{ paid Pension }

func (l noLaws) Pillars() int                        { return 0 }
func (l noLaws) Initial() (_, _ Entitlement)         { return }
func (l noLaws) Bends(int) (_ [MaxPillars][]float64) { return }
func (l noLaws) Work(_ int, e Entitlement, earnings float64, _ bool) (float64, Entitlement) {
	return earnings, e
}
func (l noLaws) Pension(_ int, _ Entitlement, final float64) float64 {
	return float64(l.paid.FinalEarningsRate*final) + l.paid.Flat
}
func (l noLaws) GrossPension(t int, e Entitlement, final float64) float64 {
	return l.Pension(t, e, final)
}

// referenceAccrual is the reference problem of the speed comparison at size Q: size S
// with 12 entitlement nodes. A fortieth of earnings up to 3 is credited a year, and
// the pension is 0.1 plus half the entitlement; here the half is credited.
func referenceAccrual(tb testing.TB, gamma float64) (Household, Options) {
	tb.Helper()
	h, o := referenceHousehold(tb, "S", gamma)
	h.Laws = careerAverage{rate: 0.5 / 40, ceiling: 3, flat: 0.1}
	nodes := make([]float64, 12)
	for k := range nodes {
		nodes[k] = 1.5 * float64(k) / 11
	}
	o.Interpolation, o.EntitlementNodes[0] = Linear, nodes
	return h, o
}

// accruingHousehold is like the built-in scenario quayside, with a pension of 1 % of
// every year's earnings up to 60,000 crowns and 3,000 more in place of its own.
func accruingHousehold(tb testing.TB, shocks int) Household {
	tb.Helper()
	chain, err := income.Rouwenhorst{Points: 7}.Discretise(income.AR1{Autocorrelation: 0.95, InnovationSD: 0.15})
	if err != nil {
		tb.Fatal(err)
	}
	profile := make([]float64, 40)
	for i := range profile {
		x := float64(i)
		profile[i] = math.Exp(10 + 0.042*x - 0.00072*x*x)
	}
	e, err := income.Process{FirstAge: 25, Profile: profile, Chain: chain, Initial: chain.Stationary(),
		Transitory: income.Transitory{SD: 0.2, Nodes: shocks}, JobLoss: income.JobLoss{Probability: 0.04, BenefitRate: 0.5}}.Build()
	if err != nil {
		tb.Fatal(err)
	}
	survival, err := income.Gompertz{ModalAge: 88, Dispersion: 10}.Survival(25, 100)
	if err != nil {
		tb.Fatal(err)
	}
	return Household{FirstAge: 25, Survival: survival, Utility: CRRA{2}, DiscountFactor: 0.96, Return: 0.03, Earnings: e,
		Pension: Pension{ClaimAge: 65}, Laws: careerAverage{rate: 0.01, ceiling: 60000, flat: 3000}}
}

// Laws that do nothing but pay the plain household's pension give its rule to the
// bit.
func TestLawsThatDoNothing(t *testing.T) {
	for _, method := range []Interpolation{Linear, Cubic} {
		h, o := riskyHousehold(t), DefaultOptions()
		o.Interpolation = method
		want := solve(t, h, o)
		h.Laws = noLaws{h.Pension}
		got := solve(t, h, o)
		if got.Updates != want.Updates {
			t.Errorf("%v: %d updates, want %d", method, got.Updates, want.Updates)
		}
		for year := range want.Curves {
			for j := range want.Curves[year] {
				if fmt.Sprint(got.Curves[year][j]) != fmt.Sprint(want.Curves[year][j]) {
					t.Fatalf("%v: year %d node %d differs", method, year, j)
				}
			}
		}
	}
}

// An entitlement that the pension does not depend on changes nothing (derived: it
// appears in no budget). The persistent part alone moves income, so that both rules
// see the same kinks.
func TestEntitlementIrrelevant(t *testing.T) {
	for _, tt := range []struct {
		name    string
		utility Utility
		method  Interpolation
		limit   Limit
	}{
		{"linear", CRRA{2}, Linear, Limit{}},
		{"linear, stone_geary", StoneGeary{2, 0.05}, Linear, Limit{}},
		{"linear, cara", CARA{1}, Linear, Limit{Amount: 0.3}},
		{"cubic", CRRA{2}, Cubic, Limit{}},
		{"cubic, natural limit", CRRA{1}, Cubic, Limit{Kind: LimitNatural}},
		{"cubic, cara", CARA{1}, Cubic, Limit{Kind: LimitNone}},
		{"cubic, strong cara", CARA{300}, Cubic, Limit{Amount: 0.3}},
		{"cubic, quadratic", Quadratic{20}, Cubic, Limit{Amount: 0.1}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			h, o := riskyHousehold(t), DefaultOptions()
			p := h.Earnings.Process
			p.Transitory, p.JobLoss = income.Transitory{Nodes: 1}, income.JobLoss{Probability: 0.05, BenefitRate: 0.5}
			e, err := p.Build()
			if err != nil {
				t.Fatal(err)
			}
			h.Earnings, h.Utility, h.Limit, h.Pension = e, tt.utility, tt.limit, Pension{ClaimAge: 65, Flat: 0.4}
			o.Interpolation = tt.method
			want := solve(t, h, o)
			h.Laws = idle{careerAverage{rate: 0.01, ceiling: 2}}
			got := solve(t, h, o)
			if n := got.Entitlements[20].Len(); n != o.EntitlementPoints {
				t.Fatalf("%d entitlement nodes, want %d", n, o.EntitlementPoints)
			}
			for year := range want.Curves {
				for j := range h.Nodes() {
					for _, m := range []float64{0.03, 0.3, 0.77, 1.9, 5.3, 20} {
						for _, x := range []float64{0, 0.043, 0.11, 0.3} {
							c, d := got.At(year, j, Entitlement{x}, m)
							if relative(c, want.Consumption(year, j, m)) > 1e-11 || math.Abs(d-want.Propensity(year, j, m)) > 1e-9 {
								t.Fatalf("year %d node %d: c(%g, %g) = %.14f, propensity %.12f, want %.14f, %.12f", year, j, x, m, c, d, want.Consumption(year, j, m), want.Propensity(year, j, m))
							}
						}
					}
				}
			}
		})
	}
}

// idle pays 0.4 whatever has accrued.
type idle struct{ careerAverage }

func (idle) Pension(int, Entitlement, float64) float64 { return 0.4 }

// The table of a year gives what the rule does.
func TestTableWithEntitlement(t *testing.T) {
	h := accruingHousehold(t, 5)
	limited, none := h, h
	limited.Limit = Limit{Amount: 2000}
	none.Utility, none.Limit = CARA{1e-4}, Limit{Kind: LimitNone}
	for _, h := range []Household{h, limited, none} {
		for _, method := range []Interpolation{Linear, Cubic} {
			o := DefaultOptions()
			o.AssetPoints, o.Interpolation, o.EntitlementPoints = 60, method, 6
			rule := solve(t, h, o)
			for _, year := range []int{0, 17, 38, 39, 55, 75} {
				var node []uint8
				var cash, accrued []float64
				for j := range h.Nodes() {
					for _, x := range []float64{-10, 0, 200, 1234.5, 5000, 9000, 1e5} {
						for m := 10.0; m < 2e6; m *= 1.37 {
							node, cash, accrued = append(node, uint8(j)), append(cash, m), append(accrued, x)
						}
					}
				}
				tb := rule.Table(year)
				c, d := make([]float64, len(cash)), make([]float64, len(cash))
				tb.Evaluate(node, cash, c, d, accrued)
				for i := range c {
					want, slope := rule.At(year, int(node[i]), Entitlement{accrued[i]}, cash[i])
					if relative(c[i], want) > 1e-11 || math.Abs(d[i]-slope) > 1e-8 {
						t.Fatalf("%v year %d node %d: c(%g, %g) = %.14g, propensity %.12g, the rule has %.14g, %.12g", method, year, node[i], accrued[i], cash[i], c[i], d[i], want, slope)
					}
				}
				for j := range h.Nodes() {
					top := math.Inf(1)
					for k := range rule.Entitlements[year].Len() {
						top = math.Min(top, rule.Curves[year][j*rule.Entitlements[year].Len()+k].Top())
					}
					if tb.Top(j) != top {
						t.Errorf("year %d node %d: top %g, want %g", year, j, tb.Top(j), top)
					}
				}
			}
		}
	}
}

// Continued from a rule of the same household, years are solved as they were.
func TestContinueWithEntitlement(t *testing.T) {
	h, o := accruingHousehold(t, 5), DefaultOptions()
	o.AssetPoints = 40
	whole := solve(t, h, o)
	for _, from := range []int{20, 39, 60} {
		got, err := Continue(t.Context(), h, o, whole, from, 5)
		if err != nil {
			t.Fatal(err)
		}
		for year := 5; year < h.Years(); year++ {
			for i := range whole.Curves[year] {
				a, b := &got.Curves[year][i], &whole.Curves[year][i]
				if !slices.Equal(a.Cash, b.Cash) || !slices.Equal(a.Consumption, b.Consumption) || !slices.Equal(a.Left, b.Left) || !slices.Equal(a.Right, b.Right) {
					t.Fatalf("from %d: year %d, curve %d differs", from, year, i)
				}
			}
		}
	}
}

// From the year in which credits fall to a third, a household follows the rule of one
// that always had them so: the years before are solved on entitlement nodes of their
// own and lead into the other's.
func TestContinueAfterReform(t *testing.T) {
	h, o := accruingHousehold(t, 15), DefaultOptions()
	old := careerAverage{rate: 0.015, ceiling: 60000, flat: 3000}
	reformed := old
	reformed.rate = 0.005
	h.Laws = reformed
	ahead := solve(t, h, o)
	for _, from := range []int{30, 50} {
		h.Laws = reform{old, reformed, min(from, 40)}
		rule, err := Continue(t.Context(), h, o, ahead, from, 0)
		if err != nil {
			t.Fatal(err)
		}
		j := NewJudge(rule, false)
		states := lives(rule, 20)
		for _, year := range []int{5, 29, 36, 37, 38, 39, 40, 45, 49} {
			for _, s := range states[year] {
				axis := rule.Entitlements[min(from, 39)].Axes[0]
				if s.Entitlement[0] > axis[len(axis)-1]-1000 {
					continue // soon beyond what the other household can accrue
				}
				if e, atLimit := j.ErrorIn(year, s); !atLimit && e > 3e-3 {
					t.Errorf("from %d: error %.1e in year %d at %v", from, e, year, s)
				}
			}
		}
	}
}

// reform has other laws of credits from year from on.
type reform struct {
	careerAverage
	then careerAverage
	from int
}

func (l reform) Work(t int, e Entitlement, earnings float64, employed bool) (float64, Entitlement) {
	if t >= l.from {
		return l.then.Work(t, e, earnings, employed)
	}
	return l.careerAverage.Work(t, e, earnings, employed)
}

// At the limit a household between entitlement nodes keeps exactly what the limit
// asks for.
func TestEntitlementAtLimit(t *testing.T) {
	h, o := accruingHousehold(t, 5), DefaultOptions()
	o.AssetPoints = 40
	rule := solve(t, h, o)
	for _, year := range []int{0, 20, 38, 50} {
		axis := rule.Entitlements[year].Axes[0]
		for _, share := range []float64{0.137, 0.41, 0.77} {
			e := Entitlement{axis[0] + share*(axis[len(axis)-1]-axis[0])}
			for _, m := range []float64{1234.56, 2345.67} {
				if c, d := rule.At(year, 3, e, m); c != m || d != 1 {
					t.Errorf("year %d: c(%g, %g) = %v, propensity %v, want all of it", year, e[0], m, c, d)
				}
			}
		}
	}
}

// Nodes ascend over what can be reached, and pensions bend at a node.
func TestEntitlementGrid(t *testing.T) {
	h := accruingHousehold(t, 5)
	h.Laws = careerAverage{rate: 0.01, ceiling: 60000, flat: 3000, least: 9000}
	grids := h.entitlementGrids(DefaultOptions())
	most := 0.0
	for year := range grids {
		if h.Working(year) {
			top := 0.0
			for j := range h.Nodes() {
				values, _ := h.Earnings.Outcomes(year, j)
				top = math.Max(top, math.Min(60000, slices.Max(values)))
			}
			most += 0.01 * top
		}
		x := grids[year].Axes[0]
		if relative(x[len(x)-1], most) > 1e-12 {
			t.Errorf("year %d: highest node %g, want %g", year, x[len(x)-1], most)
		}
		for i := range x {
			if i > 0 && !(x[i] > x[i-1]) {
				t.Fatalf("year %d: nodes %v do not ascend", year, x)
			}
		}
		if year >= 39 && !slices.Contains(x, 6000) {
			t.Errorf("year %d: no node where the least pension ends", year)
		}
		if n := len(x); year == 0 && n != 6 || year == 25 && n != 12 || year == 38 && n < 28 {
			t.Errorf("year %d: %d nodes", year, n)
		}
	}
}

// Weights give polynomials of their degree exactly: the third with four nodes
// (Lagrange), the first next to a window.
func TestEntitlementWeights(t *testing.T) {
	axes := [MaxPillars][]float64{{0, 1, 3, 4, 4.5, 5, 8, 9, 11, 15}, {-1, 0, 2, 5}}
	bends := [MaxPillars][]window{{{low: 4, high: 5}}}
	g := newEntitlementGrid(axes, bends, true, true)
	for _, e := range []Entitlement{{0, 0}, {0.4, 1}, {2, -0.5}, {3.3, 4}, {4.2, 5}, {4.9, 0.1}, {6, 3}, {14, 1}} {
		var b blend
		g.blend(e, &b)
		sum, cube, mixed := 0.0, 0.0, 0.0
		for i := range b.n {
			x := g.Node(b.node[i])
			sum += b.weight[i]
			cube += b.weight[i] * x[0] * x[0] * x[0]
			mixed += b.weight[i] * x[0] * x[1] * x[1]
			if e[0] < 4 && x[0] > 4 || e[0] > 5 && x[0] < 5 {
				t.Errorf("at %v node %v lies beyond the window", e, x)
			}
		}
		inside := e[0] > 4 && e[0] < 5
		if math.Abs(sum-1) > 1e-14 || math.Abs(mixed-e[0]*e[1]*e[1]) > 1e-12 || !inside && relative(cube+1, e[0]*e[0]*e[0]+1) > 1e-13 {
			t.Errorf("at %v: sum %g, cube %g, mixed %g", e, sum, cube, mixed)
		}
	}
}

// broken laws for TestLawsFaults.
type broken struct {
	careerAverage
	pillars int
	pension float64
}

func (l broken) Pillars() int                              { return l.pillars }
func (l broken) Pension(int, Entitlement, float64) float64 { return l.pension }

func TestLawsFaults(t *testing.T) {
	good := careerAverage{rate: 0.01, ceiling: 60000}
	back := good
	back.low, back.high = 5, 4
	for _, tt := range []struct {
		laws  Laws
		field string
	}{
		{broken{good, 3, 1}, "Laws.Pillars"},
		{broken{good, 1, math.NaN()}, "net income at age 65"},
		{broken{good, 0, 1}, "entitlement 0 at age 25"},
		{back, "Laws.Initial"},
		{broken{good, 1, -5}, "Earnings"},
	} {
		h := accruingHousehold(t, 5)
		h.Laws = tt.laws
		_, err := Solve(t.Context(), h, DefaultOptions())
		var f *FieldError
		if !errors.As(err, &f) || !strings.HasPrefix(f.Field, tt.field) {
			t.Errorf("got %v, want a fault of %s", err, tt.field)
		}
	}
	o := DefaultOptions()
	o.EntitlementPoints, o.EntitlementNodes[1] = 1, []float64{1, 1}
	if err := o.Validate(); err == nil || !strings.Contains(err.Error(), "EntitlementPoints") || !strings.Contains(err.Error(), "EntitlementNodes[1]") {
		t.Errorf("got %v, want faults of EntitlementPoints and EntitlementNodes", err)
	}
}
