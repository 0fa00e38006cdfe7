package policy

import (
	"math"
	"sort"
)

// Value is the expected lifetime utility of following a rule, perhaps with
// consumption scaled at every age: with a factor k,
//
//	V_t(z, m) = u(k·c) + β·[ s_t·E V_{t+1}(z′, R·a + y′) + (1−s_t)·v(R·a) ],
//
// c = c_t(z, m), a = m − c. Assets stay those of the rule: k says what the same
// lives are worth if every year's consumption is k times as much.
//
// It is kept as the consumption Q that is worth as much if it is had for certain in
// every year to come, and in place of the estate:
//
//	V_t = K_t·u(Q_t),   K_t = 1 + β·[ s_t·K_{t+1} + (1−s_t)·weight ],
//
// which bends hardly where V falls to −∞, and is linear for homothetic utility
// without income. Between the nodes of the rule Q is a cubic Hermite polynomial with
// the slopes that differentiating the recursion gives; below them, where the limit
// binds, V is exact; above them Q is a line. Between entitlement nodes Q is summed as
// the rule is (see [EntitlementGrid]). For k = 1 the slope is the envelope condition
// V′ = u′(c) (Benveniste and Scheinkman 1979, Econometrica 47).
//
// Expectations are over the income outcomes of Rule.Household, the solver's own; a
// copy of the rule whose household has the same earnings with more transitory nodes is
// valued with a finer quadrature. A Value is immutable and safe for concurrent use.
type Value struct {
	Rule     *Rule
	Scale    float64 // k
	horizon  []float64
	curves   [][]valueCurve // [t][state], as in Rule.Curves
	felicity felicity
	scale    float64 // money: how near each other nodes need lie at the least
}

// valueCurve is Q at one age and node.
type valueCurve struct {
	cash, q, left, right []float64 // left and right: dQ/dm from below and from above
	bound                float64   // below cash[0] the limit binds
	later                float64   // and what comes later is worth this consumption for certain
}

// NewValue evaluates a rule with consumption scaled by k > 0; 1: as it is. It takes a
// few times as long as solving.
func NewValue(r *Rule, k float64) *Value {
	T := len(r.Curves)
	v := &Value{Rule: r, Scale: k, horizon: make([]float64, T+1), curves: make([][]valueCurve, T), felicity: newFelicity(r.Household.Utility)}
	v.scale = 0.1 * r.Household.peakIncome()
	h := &r.Household
	for t := T - 1; t >= 0; t-- {
		s := h.Survival[t]
		v.horizon[t] = 1 + h.DiscountFactor*(s*v.horizon[t+1]+(1-s)*h.Bequest.Weight)
		v.curves[t] = make([]valueCurve, len(r.Curves[t]))
		v.year(t)
	}
	return v
}

// At returns the value, in utility, of following the rule from year t on at a
// persistent node with entitlement e, this year's credit included, and cash-on-hand m
// (money), and its derivative in m. Without an entitlement e does not matter.
func (v *Value) At(t, node int, e Entitlement, m float64) (value, slope float64) {
	q, d := v.equivalent(t, node, e, m)
	u := v.Rule.Household.Utility
	return v.horizon[t] * u.Value(q), v.horizon[t] * u.Marginal(q) * d
}

// Equivalent returns the certain yearly consumption, in money, that is worth as
// much.
func (v *Value) Equivalent(t, node int, e Entitlement, m float64) float64 {
	q, _ := v.equivalent(t, node, e, m)
	return q
}

// equivalent returns Q and its slope.
func (v *Value) equivalent(t, node int, e Entitlement, m float64) (q, slope float64) {
	g := v.Rule.accruing(t)
	if g == nil {
		q, slope, _ = v.at(t, node, m, -1)
		return q, slope
	}
	var b blend
	g.blend(e, &b)
	return v.sum(g, t, node, &b, m)
}

// sum returns the sum b of Q over entitlement nodes and its slope.
func (v *Value) sum(g *EntitlementGrid, t, node int, b *blend, m float64) (q, slope float64) {
	first := node * g.Len()
	kink := 0.0
	for i := range b.n {
		kink += b.weight[i] * v.curves[t][first+b.node[i]].cash[0]
	}
	for i := range b.n {
		state := first + b.node[i]
		x, d, _ := v.at(t, state, m+g.shift(v.curves[t][state].cash[0], kink), -1)
		q += b.weight[i] * x
		slope += b.weight[i] * d
	}
	return q, slope
}

// at returns Q and its slope at a state; hint is a node that m lies above, −1 if none
// is known, and comes back for a higher m.
func (v *Value) at(t, state int, m float64, hint int) (q, slope float64, next int) {
	c := &v.curves[t][state]
	n := len(c.cash)
	if m < c.cash[0] && !math.IsInf(c.bound, -1) {
		q, slope = v.atLimit(t, c, m)
		return q, slope, 0
	}
	i := hint
	if hint < 0 {
		i = max(0, sort.Search(n, func(i int) bool { return c.cash[i] > m })-1)
	}
	for i < n-1 && c.cash[i+1] <= m {
		i++
	}
	q, slope = c.at(i, m)
	return q, slope, i
}

// atLimit is at where all is consumed that the limit allows.
func (v *Value) atLimit(t int, c *valueCurve, m float64) (q, slope float64) {
	x, later := v.Scale*(m-c.bound), v.horizon[t]-1
	if later == 0 {
		return x, v.Scale
	}
	f := &v.felicity
	ref := f.reference(math.Min(x, c.later))
	now, marginal := f.at(x, ref)
	then, _ := f.at(c.later, ref)
	q = f.inverse((now+later*then)/v.horizon[t], ref, x)
	_, per := f.at(q, ref)
	return q, v.Scale * marginal / (v.horizon[t] * per)
}

// at returns Q and its slope on segment i.
func (c *valueCurve) at(i int, m float64) (q, slope float64) {
	x := m - c.cash[i]
	switch {
	case x < 0: // below the first node, without limit
		return c.q[0] + c.left[0]*x, c.left[0]
	case i == len(c.cash)-1:
		return c.q[i] + c.right[i]*x, c.right[i]
	}
	h := c.cash[i+1] - c.cash[i]
	k := (c.q[i+1] - c.q[i]) / h
	a, b := c.right[i], c.left[i+1]
	c2, c3 := (3*k-2*a-b)/h, (a+b-2*k)/(h*h)
	return c.q[i] + x*(a+x*(c2+x*c3)), a + x*(2*c2+3*x*c3)
}
