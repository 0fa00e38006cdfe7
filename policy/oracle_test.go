package policy

import (
	"fmt"
	"math"
	"slices"
	"sort"
	"testing"
)

// oracleProblem is a household's problem spelled out year by year, for the slow
// solver that judges the fast one.
type oracleProblem struct {
	Prospects
	Utility Utility
	Lowest  [][]float64 // [T][node] lowest assets −b_t at the end of year t
	Estate  []float64   // [T] β·(1−s_t)·w, the weight of u(R·a + Shift); nil: no bequest motive
	Shift   float64
	Return  float64 // R in the last year, where there is an estate
	Poorest float64 // lowest consumption searched, < 0, where utility has no lower bound
}

// oracleProblemOf spells out the problem of h, whose limit must not be none.
func oracleProblemOf(t testing.TB, h Household) oracleProblem {
	t.Helper()
	lowest, err := h.bounds(nil)
	if err != nil {
		t.Fatal(err)
	}
	p := oracleProblem{Prospects: h.Prospects(), Utility: h.Utility, Lowest: lowest, Shift: h.Bequest.Shift, Return: 1 + h.Return}
	if h.Bequest.Weight > 0 {
		for _, s := range h.Survival {
			p.Estate = append(p.Estate, h.DiscountFactor*(1-s)*h.Bequest.Weight)
		}
	}
	return p
}

// marginalAhead returns the right side of the Euler equation in year t at a node,
//
//	β·s·R·E u′(c_{t+1}(z′, R·a + y)) + β·(1−s)·w·R·u′(R·a + shift),
//
// for assets a and next year's rule.
func (p *oracleProblem) marginalAhead(t, node int, assets float64, next func(node int, cash float64) float64) float64 {
	sum, gross := 0.0, p.Return
	if t < len(p.Income)-1 {
		gross = p.Gross[t]
		n := len(p.Income[t])
		for j, q := range p.Transition[t][node*n : node*n+n] {
			for k, y := range p.Income[t+1][j] {
				if w := q * p.Weight[t+1][j][k]; w > 0 && p.Discount[t] > 0 {
					sum += p.Discount[t] * gross * w * p.Utility.Marginal(next(j, gross*assets+y))
				}
			}
		}
	}
	if p.Estate != nil && p.Estate[t] > 0 {
		sum += p.Estate[t] * gross * p.Utility.Marginal(gross*assets+p.Shift)
	}
	return sum
}

// consume returns consumption in year t at a node with the given cash-on-hand: all
// that the limit allows if marginal utility there is still above the right side of
// the Euler equation, else the root of that equation, by bisection to the last bit.
func (p *oracleProblem) consume(t, node int, cash float64, next func(node int, cash float64) float64) float64 {
	most := cash - p.Lowest[t][node]
	short := func(c float64) bool { // consumption is below the root
		return p.Utility.Marginal(c) > p.marginalAhead(t, node, cash-c, next)
	}
	if most <= p.floor() || short(most) {
		return most
	}
	low, high := p.floor(), most
	if low > p.Utility.Infimum() && !short(low) {
		panic(fmt.Sprintf("oracle: consumption in year %d lies below Poorest = %g", t, low))
	}
	for range 200 {
		c := low + (high-low)/2
		if c <= low || c >= high {
			break
		}
		if short(c) {
			low = c
		} else {
			high = c
		}
	}
	return low + (high-low)/2
}

// floor returns the lowest consumption searched.
func (p *oracleProblem) floor() float64 { return math.Max(p.Utility.Infimum(), p.Poorest) }

// oracleConsumption returns consumption in year t at a node with the given
// cash-on-hand, by solving the Euler equation of every later year and state anew:
// one bisection inside another, without grid or interpolation, to about 1e-14. Its
// cost is about (60·nodes·outcomes)^years: three years ahead are too many.
func oracleConsumption(p *oracleProblem, t, node int, cash float64) float64 {
	return p.consume(t, node, cash, func(j int, m float64) float64 { return oracleConsumption(p, t+1, j, m) })
}

// oracleRule is the solution over a whole life. Next year's rule is kept as
// polynomials of degree oracleDegree on pieces of cash-on-hand, cut in halves until
// each gives bisected consumption to within tolerance, so that kinks end up in
// pieces too small to matter. No asset grid, no slopes and no inversion of the
// Euler equation come in.
type oracleRule struct {
	problem *oracleProblem
	pieces  [][][]oraclePiece // [T][node], in order of cash-on-hand
}

type oraclePiece struct {
	low, high float64
	value     [oracleDegree + 1]float64 // consumption at the Chebyshev points
}

