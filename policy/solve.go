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
// Under laws that accrue an entitlement a year is solved at every entitlement node,
// and next year's rule is read between its nodes at the entitlement that each
// outcome of earnings leads to. Once the entitlement no longer changes, the rule of a
// node is a problem of its own, and the same at every persistent node unless the
// pension depends on that too. Kinks of next year's rule get a node where they are
// not smoothed away by the transitory shock.
//
// A household or options that cannot be are reported before any work. If ctx
// ends, Solve returns no rule and an error wrapping context.Cause(ctx). The cost
// is O(years · nodes · outcomes · asset points), times entitlement nodes and, with
// cubic interpolation, up to four curves read for each while working. A rule takes 32
// bytes a node of a curve.
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
	arena   arena
	rule    Rule
	curves  []Curve
	next    frontier // next year's rule, as records
	grounds []ground // this year's assets, by entitlement node among those solved together
	sound   bool     // the year's rules looked possible as they were laid out
	work    scratch
	euler   euler   // the year's constants
	outlook outlook // next year's outcomes under laws
}

// ground is this year's asset grid for one entitlement node.
type ground struct {
	kinks     []sighting // kinks of next year's rule as this year's assets
	assets    []float64
	gross     []float64 // R·assets
	earned    float64   // the R in gross
	plain     bool      // assets hold the fixed grid alone
	reference []float64 // consumption that exponential utility is measured from
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
	grids   []EntitlementGrid // [T]; nil without an entitlement
	shared  bool              // from the last working year on the rule is the same at every persistent node
	bounds  [][]float64       // [t][state]
	offsets []float64         // asset grid above the limit
	sparse  []float64         // a few of them, for rules that are lines between kinks
	marginal
	returns float64 // R of the year ahead
}

