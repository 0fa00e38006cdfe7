package policy

import "math"

// ahead is what next year is worth from the assets kept, by next year's persistent
// node: u(Q) and its derivative in next year's cash-on-hand, relative to references.
type ahead struct {
	reference    []float64   // [asset]
	value, slope [][]float64 // [node][asset]
}

// year evaluates year t from the next.
func (v *Value) year(t int) {
	r := v.Rule
	h := &r.Household
	width := 1
	if g := r.accruing(t); g != nil {
		width = g.Len()
	}
	nodes := len(r.Curves[t]) / width
	for k := range width {
		e := h.entitlementAt(r.Entitlements, t, k)
		var shared *ahead
		var at []float64
		for j := range nodes {
			state := j*width + k
			if j > 0 && !h.Working(t) && &r.Curves[t][state].Cash[0] == &r.Curves[t][k].Cash[0] { // alike at all nodes
				v.curves[t][state] = v.curves[t][k]
				continue
			}
			c := refined(&r.Curves[t][state], v.scale)
			assets := kept(c)
			from, to := 0, nodes
			if t+1 < len(r.Curves) && !h.Moves(t) {
				from, to = j, j+1
			}
			if shared == nil || to-from == 1 || !same(assets, at) {
				shared, at = v.look(t, from, to, e, assets), assets
			}
			v.curves[t][state] = v.curve(t, j, c, assets, shared)
		}
	}
}

// refined returns c with further nodes where its own lie far apart, as those of a rule
// that is a line between kinks may: Q is none.
func refined(c *Curve, scale float64) *Curve {
	out := &Curve{Bound: c.Bound}
	add := func(m, consumption, left, right float64) {
		out.Cash, out.Consumption = append(out.Cash, m), append(out.Consumption, consumption)
		out.Left, out.Right = append(out.Left, left), append(out.Right, right)
	}
	for i, m := range c.Cash {
		add(m, c.Consumption[i], c.Left[i], c.Right[i])
		for i+1 < len(c.Cash) {
			m += widest * (scale + math.Min(math.Abs(m), m-c.Cash[0]))
			if !(m < c.Cash[i+1]-1e-3*scale) {
				break
			}
			consumption, slope := c.At(m)
			add(m, consumption, slope, slope)
		}
	}
	return out
}

// widest is the largest distance of nodes of a value relative to how far from the
// first they are.
const widest = 0.1

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

// outcome is what next year's income may be, and what is accrued then.
type outcome struct {
	income, weight float64
	next           Entitlement
}

// look sums what next year is worth over its income outcomes, for the persistent nodes
// in [from, to) of a household with entitlement e; nil sums after the last year.
func (v *Value) look(t, from, to int, e Entitlement, assets []float64) *ahead {
	h := &v.Rule.Household
	w := &ahead{reference: make([]float64, len(assets))}
	if t+1 == len(v.curves) { // estates alone are left
		for i, a := range assets {
			w.reference[i] = v.felicity.reference(float64((1+h.ReturnIn(t+1))*a) + h.Bequest.Shift)
		}
		return w
	}
	outcomes := make([][]outcome, to-from)
	lowest := make([]outcome, to-from)
	for j := range outcomes {
		h.forEachOutcome(t+1, from+j, e, func(income float64, next Entitlement, weight float64) {
			if weight == 0 {
				return
			}
			o := outcome{income, weight, next}
			if outcomes[j] = append(outcomes[j], o); lowest[j].weight == 0 || income < lowest[j].income {
				lowest[j] = o
			}
		})
	}
	for i := range w.reference {
		w.reference[i] = math.Inf(1)
	}
	for j := range outcomes {
		v.across(t, from+j, lowest[j], assets, func(i int, q, _ float64) { w.reference[i] = math.Min(w.reference[i], q) })
	}
	f := &v.felicity
	for i, q := range w.reference {
		w.reference[i] = f.reference(q)
	}
	for j := range outcomes {
		value, slope := make([]float64, len(assets)), make([]float64, len(assets))
		for _, o := range outcomes[j] {
			v.across(t, from+j, o, assets, func(i int, q, d float64) {
				x, marginal := f.at(q, w.reference[i])
				value[i] += o.weight * x
				slope[i] += o.weight * marginal * d
			})
		}
		w.value, w.slope = append(w.value, value), append(w.slope, slope)
	}
	return w
}

// across calls yield with Q and its slope in year t+1 for each of the assets kept in
// year t, whose last stands apart, under an outcome at persistent node j.
func (v *Value) across(t, j int, o outcome, assets []float64, yield func(i int, q, slope float64)) {
	R := 1 + v.Rule.Household.ReturnIn(t+1)
	g := v.Rule.accruing(t + 1)
	var b blend
	if g != nil {
		g.blend(o.next, &b)
	}
	hint := 0
	for i, a := range assets {
		if math.IsInf(a, -1) {
			continue
		}
		if i == len(assets)-1 {
			hint = -1
		}
		var q, d float64
		if m := float64(R*a) + o.income; g == nil {
			q, d, hint = v.at(t+1, j, m, hint)
		} else {
			q, d = v.sum(g, t+1, j, &b, m)
		}
		yield(i, q, d)
	}
}

// curve returns Q in year t at persistent node j, where the rule is c.
func (v *Value) curve(t, j int, c *Curve, assets []float64, next *ahead) valueCurve {
	h, f, k := &v.Rule.Household, &v.felicity, v.Scale
	s, R := h.Survival[t], 1+h.ReturnIn(t+1)
	row := certainty
	if len(next.value) > 1 {
		row = h.Earnings.Chain.Row(j)
	}
	later := func(i int) (value, slope float64) {
		for z := range next.value {
			value += row[z] * next.value[z][i]
			slope += row[z] * next.slope[z][i]
		}
		value, slope = s*v.horizon[t+1]*value, s*v.horizon[t+1]*slope
		if w := h.Bequest.Weight; w > 0 && s < 1 {
			x, marginal := f.at(float64(R*assets[i])+h.Bequest.Shift, next.reference[i])
			value += (1 - s) * w * x
			slope += (1 - s) * w * marginal
		}
		return h.DiscountFactor * value, h.DiscountFactor * R * slope
	}
	n := len(c.Cash)
	out := valueCurve{cash: c.Cash, bound: c.Bound, q: make([]float64, n), left: make([]float64, n), right: make([]float64, n)}
	if rest := v.horizon[t] - 1; rest > 0 && !math.IsInf(c.Bound, -1) {
		value, _ := later(n)
		out.later = f.inverse(value/rest, next.reference[n], c.Bound)
	}
	for i, x := range c.Consumption {
		if next.value == nil {
			next.reference[i] = f.reference(k * x)
		}
		value, slope := later(i)
		utility, now := f.at(k*x, next.reference[i])
		out.q[i] = f.inverse((utility+value)/v.horizon[t], next.reference[i], k*x)
		_, per := f.at(out.q[i], next.reference[i])
		per *= v.horizon[t]
		out.left[i] = (k*now*c.Left[i] + (1-c.Left[i])*slope) / per
		out.right[i] = (k*now*c.Right[i] + (1-c.Right[i])*slope) / per
	}
	out.mend()
	return out
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
