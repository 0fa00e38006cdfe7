package policy

import (
	"fmt"
	"math"
	"math/rand"
	"slices"
	"testing"
)

// lives follows n households that begin without assets and returns the states in
// which they stand, [year][household]. Shocks are continuous.
func lives(r *Rule, n int) [][]State {
	h, random := r.Household, rand.New(rand.NewSource(1))
	draw := func(p []float64) int {
		u := random.Float64()
		for j, q := range p {
			if u -= q; u < 0 {
				return j
			}
		}
		return len(p) - 1
	}
	states := make([][]State, h.Years())
	for range n {
		z, a := draw(h.Earnings.Distribution[0]), 0.0
		e, _ := h.Laws.Initial()
		for t := range h.Years() {
			var y float64
			switch {
			case !h.Working(t):
				y = h.Laws.Pension(t, e, h.Earnings.Final(z))
			case random.Float64() < h.Earnings.JobLossIn(t).Probability:
				y, e = h.Laws.Work(t, e, h.Earnings.Benefit[t][z], false)
			default:
				y, e = h.Laws.Work(t, e, h.Earnings.At(t, z, h.Earnings.TransitorySD(t)*random.NormFloat64()), true)
			}
			m := (1+h.ReturnIn(t))*a + y
			c, _ := r.At(t, z, e, m)
			states[t] = append(states[t], State{Node: z, Cash: m, Entitlement: e})
			if a = m - c; h.Moves(t) {
				z = draw(h.Earnings.Chain.Row(z))
			}
		}
	}
	return states
}

// entitlementError is the mean relative difference of consumption between two rules
// at states of the years before the last working one.
func entitlementError(a, b *Rule, states [][]State) float64 {
	sum, n := 0.0, 0
	for t := range a.Household.WorkingYears() - 1 {
		for _, s := range states[t] {
			x, _ := a.At(t, s.Node, s.Entitlement, s.Cash)
			y, _ := b.At(t, s.Node, s.Entitlement, s.Cash)
			sum += relative(x, y)
			n++
		}
	}
	return sum / float64(n)
}

// Halving the distance of entitlement nodes divides the error of linear
// interpolation by 2² and of four-node interpolation by 2⁴ where the rule is smooth
// (Lagrange's remainder); kinks of later limits, which the transitory shock all but
// smooths away, cost a little of that.
func TestEntitlementOrder(t *testing.T) {
	h := accruingHousehold(t, 15)
	for _, tt := range []struct {
		method Interpolation
		order  float64
		finest float64 // largest mean error with 24 nodes
	}{
		{Linear, 2, 1e-3},
		{Cubic, 4, 1e-6},
	} {
		t.Run(fmt.Sprint(tt.method), func(t *testing.T) {
			o := DefaultOptions()
			o.AssetPoints, o.Interpolation, o.EntitlementPoints = 100, tt.method, 100
			exact := solve(t, h, o)
			states := lives(exact, 30)
			var errs []float64
			for _, n := range []int{6, 12, 24} {
				o.EntitlementPoints = n
				errs = append(errs, entitlementError(solve(t, h, o), exact, states))
			}
			order := math.Log2(errs[0]/errs[2]) / 2
			t.Logf("mean errors %.2e, observed order %.2f", errs, order)
			if order < tt.order-1 || errs[2] > tt.finest {
				t.Errorf("order %.2f, want about %g; errors %.2e, want the last at most %.0e", order, tt.order, errs, tt.finest)
			}
		})
	}
}

// Euler-equation errors with an entitlement: 10^−4.5 on average and 10^−3 at most,
// the limit's own kink and the pension's aside (the requirement), at states of a
// simulation between all nodes and under the shock that it draws. Where the least
// pension ends the rule has a kink that the solver meets with nodes, not exactly.
func TestEntitlementEulerErrors(t *testing.T) {
	if testing.Short() {
		t.Skip("the fine quadrature takes seconds")
	}
	taxed := func(y float64) float64 { return y - 0.2*math.Max(0, y-10000) - 0.2*math.Max(0, y-30000) }
	for _, tt := range []struct {
		name      string
		laws      careerAverage
		mean, max float64 // log10
	}{
		{"ceiling", careerAverage{rate: 0.01, ceiling: 60000, flat: 3000}, -4.5, -3},
		{"no ceiling", careerAverage{rate: 0.01, ceiling: math.Inf(1), flat: 3000}, -4.5, -3},
		{"taxed", careerAverage{rate: 0.01, ceiling: 60000, flat: 3000, net: taxed, bends: []float64{10000, 30000}}, -4.5, -3},
		{"least pension", careerAverage{rate: 0.01, ceiling: 60000, flat: 3000, least: 9000}, -4.5, -2},
	} {
		t.Run(tt.name, func(t *testing.T) {
			h := accruingHousehold(t, 25)
			h.Laws = tt.laws
			rule := solve(t, h, DefaultOptions())
			states := lives(rule, 30)
			var own, fine []float64
			for _, f := range []bool{false, true} {
				j, errs := NewJudge(rule, f), &own
				if f {
					errs = &fine
				}
				for year := range states {
					for _, s := range states[year] {
						if e, atLimit := j.ErrorIn(year, s); !atLimit {
							*errs = append(*errs, e)
						}
					}
				}
			}
			for i, errs := range [][]float64{own, fine} {
				slices.Sort(errs)
				mean, n := 0.0, len(errs)
				for _, e := range errs {
					mean += e / float64(n)
				}
				mean = math.Log10(mean)
				most := math.Log10(errs[n-1])
				t.Logf("%s quadrature: %d states, mean %.2f, 99th percentile %.2f, maximum %.2f", []string{"own", "fine"}[i], n, mean, math.Log10(errs[n*99/100]), most)
				if !(mean <= tt.mean) || i == 1 && !(most <= tt.max) {
					t.Errorf("mean %.2f, maximum %.2f, want at most %g and %g", mean, most, tt.mean, tt.max)
				}
			}
		})
	}
}

