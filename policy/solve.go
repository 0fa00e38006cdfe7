package policy

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
)

// Solve returns the consumption rule of a household by backward induction on an
// endogenous grid (Carroll 2006, Economics Letters 91). On a grid of end-of-year
// assets a the Euler equation gives consumption without root-finding,
//
//	u′(c_t) = β·R·[ s_t·E u′(c_{t+1}(z′, R·a + y′)) + (1−s_t)·v′(R·a) ],
//
// and cash-on-hand m = c + a is the grid of the new rule. Below its first node
// the limit binds and c = m − bound exactly.
//
// With cubic interpolation the slope at every node comes from differentiating
// that equation: with D the derivative of its right side in a,
//
//	dc/da = D/u″(c),   dc/dm = (dc/da)/(1 + dc/da),
//
// and the kinks of next year's rule, seen from this year through each persistent
// node and income outcome, become nodes with a slope on either side.
//
// A household or options that cannot be are reported before any work. If ctx
// ends, Solve returns no rule and an error wrapping context.Cause(ctx). The cost
// is O(years · nodes · outcomes · asset points).
func Solve(ctx context.Context, h Household, o Options) (*Rule, error) {
	if err := errors.Join(h.Validate(), o.Validate()); err != nil {
		return nil, err
	}
	return NewSolver(h.Years()).Solve(ctx, h, o)
}

// Solver keeps the memory of one solution for the next, for callers that solve
// many problems one after another. It is not safe for concurrent use, and the
// Rule of one call is overwritten by the next.
type Solver struct {
	problem
	arena  arena
	rule   Rule
	curves []Curve
	next   frontier   // next year's rule, as records
	kinks  []sighting // kinks of next year's rule as this year's assets
	assets []float64  // this year's asset grid
	gross  []float64  // R·assets
	earned float64    // the R in gross
	plain  bool       // assets hold the fixed grid alone
	sound  bool       // the year's rules looked possible as they were laid out
	work   scratch
	euler  euler // the year's constants
}

// euler holds the constants of one year's Euler equation: marginal utility is
// growth times the expectation, in which living on weighs live.
type euler struct{ growth, live float64 }

// NewSolver returns a Solver for problems of about the given number of years.
func NewSolver(years int) *Solver {
	return &Solver{curves: make([]Curve, 0, 16*years)}
}

// problem is a household with what the backward step needs of it at hand.
type problem struct {
	h       Household
	o       Options
	bounds  [][]float64
	offsets []float64 // asset grid above the limit
	sparse  []float64 // a few of them, for rules that are lines between kinks
	marginal
	returns float64 // R of the year ahead
}

// Solve is the function Solve on this Solver's memory. It trusts h and o to be
// valid.
func (s *Solver) Solve(ctx context.Context, h Household, o Options) (*Rule, error) {
	if err := s.begin(h, o); err != nil {
		return nil, err
	}
	return s.back(ctx, 0, h.Years())
}

// back solves the years from … to−1, the last first.
func (s *Solver) back(ctx context.Context, from, to int) (*Rule, error) {
	for t := to - 1; t >= from; t-- {
		age := s.h.FirstAge + t
		if ctx.Err() != nil {
			return nil, fmt.Errorf("policy: stopped at age %d: %w", age, context.Cause(ctx))
		}
		if err := s.year(t); err != nil {
			return nil, err
		}
		if s.o.OnAge != nil {
			s.o.OnAge(age)
		}
	}
	return &s.rule, nil
}

// sparseNodes is about how many nodes of the fixed grid a rule of lines keeps.
const sparseNodes = 10

