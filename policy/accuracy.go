package policy

import (
	"math"
	"slices"

	"cistern/income"
)

// A Judge evaluates Euler-equation errors of a rule (Judd 1992, Journal of
// Economic Theory 58),
//
//	E = |1 − c*/c|,   u′(c*) = β·R·[ s·E u′(c′) + (1−s)·v′(R·a) ],   a = m − c,
//
// the share of consumption by which a household that followed the rule would
// err this year. Utilities that allow consumption at or below zero have |c* − c|
// taken relative to |c| plus mean income instead.
//
// The residual of one year understates the error of the rule: with exponential
// utility a residual e at every age adds up to about e/(R − 1) far from the end of
// life.
type Judge struct {
	rule *Rule
	marginal
	fine   bool
	ahead  frontier  // the rule of year, as records
	year   int       // which year ahead holds
	shock  []float64 // what earnings of that year are multiplied by (form log) or raised by (form level), ascending; fine only
	weight []float64
}

// fineNodes nodes of the trapezoid rule on ±fineSpan standard deviations judge
// against the shock that simulation draws: its error is near 1e-5 of the kink's
// own, below that of any rule worth the name.
const (
	fineNodes = 601
	fineSpan  = 7.0
)

// NewJudge returns a judge that reckons with the solver's own income outcomes or,
// if fine, with a far finer quadrature of the transitory shock. It is not safe
// for concurrent use; several judges of one rule are.
func NewJudge(r *Rule, fine bool) *Judge {
	return &Judge{rule: r, marginal: marginalOf(r.Household, marginal{}), year: -1,
		fine: fine && r.Household.Earnings.Transitory.SD > 0}
}

// refine places the fine quadrature of year t.
func (j *Judge) refine(t int) {
	e := j.rule.Household.Earnings
	sd := e.TransitorySD(t)
	j.shock, j.weight = j.shock[:0], j.weight[:0]
	sum := 0.0
	for i := range fineNodes {
		x := fineSpan * (2*float64(i)/(fineNodes-1) - 1)
		w := math.Exp(-x * x / 2)
		sum += w
		j.weight = append(j.weight, w)
		j.shock = append(j.shock, sd*x)
		if e.Form == income.Log {
			j.shock[i] = math.Exp(j.shock[i] - e.LogShift())
		}
	}
	for i := range j.weight {
		j.weight[i] *= (1 - e.JobLossIn(t).Probability) / sum
	}
}

// Error returns the Euler-equation error in year t at a persistent node with
// cash-on-hand m, and whether the household is at its limit there, of a rule without
// an entitlement; see ErrorIn.
func (j *Judge) Error(t, node int, m float64) (e float64, atLimit bool) {
	return j.ErrorIn(t, State{Node: node, Cash: m})
}

// ErrorIn returns the Euler-equation error in a state of year t, and whether the
// household is at its limit there. At the limit the equation is an inequality: the
// error is how far c exceeds c*, or 0. In the last year nothing is left to judge but
// a bequest motive. Calls are fastest with the same t one after another.
func (j *Judge) ErrorIn(t int, at State) (e float64, atLimit bool) {
	h := j.rule.Household
	c, _ := j.rule.At(t, at.Node, at.Entitlement, at.Cash)
	a := at.Cash - c
	bound := j.rule.Lowest(t, at.Node, at.Entitlement)
	atLimit = a <= bound+1e-10*(1+math.Abs(bound))
	if t == h.Years()-1 && h.Bequest.Weight == 0 {
		return 0, atLimit
	}
	implied := j.implied(t, at, a, c)
	e = (implied - c) / c
	if math.IsInf(h.Utility.Infimum(), -1) {
		e = (implied - c) / (math.Abs(c) + math.Abs(h.MeanIncome(t)))
	}
	if atLimit {
		return math.Max(0, -e), true
	}
	return math.Abs(e), false
}

// implied returns c*, the consumption whose marginal utility is the right side of
// the Euler equation with assets a. Exponential utility is measured from c, so
// that it neither overflows nor vanishes.
func (j *Judge) implied(t int, at State, a, c float64) float64 {
	h := j.rule.Household
	R := 1 + h.ReturnIn(t+1)
	x := R * a
	v := 0.0
	if s := h.Survival[t]; s > 0 {
		j.look(t + 1)
		if h.Moves(t) {
			for next, p := range h.Earnings.Chain.Row(at.Node) {
				if p > 0 {
					v += s * p * j.overIncome(t+1, next, at.Entitlement, x, c)
				}
			}
		} else {
			v = s * j.overIncome(t+1, at.Node, at.Entitlement, x, c)
		}
	}
	if b := h.Bequest; b.Weight > 0 {
		v += (1 - h.Survival[t]) * b.Weight * j.relative(x+b.Shift-j.shift, c)
	}
	v *= h.DiscountFactor * R
	switch j.kind {
	case powerKind:
		return j.inward.at(v) + j.shift
	case exponentialKind:
		return c - math.Log(v)/j.alpha
	}
	return h.Utility.Inverse(v)
}

// look makes the records of year t.
func (j *Judge) look(t int) {
	if j.year == t {
		return
	}
	j.year = t
	j.ahead.reset(len(j.rule.Curves[t]))
	for n := range j.rule.Curves[t] {
		j.ahead.set(n, &j.rule.Curves[t][n], 0, j.shift)
	}
	if j.fine && j.rule.Household.Working(t) {
		j.refine(t)
	}
}