// Two pillars whose entitlements add up in the pension are one (derived: only their
// sum appears in the budget), to within the error of nine nodes each.
func TestTwoPillars(t *testing.T) {
	h := riskyHousehold(t)
	p := h.Earnings.Process
	p.Profile = p.Profile[:12]
	e, err := p.Build()
	if err != nil {
		t.Fatal(err)
	}
	h.Earnings, h.Pension, h.Survival = e, Pension{ClaimAge: 52}, h.Survival[40-25:]
	h.Survival = h.Survival[:25]
	h.Survival[24] = 0
	o := DefaultOptions()
	o.AssetPoints, o.EntitlementPoints = 50, 60
	h.Laws = careerAverage{rate: 0.05, ceiling: 2, flat: 0.1}
	one := solve(t, h, o)
	h.Laws, o.EntitlementPoints = twoPillars{}, 9
	two := solve(t, h, o)
	miss, slope, n := 0.0, 0.0, 0.0
	for year := range h.Years() {
		for j := range h.Nodes() {
			for _, share := range []float64{0.2, 0.5, 0.83} {
				x := share * 0.1 * float64(min(year+1, 12))
				for m := 0.2; m < 8; m *= 1.4 {
					a, da := one.At(year, j, Entitlement{x}, m)
					b, db := two.At(year, j, Entitlement{0.3 * x, 0.7 * x}, m)
					miss, slope, n = miss+relative(b, a), slope+math.Abs(db-da), n+1
				}
			}
		}
	}
	t.Logf("mean relative difference %.1e, of propensities %.1e", miss/n, slope/n)
	if !(miss/n < 2e-5 && slope/n < 1e-3) {
		t.Errorf("mean relative difference %.1e, of propensities %.1e", miss/n, slope/n)
	}
	tb := two.Table(5)
	for _, e := range []Entitlement{{0.01, 0.1}, {0.1, 0.02}} {
		c, d := []float64{0}, []float64{0}
		tb.Evaluate([]uint8{2}, []float64{1.3}, c, d, []float64{e[0]}, []float64{e[1]})
		if want, slope := two.At(5, 2, e, 1.3); relative(c[0], want) > 1e-12 || math.Abs(d[0]-slope) > 1e-10 {
			t.Errorf("the table has c = %.14g, propensity %.12g at %v, the rule %.14g, %.12g", c[0], d[0], e, want, slope)
		}
	}
}

// twoPillars credit 3 % and 2 % of earnings up to 2.
type twoPillars struct{}

func (twoPillars) Pillars() int                        { return 2 }
func (twoPillars) Initial() (_, _ Entitlement)         { return }
func (twoPillars) Bends(int) (_ [MaxPillars][]float64) { return }
func (twoPillars) Work(_ int, e Entitlement, earnings float64, _ bool) (float64, Entitlement) {
	y := math.Min(earnings, 2)
	return earnings, Entitlement{e[0] + 0.015*y, e[1] + 0.035*y}
}
func (twoPillars) Pension(_ int, e Entitlement, _ float64) float64 { return 0.1 + e[0] + e[1] }
func (l twoPillars) GrossPension(t int, e Entitlement, final float64) float64 {
	return l.Pension(t, e, final)
}

// Under laws the certain twin earns what its household earns on average, and its
// entitlement is a certain one.
func TestTwinUnderLaws(t *testing.T) {
	h := accruingHousehold(t, 5)
	twin, err := h.Twin()
	if err != nil {
		t.Fatal(err)
	}
	accrued := 0.0
	for year := range h.WorkingYears() {
		accrued += 0.01 * math.Min(60000, h.Earnings.Mean(year))
		if relative(twin.MeanIncome(year), h.Earnings.Mean(year)) > 1e-12 {
			t.Errorf("year %d: the twin earns %g, want %g", year, twin.MeanIncome(year), h.Earnings.Mean(year))
		}
	}
	if got := twin.MeanIncome(60); relative(got, 3000+accrued) > 1e-12 {
		t.Errorf("the twin's pension is %g, want %g", got, 3000+accrued)
	}
	rule := solve(t, twin, DefaultOptions())
	for year := range rule.Entitlements {
		if n := rule.Entitlements[year].Len(); n != 1 {
			t.Errorf("year %d: %d entitlement nodes, want 1", year, n)
		}
	}
	l := lifetimeWith(twin, 30, rule.Entitlements[30].Node(0))
	exact := NewCertainLimit(StoneGeary{2, 0}, l, 0)
	for m := 5000.0; m < 1e6; m *= 1.3 {
		want, _ := exact.Consumption(0, m)
		if got := consumptionAt(rule, 30, rule.Entitlements[30].Node(0), m); relative(got, want) > 1e-9 {
			t.Errorf("the twin consumes %.10g of %.0f, want %.10g", got, m, want)
		}
	}
}