func (s *Solver) begin(h Household, o Options) error {
	bounds, err := h.bounds()
	if err != nil {
		return err
	}
	o = o.resolve(h.peakIncome())
	limited := h.Limit.Kind != LimitNone
	top := o.HighestAssets
	if !limited {
		top -= o.LowestAssets
	}
	s.problem = problem{h: h, o: o, bounds: bounds, marginal: marginalOf(h, s.marginal),
		offsets: assetOffsets(o.AssetPoints, top, o.AssetScale, limited)}
	for i := 0; i < len(s.offsets)-1; i += max(1, len(s.offsets)/sparseNodes) {
		s.sparse = append(s.sparse, s.offsets[i])
	}
	s.sparse = append(s.sparse, s.offsets[len(s.offsets)-1])
	T, nz := h.Years(), h.Nodes()
	s.arena.reset()
	s.curves = slices.Grow(s.curves[:0], T*nz)[:T*nz]
	s.rule = Rule{Household: h, Bounds: make([]float64, T), Curves: make([][]Curve, T)}
	for t := range T {
		s.rule.Bounds[t] = slices.Min(bounds[t])
		s.rule.Curves[t] = s.curves[t*nz : (t+1)*nz]
	}
	s.next.reset(nz)
	s.plain = false
	return nil
}

// year solves year t from next year's records and leaves its own in their place.
func (s *Solver) year(t int) error {
	all := s.rule.Curves[t]
	s.sound, s.returns = true, 1+s.h.ReturnIn(t+1)
	switch {
	case t == s.h.Years()-1 && s.h.Bequest.Weight == 0:
		for j := range all {
			all[j] = s.lastYear()
			if s.lined() {
				s.next.setLines(j, &all[j], make([]float64, 3), s.tolerance(), s.shift)
			}
		}
	case t == s.h.Years()-1 || !s.h.Moves(t):
		for j := range all { // each node stays as it is: problems of their own
			s.step(t, j, j+1)
		}
	default:
		s.step(t, 0, len(all))
	}
	for j := range all {
		if !s.lined() {
			s.sound = s.next.set(j, &all[j], s.tolerance(), s.shift) && s.sound
		}
	}
	for j := range all {
		if s.sound {
			break
		}
		if err := all[j].check(s.h.Utility.Infimum(), s.h.FirstAge+t, j); err != nil {
			return err
		}
	}
	return nil
}

// lined reports whether next year's rule is kept as lines.
func (s *Solver) lined() bool { return s.kind == powerKind && s.o.Interpolation == Linear }

// lastYear is the rule of a household without bequest motive at its last age: it
// keeps nothing, so that the limit of 0 binds everywhere on the grid.
func (s *Solver) lastYear() Curve {
	m := []float64{s.o.HighestAssets, 2 * s.o.HighestAssets}
	one := []float64{1, 1}
	return Curve{Cash: m, Consumption: m, Left: one, Right: one, Bound: 0}
}

// tolerance is the distance, in money, within which two cash-on-hand points are
// one: far below anything that matters, far above rounding.
func (s *Solver) tolerance() float64 { return 1e-11 * s.o.AssetScale }

// step solves year t for the persistent nodes from ≤ j < to, which next year are
// among the same nodes.
func (s *Solver) step(t, from, to int) {
	s.placeAssets(t, from, to)
	s.work.grow(to-from, len(s.assets))
	s.setEuler(t)
	if t < s.h.Years()-1 {
		s.expectAll(t+1, from, to)
	} else {
		clear(s.work.value[0])
		clear(s.work.slope[0])
		copy(s.work.reference, s.gross)
	}
	for j := from; j < to; j++ {
		s.invert(t, j, from, to)
	}
}

// setEuler sets the constants of year t. Without a bequest motive survival
// belongs to the growth factor, with one it weighs the two ways to go on.
func (s *Solver) setEuler(t int) {
	s.euler = euler{growth: s.h.DiscountFactor * s.returns, live: 1}
	if s.h.Bequest.Weight > 0 {
		s.euler.live = s.h.Survival[t]
	} else {
		s.euler.growth *= s.h.Survival[t]
	}
}