const oracleDegree = 6

// newOracleRule solves p for cash-on-hand from least to most in year first, to
// within tolerance, relative, a year; later years cover what can follow. Years
// before first are left out. Keep it to a few nodes and outcomes and some ten years:
// every kink of a later year shows once for every outcome, and each costs hundreds
// of bisections.
func newOracleRule(p *oracleProblem, first int, least, most, tolerance float64) *oracleRule {
	years, n := p.check()
	r := &oracleRule{problem: p, pieces: make([][][]oraclePiece, years)}
	low, high := p.reach(first, least, most)
	for t := years - 1; t >= first; t-- {
		r.pieces[t] = make([][]oraclePiece, n)
		for j := range n {
			exact := func(m float64) float64 {
				return p.consume(t, j, m, func(k int, m float64) float64 { return r.Consumption(t+1, k, m) })
			}
			r.pieces[t][j] = oracleFit(nil, exact, low[t][j], high[t], tolerance)
		}
	}
	return r
}

// reach returns the lowest, [T][node], and highest, [T], cash-on-hand that can
// follow cash-on-hand from least to most in year first.
func (p *oracleProblem) reach(first int, least, most float64) (low [][]float64, high []float64) {
	years, n := p.check()
	low, high = make([][]float64, years), make([]float64, years)
	high[first] = most
	for t := first; t < years; t++ {
		low[t] = make([]float64, n)
		for j := range n {
			if t == first {
				low[t][j] = least
				continue
			}
			low[t][j] = p.Gross[t-1]*slices.Min(p.Lowest[t-1]) + slices.Min(p.Income[t][j])
			high[t] = math.Max(high[t], p.Gross[t-1]*(high[t-1]-math.Min(p.floor(), 0))+slices.Max(p.Income[t][j]))
		}
	}
	return low, high
}

// Consumption returns consumption in year t at a node.
func (r *oracleRule) Consumption(t, node int, cash float64) float64 {
	pieces := r.pieces[t][node]
	last := pieces[len(pieces)-1].high
	if slack := 1e-9 * (1 + math.Abs(cash)); cash < pieces[0].low-slack || cash > last+slack {
		panic(fmt.Sprintf("oracle: cash-on-hand %g in year %d is out of range", cash, t))
	}
	i := sort.Search(len(pieces)-1, func(i int) bool { return pieces[i].high >= cash })
	return pieces[i].at(cash)
}

// oracleFit appends pieces for f on [low, high].
func oracleFit(pieces []oraclePiece, f func(float64) float64, low, high, tolerance float64) []oraclePiece {
	p := oraclePiece{low: low, high: high}
	for i := range p.value {
		p.value[i] = f(p.point(float64(i)))
	}
	for _, x := range []float64{0.13, 0.5, 1.5, 2.5, 3.5, 4.5, 5.5, 5.87} {
		m := p.point(x)
		want := f(m)
		if math.Abs(p.at(m)-want) > tolerance*math.Max(1e-3, math.Abs(want)) && high-low > 1e-11*math.Max(1, math.Abs(high)) {
			middle := low + (high-low)/2
			return oracleFit(oracleFit(pieces, f, low, middle, tolerance), f, middle, high, tolerance)
		}
	}
	return append(pieces, p)
}

// point returns the place in the piece at Chebyshev point i, 0 at its low end;
// between whole i it varies smoothly.
func (p *oraclePiece) point(i float64) float64 {
	return p.low + (p.high-p.low)*(1-math.Cos(math.Pi*i/oracleDegree))/2
}

// oraclePoints are the Chebyshev points on [0, 1].
var oraclePoints = func() (x [oracleDegree + 1]float64) {
	unit := oraclePiece{low: 0, high: 1}
	for i := range x {
		x[i] = unit.point(float64(i))
	}
	return x
}()

// at is the barycentric formula (Berrut & Trefethen 2004, SIAM Review 46, eq. 5.4).
func (p *oraclePiece) at(x float64) float64 {
	x = (x - p.low) / (p.high - p.low)
	above, below := 0.0, 0.0
	for i, v := range p.value {
		d := x - oraclePoints[i]
		if d == 0 {
			return v
		}
		w := float64(1-2*(i%2)) / d
		if i == 0 || i == oracleDegree {
			w /= 2
		}
		above += w * v
		below += w
	}
	return above / below
}

