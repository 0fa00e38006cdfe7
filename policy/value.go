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
// binds, V is exact; above them Q is a line. For k = 1 the slope is the envelope
// condition V′ = u′(c) (Benveniste and Scheinkman 1979, Econometrica 47). Expectations
// are over the solver's own outcomes. A Value is immutable and safe for concurrent
// use.
type Value struct {
	Rule    *Rule
	Scale   float64 // k
	horizon []float64
	curves  [][]valueCurve // [t][node]
}

// valueCurve is Q at one age and node.
type valueCurve struct {
	cash, q, left, right []float64 // left and right: dQ/dm from below and from above
	bound, atBound       float64   // below cash[0] the limit binds: V = u(k·(m − bound)) + atBound
}

// NewValue evaluates a rule without laws with consumption scaled by k > 0; 1: as it is.
// It takes about as long as solving.
func NewValue(r *Rule, k float64) *Value {
	if r.Household.Laws != nil {
		panic("policy: the value of a rule under laws is not reckoned")
	}
	T := len(r.Curves)
	v := &Value{Rule: r, Scale: k, horizon: make([]float64, T+1), curves: make([][]valueCurve, T)}
	h := &r.Household
	for t := T - 1; t >= 0; t-- {
		s := h.Survival[t]
		v.horizon[t] = 1 + h.DiscountFactor*(s*v.horizon[t+1]+(1-s)*h.Bequest.Weight)
		v.curves[t] = make([]valueCurve, len(r.Curves[t]))
		v.year(t)
	}
	return v
}

// ahead is what next year is worth from the assets kept, by next year's node.
type ahead struct{ value, slope [][]float64 } // [node][asset]

// year evaluates year t from the next.
func (v *Value) year(t int) {
	r := v.Rule
	nodes := len(r.Curves[t])
	var shared *ahead
	var at []float64
	for j := range nodes {
		c := &r.Curves[t][j]
		assets := kept(c)
		from, to := 0, nodes
		if t+1 < len(r.Curves) && !r.Household.Moves(t) {
			from, to = j, j+1
		}
		if shared == nil || to-from == 1 || !same(assets, at) {
			shared, at = v.look(t, from, to, assets), assets
		}
		v.curve(t, j, from, assets, shared)
	}
}

// kept lists the assets at the nodes of a curve, and last those where the limit
// binds.
func kept(c *Curve) []float64 {
	a := make([]float64, len(c.Cash), len(c.Cash)+1)
	for i, m := range c.Cash {
		a[i] = m - c.Consumption[i]
	}
	return append(a, c.Bound)
}

// same reports whether two lists of assets differ by rounding only.
func same(a, b []float64) bool {
	if len(a) != len(b) {
		return false
	}
	for i, x := range a {
		if x != b[i] && !(math.Abs(x-b[i]) <= 1e-13*math.Max(1, math.Abs(x))) {
			return false
		}
	}
	return true
}

// look sums what next year is worth over its income outcomes, for the nodes in
// [from, to); nil after the last year.
func (v *Value) look(t, from, to int, assets []float64) *ahead {
	h := &v.Rule.Household
	if t+1 == len(v.curves) {
		return &ahead{}
	}
	R := 1 + h.ReturnIn(t+1)
	w := &ahead{}
	for j := from; j < to; j++ {
		value, slope := make([]float64, len(assets)), make([]float64, len(assets))
		incomes, weights := h.Income(t+1, j)
		for k, y := range incomes {
			hint := 0
			for i, a := range assets {
				if math.IsInf(a, -1) || weights[k] == 0 {
					continue
				}
				if i == len(assets)-1 {
					hint = 0 // the bound lies below all others
				}
				var x, d float64
				x, d, hint = v.at(t+1, j, float64(R*a)+y, hint)
				value[i] += weights[k] * x
				slope[i] += weights[k] * d
			}
		}
		w.value, w.slope = append(w.value, value), append(w.slope, slope)
	}
	return w
}