// expectAll sums next year's marginal utilities over the income outcomes of the
// nodes in [from, to), t being next year.
func (s *Solver) expectAll(t, from, to int) {
	w := &s.work
	for j := from; j < to; j++ {
		values, weights := s.h.Income(t, j)
		if j == from && s.kind == exponentialKind {
			s.refer(j, values)
		}
		clear(w.value[j-from])
		if s.o.Interpolation == Cubic {
			clear(w.slope[j-from])
		}
		s.expect(j, values, weights, w.value[j-from], w.slope[j-from])
		s.rule.Updates += int64(len(s.assets) * len(values))
	}
	for i := range s.kinks {
		if k := &s.kinks[i]; k.index > 0 {
			at := s.next.kinks[k.node][k.of]
			k.delta = at.jump * s.slopeTerm(at.consumption, k.weight, int(k.index))
		}
	}
}

// placeAssets sets the year's asset grid: the fixed grid above the bound and,
// for the nodes in [from, to), the kinks of next year's rule.
func (s *Solver) placeAssets(t, from, to int) {
	bottom := s.bounds[t][from]
	if math.IsInf(bottom, -1) {
		bottom = s.o.LowestAssets
	}
	s.kinks = s.kinks[:0]
	if s.o.Interpolation == Cubic && t < s.h.Years()-1 {
		for j := from; j < to; j++ {
			values, weights := s.h.Income(t+1, j)
			s.kinks = s.next.sight(s.kinks, j, values, weights, s.returns, s.o.KinkThreshold)
		}
		slices.SortFunc(s.kinks, bySighting)
	}
	if len(s.kinks) == 0 && s.plain && s.assets[0] == bottom && s.earned == s.returns && s.o.Interpolation == Linear {
		return // the same grid again
	}
	s.plain = len(s.kinks) == 0
	offsets := s.offsets
	if s.piecewiseLinear(t) {
		offsets = s.sparse
	}
	s.assets = mergeAssets(s.assets[:0], bottom, offsets, s.kinks, s.tolerance())
	s.gross, s.earned = s.gross[:0], s.returns
	for _, a := range s.assets {
		s.gross = append(s.gross, s.returns*a)
	}
}

// piecewiseLinear reports whether the rule of year t consists of lines between its
// kinks, so that a few nodes beside them hold it exactly. It does for the built-in
// families (all have linear risk tolerance) where the rest of life is certain and
// no estate is cared for.
func (s *Solver) piecewiseLinear(t int) bool {
	return s.o.Interpolation == Cubic && s.kind != anyKind && s.h.Bequest.Weight == 0 && t < s.h.Years()-1 && s.h.certainFrom(t+1)
}

// certainFrom reports whether income is certain from year t on.
func (h Household) certainFrom(t int) bool {
	if !h.Working(t) {
		return true
	}
	values, _ := h.Income(t, 0)
	return h.Nodes() == 1 && len(values) == 1
}

// invert turns the expectations of the nodes in [from, to) into this year's rule
// at node j.
func (s *Solver) invert(t, j, from, to int) {
	n := len(s.assets)
	w := &s.work
	v, d := w.mixValue, w.mixSlope
	row := s.transition(j, from, to)
	mix(v, row, w.value)
	if s.o.Interpolation == Cubic {
		mix(d, row, w.slope)
	}
	if s.h.Bequest.Weight > 0 {
		s.addBequest(v, d)
	}
	c := &s.rule.Curves[t][j]
	*c = Curve{Cash: s.arena.take(n), Consumption: s.arena.take(n), Bound: s.bounds[t][j]}
	s.inverse(c.Consumption, v)
	for i, x := range c.Consumption {
		c.Cash[i] = x + s.assets[i]
	}
	if s.o.Interpolation == Linear {
		s.secants(j, c)
		return
	}
	s.slopes(c, v, d, from, row)
}

// transition is the row of the chain from node j, or certainty where the node
// stays.
func (s *Solver) transition(j, from, to int) []float64 {
	if to-from == 1 {
		return certainty // the node stays, or there is only one
	}
	return s.h.Earnings.Chain.Row(j)
}