// Solve is the function Solve on this Solver's memory. It trusts h and o to be
// valid.
func (s *Solver) Solve(ctx context.Context, h Household, o Options) (*Rule, error) {
	if err := s.begin(h, o, nil, h.Years()); err != nil {
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

// begin prepares for solving h up to year until, from which on the rule is ahead's.
func (s *Solver) begin(h Household, o Options, ahead *Rule, until int) error {
	grids := h.entitlementGrids(o)
	for t := range grids {
		if t >= until || until < h.Years() && !h.Moves(t) && !h.Moves(until) {
			grids[t] = ahead.Entitlements[t]
		}
	}
	bounds, err := h.bounds(grids)
	if err != nil {
		return err
	}
	o = o.resolve(h.peakIncome())
	limited := h.Limit.Kind != LimitNone
	top := o.HighestAssets
	if !limited {
		top -= o.LowestAssets
	}
	s.problem = problem{h: h, o: o, grids: grids, shared: h.pensionsAlike(grids), bounds: bounds, marginal: marginalOf(h, s.marginal),
		offsets: assetOffsets(o.AssetPoints, top, o.AssetScale, limited)}
	for i := 0; i < len(s.offsets)-1; i += max(1, len(s.offsets)/sparseNodes) {
		s.sparse = append(s.sparse, s.offsets[i])
	}
	s.sparse = append(s.sparse, s.offsets[len(s.offsets)-1])
	T, nz, all := h.Years(), h.Nodes(), 0
	for t := range T {
		all += nz * s.width(t)
	}
	s.arena.reset()
	s.curves = slices.Grow(s.curves[:0], all)[:all]
	s.rule = Rule{Household: h, Entitlements: grids, Bounds: make([]float64, T), Curves: make([][]Curve, T)}
	widest := 0
	for t, rest := 0, s.curves; t < T; t++ {
		n := nz * s.width(t)
		s.rule.Bounds[t] = slices.Min(bounds[t])
		s.rule.Curves[t], rest = rest[:n:n], rest[n:]
		widest = max(widest, n)
	}
	s.next.reset(widest)
	for len(s.grounds) < widest/nz {
		s.grounds = append(s.grounds, ground{})
	}
	for k := range s.grounds {
		s.grounds[k].plain = false
	}
	return nil
}

// width returns the number of entitlement nodes in year t: 1 without an
// entitlement.
func (s *problem) width(t int) int {
	if s.grids == nil {
		return 1
	}
	return s.grids[t].Len()
}

// apart returns the number of persistent nodes whose rules of year t are problems
// of their own: one if nothing depends on the node any more.
func (s *problem) apart(t int) int {
	if s.shared && !s.h.Moves(t) {
		return 1
	}
	return s.h.Nodes()
}

// state returns where the rule of year t for a persistent and an entitlement node
// stands in the frontier.
func (s *problem) state(t, node, k int) int {
	n := s.width(t)
	return min(node, s.apart(t)-1)*n + min(k, n-1)
}

// year solves year t from next year's records and leaves its own in their place.
func (s *Solver) year(t int) error {
	all, width := s.rule.Curves[t], s.width(t)
	own := all[:s.apart(t)*width]
	s.sound, s.returns = true, 1+s.h.ReturnIn(t+1)
	switch {
	case t == s.h.Years()-1 && s.h.Bequest.Weight == 0:
		for i := range own {
			own[i] = s.lastYear()
			if s.lined() {
				s.next.setLines(i, &own[i], make([]float64, 3), s.tolerance(), s.shift)
			}
		}
	case t == s.h.Years()-1 || !s.h.Moves(t):
		for i := range own { // each state stays as it is: problems of their own
			j, k := i/width, i%width
			s.step(t, j, j+1, k, k+1)
		}
	default:
		s.step(t, 0, s.h.Nodes(), 0, width)
	}
	for i := range own {
		if !s.lined() {
			s.sound = s.next.set(i, &own[i], s.tolerance(), s.shift) && s.sound
		}
	}
	for i := range own {
		if s.sound {
			break
		}
		if err := own[i].check(s.h.Utility.Infimum(), s.h.FirstAge+t, i/width, i%width); err != nil {
			return err
		}
	}
	for i := len(own); i < len(all); i++ {
		all[i] = own[i%width]
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
// among the same nodes, and the entitlement nodes low ≤ k < high.
func (s *Solver) step(t, from, to, low, high int) {
	last := t == s.h.Years()-1
	if !last {
		s.lookAhead(t+1, from, to, low, high)
	}
	most := 0
	for k := low; k < high; k++ {
		g := &s.grounds[k-low]
		s.placeAssets(g, t, k, from, to)
		most = max(most, len(g.assets))
		g.reference = room(g.reference, len(g.assets))
	}
	s.work.grow((high-low)*(to-from), most)
	s.setEuler(t)
	if !last {
		s.expectAll(t+1, from, to, low, high)
	} else {
		g := &s.grounds[0]
		clear(s.work.value[0])
		clear(s.work.slope[0])
		copy(g.reference, g.gross)
	}
	for k := low; k < high; k++ {
		rows := (k - low) * (to - from)
		for j := from; j < to; j++ {
			s.invert(&s.grounds[k-low], t, j, k, from, to, s.work.value[rows:rows+to-from], s.work.slope[rows:rows+to-from])
		}
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
func (s *Solver) expectAll(t, from, to, low, high int) {
	w := &s.work
	for j := from; j < to; j++ {
		for k := low; k < high; k++ {
			row := (k-low)*(to-from) + j - from
			clear(w.value[row])
			if s.o.Interpolation == Cubic {
				clear(w.slope[row])
			}
		}
		if s.blends(t) {
			s.expectBlended(t, j, from, to, low, high)
			continue
		}
		for k := low; k < high; k++ {
			g, row, state := &s.grounds[k-low], (k-low)*(to-from)+j-from, s.state(t, j, k)
			values, weights := s.incomes(t, j, k)
			if j == from && s.kind == exponentialKind {
				s.refer(state, g, values)
			}
			s.expect(state, g, values, weights, w.value[row], w.slope[row])
			s.rule.Updates += int64(len(g.assets) * len(values))
		}
	}
	for i := range s.grounds[:high-low] {
		g := &s.grounds[i]
		for i := range g.kinks {
			if k := &g.kinks[i]; k.index > 0 {
				k.delta *= s.slopeTerm(g, k.consumption, k.weight, int(k.index))
			}
		}
	}
}

// placeAssets sets the asset grid of year t at entitlement node k: the fixed grid
// above the bound and, for the nodes in [from, to), the kinks of next year's rule.
func (s *Solver) placeAssets(g *ground, t, k, from, to int) {
	bottom := s.bounds[t][s.state(t, from, k)]
	if math.IsInf(bottom, -1) {
		bottom = s.o.LowestAssets
	}
	g.kinks = g.kinks[:0]
	if s.o.Interpolation == Cubic && t < s.h.Years()-1 {
		for j := from; j < to; j++ {
			if s.blends(t + 1) {
				s.sightBlended(g, t+1, j, k)
				continue
			}
			values, weights := s.incomes(t+1, j, k)
			g.kinks = s.next.sight(g.kinks, s.state(t+1, j, k), j, values, weights, s.returns, s.o.KinkThreshold)
		}
		slices.SortFunc(g.kinks, bySighting)
	}
	if len(g.kinks) == 0 && g.plain && g.assets[0] == bottom && g.earned == s.returns && s.o.Interpolation == Linear {
		return // the same grid again
	}
	g.plain = len(g.kinks) == 0
	offsets := s.offsets
	if s.piecewiseLinear(t) {
		offsets = s.sparse
	}
	g.assets = mergeAssets(g.assets[:0], bottom, offsets, g.kinks, s.tolerance())
	g.gross, g.earned = g.gross[:0], s.returns
	for _, a := range g.assets {
		g.gross = append(g.gross, s.returns*a)
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

// invert turns the expectations of the nodes in [from, to) with the assets of g
// into this year's rule at node j and entitlement node k.
func (s *Solver) invert(g *ground, t, j, k, from, to int, value, slope [][]float64) {
	n := len(g.assets)
	w := &s.work
	v, d := w.mixValue[:n], w.mixSlope[:n]
	row := s.transition(j, from, to)
	mix(v, row, value)
	if s.o.Interpolation == Cubic {
		mix(d, row, slope)
	}
	if s.h.Bequest.Weight > 0 {
		s.addBequest(g, v, d)
	}
	state := s.state(t, j, k)
	c := &s.rule.Curves[t][state]
	*c = Curve{Cash: s.arena.take(n), Consumption: s.arena.take(n), Bound: s.bounds[t][state]}
	s.inverse(g, c.Consumption, v)
	for i, x := range c.Consumption {
		c.Cash[i] = x + g.assets[i]
	}
	if s.o.Interpolation == Linear {
		s.secants(state, c)
		return
	}
	s.slopes(c, g, v, d, from, row)
}

// transition is the row of the chain from node j, or certainty where the node
// stays.
func (s *Solver) transition(j, from, to int) []float64 {
	if to-from == 1 {
		return certainty // the node stays, or there is only one
	}
	return s.h.Earnings.Chain.Row(j)
}