// curve fills the curve of year t and node j.
func (v *Value) curve(t, j, from int, assets []float64, next *ahead) {
	h, c, k := &v.Rule.Household, &v.Rule.Curves[t][j], v.Scale
	u, s := h.Utility, h.Survival[t]
	R := 1 + h.ReturnIn(t+1)
	row := certainty
	if len(next.value) > 1 {
		row = h.Earnings.Chain.Row(j)
	}
	later := func(i int) (value, slope float64) {
		for z := range next.value {
			value += row[z] * next.value[z][i]
			slope += row[z] * next.slope[z][i]
		}
		value, slope = s*value, s*slope
		if w := h.Bequest.Weight; w > 0 && s < 1 {
			estate := float64(R*assets[i]) + h.Bequest.Shift
			value += (1 - s) * w * u.Value(estate)
			slope += (1 - s) * w * u.Marginal(estate)
		}
		return h.DiscountFactor * value, h.DiscountFactor * R * slope
	}
	out := valueCurve{cash: c.Cash, bound: c.Bound, q: make([]float64, len(c.Cash)), left: make([]float64, len(c.Cash)), right: make([]float64, len(c.Cash))}
	if !math.IsInf(c.Bound, -1) {
		out.atBound, _ = later(len(assets) - 1)
	}
	for i, x := range c.Consumption {
		value, slope := later(i)
		out.q[i] = valueInverse(u, (u.Value(k*x)+value)/v.horizon[t], k*x)
		now := k * u.Marginal(k*x)
		per := v.horizon[t] * u.Marginal(out.q[i])
		out.left[i] = (now*c.Left[i] + (1-c.Left[i])*slope) / per
		out.right[i] = (now*c.Right[i] + (1-c.Right[i])*slope) / per
	}
	out.mend()
	v.curves[t][j] = out
}

// mend gives nodes where life is worth −∞, at a natural limit, the slope towards
// the next.
func (c *valueCurve) mend() {
	for i := range c.q {
		if finite(c.left[i]) && finite(c.right[i]) {
			continue
		}
		k := min(i, len(c.q)-2)
		secant := (c.q[k+1] - c.q[k]) / (c.cash[k+1] - c.cash[k])
		c.left[i], c.right[i] = secant, secant
	}
}

// At returns the value, in utility, of following the rule from year t on at a
// persistent node with cash-on-hand m (money), and its derivative in m.
func (v *Value) At(t, node int, m float64) (value, slope float64) {
	value, slope, _ = v.at(t, node, m, -1)
	return value, slope
}

// Equivalent returns the certain yearly consumption, in money, that is worth as
// much.
func (v *Value) Equivalent(t, node int, m float64) float64 {
	value, _ := v.At(t, node, m)
	return valueInverse(v.Rule.Household.Utility, value/v.horizon[t], m)
}

// at is At; hint is a node that m lies above, −1 if none is known, and comes back for
// a higher m.
func (v *Value) at(t, node int, m float64, hint int) (value, slope float64, next int) {
	c := &v.curves[t][node]
	u, n := v.Rule.Household.Utility, len(c.cash)
	if m < c.cash[0] && !math.IsInf(c.bound, -1) {
		x := v.Scale * (m - c.bound)
		return u.Value(x) + c.atBound, v.Scale * u.Marginal(x), 0
	}
	i := hint
	if hint < 0 {
		i = max(0, sort.Search(n, func(i int) bool { return c.cash[i] > m })-1)
	}
	for i < n-1 && c.cash[i+1] <= m {
		i++
	}
	q, d := c.at(i, m)
	return v.horizon[t] * u.Value(q), v.horizon[t] * u.Marginal(q) * d, i
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

// valueInverse returns the consumption c with u(c) = value. guess is where to look
// for families that are not built in.
func valueInverse(u Utility, value, guess float64) float64 {
	switch f := u.(type) {
	case CRRA:
		if f.gamma == 1 {
			return math.Exp(value)
		}
		return math.Pow((1-f.gamma)*value, 1/(1-f.gamma))
	case StoneGeary:
		return f.subsistence + valueInverse(CRRA{f.gamma}, value, guess)
	case CARA:
		return -math.Log(-f.alpha*value) / f.alpha
	case Quadratic:
		return f.bliss - math.Sqrt(-2*value)
	}
	return search(u, value, guess)
}

// search brackets and halves: a family of somebody else's may bend as it likes.
func search(u Utility, value, guess float64) float64 {
	low, high, floor := guess, guess, u.Infimum()
	for step := math.Max(1e-3, math.Abs(guess)/2); u.Value(high) < value && !math.IsInf(high, 1); step *= 2 {
		high += step
	}
	for step := math.Max(1e-3, math.Abs(guess)/2); u.Value(low) > value && !math.IsInf(low, -1); step *= 2 {
		if low -= step; low <= floor {
			low = floor
			break
		}
	}
	for range 200 {
		mid := low + (high-low)/2
		if mid == low || mid == high {
			break
		}
		if u.Value(mid) < value {
			low = mid
		} else {
			high = mid
		}
	}
	return high
}