// Two income states, γ = 2, R = 1.03, β = 0.96, no debt. Derived: nested bisection
// apart, accurate to about 1e-10.
func TestOracle(t *testing.T) {
	income, move := [2]float64{0.5, 1.5}, []float64{0.8, 0.2, 0.3, 0.7}
	cash := []float64{0.4, 0.8, 1, 2, 5}
	for _, tt := range []struct {
		ahead, node int
		want        [5]float64
		threshold   float64 // highest cash-on-hand at which the limit binds
	}{
		{1, 0, [5]float64{0.4, 0.68405260426, 0.78923461423, 1.31140061297, 2.85811849880}, 0.55452505084},
		{1, 1, [5]float64{0.4, 0.8, 0.92504551690, 1.48963170542, 3.07899298785}, 0.81808338366},
		{2, 0, [5]float64{0.4, 0.65943974898, 0.73270147812, 1.09524853898, 2.16083195053}, 0.55057523728},
		{2, 1, [5]float64{0.4, 0.78957403590, 0.88416997063, 1.27586435331, 2.37714319675}, 0.77659894680},
	} {
		t.Run(fmt.Sprint(tt.ahead, " ahead, node ", tt.node), func(t *testing.T) {
			p := &oracleProblem{Prospects: twoStates(tt.ahead+1, income, move, 0.96, 1.03), Utility: CRRA{2}, Lowest: make([][]float64, tt.ahead+1)}
			for i := range p.Lowest {
				p.Lowest[i] = make([]float64, 2)
			}
			rule := newOracleRule(p, 0, 0.1, 6, 1e-12)
			for i, m := range cash {
				nested, pieces := oracleConsumption(p, 0, tt.node, m), rule.Consumption(0, tt.node, m)
				if math.Abs(nested-tt.want[i]) > 1e-10 || math.Abs(pieces-tt.want[i]) > 1e-10 {
					t.Errorf("c(%g) = %.13f nested, %.13f by pieces, want %.11f", m, nested, pieces, tt.want[i])
				}
				if math.Abs(nested-pieces) > 1e-11 {
					t.Errorf("c(%g): nested %.14f, by pieces %.14f", m, nested, pieces)
				}
			}
			for _, side := range []float64{-1e-9, 1e-9} {
				m := tt.threshold + side
				if c := oracleConsumption(p, 0, tt.node, m); (c == m) != (side < 0) {
					t.Errorf("c(%.11f) = %.14f: the limit should bind up to %.11f", m, c, tt.threshold)
				}
			}
		})
	}
}

// With certain income the pieces reach the closed form over a long life, through
// every kink that later limits leave (derived: CertainLimit).
func TestOracleCertainLimit(t *testing.T) {
	l := steady(30, func(t int) float64 { return limitIncome(2 * t) }, 0.94, 1.03)
	for _, borrowing := range []float64{0, 0.7} {
		s := NewCertainLimit(StoneGeary{2, 0}, l, borrowing)
		p := &oracleProblem{Prospects: Prospects{Discount: l.Discount, Gross: l.Gross}, Utility: CRRA{2}}
		for i, y := range l.Income {
			p.Income, p.Weight = append(p.Income, [][]float64{{y}}), append(p.Weight, [][]float64{{1}})
			p.Lowest = append(p.Lowest, []float64{-s.limit[i]})
			if i > 0 {
				p.Transition = append(p.Transition, []float64{1})
			}
		}
		rule := newOracleRule(p, 0, 0.2, 30, 1e-11)
		worst := 0.0
		for m := 0.2; m < 30; m *= 1.01 {
			want, _ := s.Consumption(0, m)
			worst = math.Max(worst, relative(rule.Consumption(0, 0, m), want))
		}
		if worst > 1e-9 {
			t.Errorf("borrowing %g: misses the closed form by up to %.1e", borrowing, worst)
		}
	}
}

// A utility without a lower bound and a limit far away: the closed form for CARA
// and any chain (derived: CARAChain).
func TestOracleCARA(t *testing.T) {
	p := &oracleProblem{Prospects: twoStates(6, [2]float64{0.1, 1}, []float64{0.5, 0.5, 0.075, 0.925}, 0.99, 1.01), Utility: CARA{1.5}, Poorest: -10}
	for i := range 6 {
		bound := -8.0
		if i == 5 {
			bound = 0
		}
		p.Lowest = append(p.Lowest, []float64{bound, bound})
	}
	exact, rule := CARAChain(CARA{1.5}, p.Prospects), newOracleRule(p, 0, -2, 10, 1e-11)
	for _, m := range []float64{-1.5, 0, 0.4, 3, 9} {
		for j := range 2 {
			if got, want := rule.Consumption(0, j, m), exact.Consumption(0, j, m); math.Abs(got-want) > 1e-9 {
				t.Errorf("node %d: c(%g) = %.12f, want %.12f", j, m, got, want)
			}
		}
	}
}