// relative is marginal utility at consumption x + shift, exponential utility's
// measured from c.
func (j *Judge) relative(x, c float64) float64 {
	switch j.kind {
	case powerKind:
		return j.forward.at(x)
	case exponentialKind:
		return math.Exp(-j.alpha * (x - c))
	}
	return j.u.Marginal(x)
}

// overIncome is E u′ in year t at a node to which x and an entitlement were brought
// along.
func (j *Judge) overIncome(t, node int, had Entitlement, x, c float64) float64 {
	h := j.rule.Household
	if h.Laws != nil {
		return j.underLaws(t, node, had, x, c)
	}
	sg := j.ahead.segments[node]
	v := 0.0
	if !j.fine || !h.Working(t) {
		values, weights := h.Income(t, node)
		for k, y := range values {
			next, _ := find(sg, x+y).at(x + y)
			v += weights[k] * j.relative(next, c)
		}
		return v
	}
	e := h.Earnings
	if p := e.JobLossIn(t).Probability; p > 0 {
		m := x + e.Benefit[t][node]
		next, _ := find(sg, m).at(m)
		v = p * j.relative(next, c)
	}
	base := e.Base[t][node]
	i := 0
	for k, f := range j.shock {
		m := x + base + f
		if e.Form == income.Log {
			m = x + base*f
		}
		for m >= sg[i].high {
			i++
		}
		next, _ := sg[i].at(m)
		v += j.weight[k] * j.relative(next, c)
	}
	return v
}

// underLaws is overIncome where laws make net income and entitlement of earnings.
func (j *Judge) underLaws(t, node int, e Entitlement, x, c float64) float64 {
	h := j.rule.Household
	v := 0.0
	add := func(y float64, next Entitlement, weight float64) {
		v += weight * j.relative(j.consumption(t, node, next, x+y), c)
	}
	if !j.fine || !h.Working(t) {
		h.forEachOutcome(t, node, e, add)
		return v
	}
	earn := h.Earnings
	if p := earn.JobLossIn(t).Probability; p > 0 {
		y, next := h.Laws.Work(t, e, earn.Benefit[t][node], false)
		add(y, next, p)
	}
	base := earn.Base[t][node]
	for k, f := range j.shock {
		gross := base + f
		if earn.Form == income.Log {
			gross = base * f
		}
		y, next := h.Laws.Work(t, e, gross, true)
		add(y, next, j.weight[k])
	}
	return v
}

// consumption returns the rule's consumption in year t, whose records are there,
// less subsistence.
func (j *Judge) consumption(t, node int, e Entitlement, m float64) float64 {
	g := j.rule.accruing(t)
	if g == nil {
		c, _ := find(j.ahead.segments[node], m).at(m)
		return c
	}
	var b blend
	g.blend(e, &b)
	first := node * g.Len()
	kink, c := 0.0, 0.0
	for i := range b.n {
		kink += b.weight[i] * j.rule.Curves[t][first+b.node[i]].Cash[0]
	}
	for i := range b.n {
		k := first + b.node[i]
		x := m + g.shift(j.rule.Curves[t][k].Cash[0], kink)
		y, _ := find(j.ahead.segments[k], x).at(x)
		c += b.weight[i] * y
	}
	return c
}

// Errors sums up Euler-equation errors.
type Errors struct {
	States  int     // judged, away from the limit
	AtLimit int     // states at the limit
	Mean    float64 // of the errors away from the limit
	P99     float64
	Max     float64
	Limit   float64 // largest violation of the inequality at the limit
	// where the maximum is
	MaxNode        int
	MaxCash        float64
	MaxEntitlement Entitlement
}

// State is a place at which a rule is judged.
type State struct {
	Node        int
	Cash        float64     // money
	Entitlement Entitlement // this year's credit included
}

// Judge judges year t at the given states.
func (j *Judge) Judge(t int, states []State) Errors {
	var out Errors
	var all []float64
	for _, s := range states {
		e, atLimit := j.ErrorIn(t, s)
		if atLimit {
			out.AtLimit++
			out.Limit = math.Max(out.Limit, e)
			continue
		}
		out.Mean += e
		if e > out.Max {
			out.Max, out.MaxNode, out.MaxCash, out.MaxEntitlement = e, s.Node, s.Cash, s.Entitlement
		}
		all = append(all, e)
	}
	out.States = len(all)
	if len(all) > 0 {
		out.Mean /= float64(len(all))
		slices.Sort(all)
		out.P99 = all[min(len(all)*99/100, len(all)-1)]
	}
	return out
}

// BetweenNodes returns, of a rule without an entitlement, the points half-way between neighbouring nodes of the
// rule in year t, up to the given cash-on-hand, where interpolation is at its
// worst.
func (r *Rule) BetweenNodes(t int, most float64) []State {
	var states []State
	for node := range r.Curves[t] {
		cash := r.Curves[t][node].Cash
		for i := 1; i < len(cash) && cash[i] <= most; i++ {
			states = append(states, State{Node: node, Cash: (cash[i-1] + cash[i]) / 2})
		}
	}
	return states
}
