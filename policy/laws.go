package policy

import "fmt"

// MaxPillars is how many accrued entitlements a household's problem can carry.
const MaxPillars = 2

// Entitlement is what a household has accrued in each pillar, in the units of the
// laws: money a year, points, a balance. Pillars that the laws do not have stay 0.
type Entitlement = [MaxPillars]float64

// Laws are the public rules between gross earnings and what a household can spend:
// taxes and contributions while it works, the entitlement that it accrues, and the
// pension that comes of it. An entitlement that laws accrue is a state of the
// household's problem (see [Solve]).
//
// Index t counts years from the household's first age. Laws must be pure functions,
// safe for concurrent use; money is real. With higher earnings, and with a higher
// entitlement, neither net income nor the next entitlement may fall.
type Laws interface {
	// Pillars returns how many entitlements accrue, from 0 to MaxPillars.
	Pillars() int
	// Initial returns the least and the highest entitlement with which a household
	// can begin its first year, pillar by pillar.
	Initial() (low, high Entitlement)
	// Work returns what a household that enters working year t with entitlement e
	// and has gross earnings (without employment: the benefit in a year of job
	// loss) can spend of them, and its entitlement with this year's credit.
	Work(t int, e Entitlement, earnings float64, employed bool) (income float64, next Entitlement)
	// Pension returns net income in year t from the claim age on, of a household
	// that ended working life with entitlement e and the given final earnings (those
	// that the persistent part supported in the last working year). The entitlement
	// does not change any more.
	Pension(t int, e Entitlement, final float64) float64
	// GrossPension returns that pension before taxes and contributions, whatever tops
	// it up included.
	GrossPension(t int, e Entitlement, final float64) float64
	// Bends returns, pillar by pillar and in any order, the entitlements at which
	// Pension bends in year t, from the claim age on. (Where Work bends in earnings
	// need not be known: the shocks of earnings smooth it.)
	Bends(t int) [MaxPillars][]float64
}

// pillars returns how many entitlements h accrues.
func (h Household) pillars() int {
	if h.Laws == nil {
		return 0
	}
	return h.Laws.Pillars()
}

// outcomes calls yield with every outcome of gross earnings that a household at a
// node can meet in working year t, as the solver reckons.
func (h Household) outcomes(t, node int, yield func(earnings float64, employed bool, weight float64)) {
	values, weights := h.Earnings.Outcomes(t, node)
	loss := -1 // which outcome is job loss
	if h.Earnings.JobLossIn(t).Probability > 0 {
		loss = len(values) - 1
	}
	for o, y := range values {
		yield(y, o != loss, weights[o])
	}
}

// career returns net income, [T], and the entitlement of each year, [T], of a
// household that earns the mean of every age. It must have Laws.
func (h Household) career() (net []float64, accrued []Entitlement) {
	net, accrued = make([]float64, h.Years()), make([]Entitlement, h.Years())
	low, high := h.Laws.Initial()
	var e Entitlement
	for p := range e {
		e[p] = (low[p] + high[p]) / 2
	}
	final := 0.0
	for j, q := range h.Earnings.Distribution[h.WorkingYears()-1] {
		final += q * h.Earnings.Final(j)
	}
	for t := range net {
		if h.Working(t) {
			net[t], e = h.Laws.Work(t, e, h.Earnings.Mean(t), true)
		} else {
			net[t] = h.Laws.Pension(t, e, final)
		}
		accrued[t] = e
	}
	return net, accrued
}

// validateLaws reports laws that cannot be.
func (h Household) validateLaws() error {
	if h.Laws == nil {
		return nil
	}
	if n := h.Laws.Pillars(); n < 0 || n > MaxPillars {
		return &FieldError{"Laws.Pillars", n, fmt.Sprintf("from 0 to %d: the solver carries no more", MaxPillars)}
	}
	low, high := h.Laws.Initial()
	for p := range low {
		if !finite(low[p]) || !finite(high[p]) || low[p] > high[p] {
			return &FieldError{fmt.Sprintf("Laws.Initial, pillar %d", p), fmt.Sprint(low[p], " to ", high[p]), "finite and in order"}
		}
	}
	net, accrued := h.career()
	for t := range net {
		if !finite(net[t]) {
			return &FieldError{fmt.Sprintf("net income at age %d of mean earnings", h.FirstAge+t), net[t], "a finite number"}
		}
		for p, x := range accrued[t] {
			if !finite(x) || p >= h.Laws.Pillars() && x != 0 {
				return &FieldError{fmt.Sprintf("entitlement %d at age %d of mean earnings", p, h.FirstAge+t), x, "a finite number, 0 where there is no such pillar"}
			}
		}
	}
	return nil
}

// forEachOutcome calls yield with the net income and the entitlement that follow,
// with the chance, from each outcome of year t that the solver reckons with at a
// node, for a household that enters it with entitlement e.
func (h Household) forEachOutcome(t, node int, e Entitlement, yield func(income float64, next Entitlement, weight float64)) {
	switch {
	case h.Laws == nil:
		values, weights := h.Income(t, node)
		for o, y := range values {
			yield(y, e, weights[o])
		}
	case h.Working(t):
		h.outcomes(t, node, func(earnings float64, employed bool, weight float64) {
			y, next := h.Laws.Work(t, e, earnings, employed)
			yield(y, next, weight)
		})
	default:
		yield(h.Laws.Pension(t, e, h.Earnings.Final(node)), e, 1)
	}
}
