package sim

import (
	"math"

	"cistern/income"
	"cistern/policy"
)

// law is what one year of life does to the households of a type: where their
// income comes from, what their assets earn, how they consume and who survives.
type law struct {
	returns float64 // R, on what was kept last year
	working bool
	form    income.Form
	base    []float64    // [node] earnings at a mean transitory shock, money
	benefit []float64    // [node] income in a year of job loss, money
	sd      float64      // of the transitory shock
	factor  *normalTable // exp(ε − shift) in form log, ε in form level
	epsilon *normalTable // ε, where it is wanted
	jobLoss uint64       // of 2^32
	pension []float64    // [node] money

	rule    *policy.Table
	top     float64   // lowest top of the rule over the nodes
	bound   []float64 // [node] lowest assets at the end of the year
	survive uint64    // of 2^32
	moves   bool      // the persistent node can change before next year
}

// newLaw returns the law of year t of h, but for the rule.
func newLaw(h *policy.Household, t int, want Columns, tables *tableCache) law {
	l := law{returns: 1 + h.ReturnIn(t), working: h.Working(t), survive: of32(h.Survival[t]), moves: h.Moves(t)}
	e := h.Earnings
	l.form = e.Form
	if !l.working {
		l.pension = make([]float64, h.Nodes())
		for j := range l.pension {
			l.pension[j] = h.PensionIn(t, j)
		}
		return l
	}
	l.base, l.benefit, l.jobLoss, l.sd = e.Base[t], e.Benefit[t], of32(e.JobLossIn(t).Probability), e.TransitorySD(t)
	if want&Shocks != 0 || l.form == income.Level {
		l.epsilon = tables.get(tableKey{sd: l.sd})
	}
	l.factor = l.epsilon
	if l.form == income.Log {
		l.factor = tables.get(tableKey{sd: l.sd, shift: e.LogShift(), exp: true})
	}
	return l
}

// follow sets the rule to year t of r.
func (l *law) follow(r *policy.Rule, t int) {
	bounds := make([]float64, len(r.Curves[t]))
	for j := range bounds {
		bounds[j] = r.Curves[t][j].Bound
	}
	l.setRule(r.Table(t), bounds)
}

func (l *law) setRule(table *policy.Table, bounds []float64) {
	l.rule, l.bound, l.top = table, bounds, math.Inf(1)
	for j := range bounds {
		l.top = math.Min(l.top, table.Top(j))
	}
}

// earn sets earnings, or the benefit in a year of job loss, from the year's draws 0
// and 2.
func (l *law) earn(node []uint8, x0, x2 []uint64, y []float64) {
	var base, benefit [256]float64 // indexed by a byte: no bound is checked
	copy(base[:], l.base)
	copy(benefit[:], l.benefit)
	node, x0, x2 = node[:len(y)], x0[:len(y)], x2[:len(y)]
	switch {
	case l.sd == 0:
		for i, j := range node {
			y[i] = base[j]
		}
	case l.form == income.Log:
		factor := l.factor
		for i, x := range x0 {
			y[i] = base[node[i]] * factor.at(x)
		}
	default:
		factor := l.factor
		for i, x := range x0 {
			y[i] = base[node[i]] + factor.at(x)
		}
	}
	if l.jobLoss > 0 {
		for i, x := range x2 {
			if x>>32 < l.jobLoss {
				y[i] = benefit[node[i]]
			}
		}
	}
}

// shocks says what shocks the year's draws 0 and 2 are.
func (l *law) shocks(x0, x2 []uint64, epsilon []float64, employed []bool) {
	if l.sd == 0 {
		clear(epsilon)
	} else {
		for i, x := range x0[:len(epsilon)] {
			epsilon[i] = l.epsilon.at(x)
		}
	}
	for i := range employed {
		employed[i] = true
	}
	if l.jobLoss > 0 {
		for i, x := range x2[:len(employed)] {
			if x>>32 < l.jobLoss {
				employed[i], epsilon[i] = false, 0
			}
		}
	}
}

// jobLosses says who loses earnings, from the year's draws 2.
func (l *law) jobLosses(x2 []uint64, lost []bool) {
	if l.jobLoss == 0 {
		clear(lost)
		return
	}
	for i, x := range x2[:len(lost)] {
		lost[i] = x>>32 < l.jobLoss
	}
}

// lowest sets the lowest assets that the limit allows.
func (l *law) lowest(dst []float64, node []uint8) {
	for i, j := range node[:len(dst)] {
		dst[i] = l.bound[j]
	}
}

// retire sets the income of a retired year.
func (l *law) retire(node []uint8, y []float64) {
	var pension [256]float64
	copy(pension[:], l.pension)
	y = y[:len(node)]
	for i, j := range node {
		y[i] = pension[j]
	}
}

// collect sets cash-on-hand from last year's assets and this year's income. The
// conversion keeps the product from being fused with the sum.
func (l *law) collect(cash, assets, income []float64) {
	assets, income = assets[:len(cash)], income[:len(cash)]
	R := l.returns
	for i, a := range assets {
		cash[i] = float64(R*a) + income[i]
	}
}

// settle sets assets = cash − consumption, not below the bound (rounding alone
// could bring them there). It returns the highest cash and the index of a household
// whose consumption its utility does not allow, at or below floor, or −1.
func (l *law) settle(node []uint8, cash, consumption, assets []float64, floor float64) (highest float64, at int) {
	node, consumption, assets = node[:len(cash)], consumption[:len(cash)], assets[:len(cash)]
	var bound [256]float64
	copy(bound[:], l.bound)
	highest = math.Inf(-1)
	low, sum := false, 0.0
	for i, m := range cash {
		c := consumption[i]
		a := m - c
		if least := bound[node[i]]; a < least {
			a = least
			c = m - a
			consumption[i] = c
		}
		assets[i] = a
		sum += c // what is not finite anywhere is not finite in the sum
		if c <= floor {
			low = true
		}
		if m > highest {
			highest = m
		}
	}
	if !low && math.Abs(sum) <= math.MaxFloat64 {
		return highest, -1
	}
	return highest, unsound(consumption, floor)
}

// unsound returns the index of a consumption that is not a number above the floor,
// or −1.
func unsound(consumption []float64, floor float64) int {
	for i, c := range consumption {
		if !(c > floor && c <= math.MaxFloat64) {
			return i
		}
	}
	return -1
}

// above counts the states above the top of the rule's grid.
func (l *law) above(node []uint8, cash []float64) (n int64) {
	for i, m := range cash {
		if m > l.rule.Top(int(node[i])) {
			n++
		}
	}
	return n
}

// atLimit says who keeps no more than the lowest assets allowed.
func (l *law) atLimit(dst []bool, node []uint8, assets []float64) {
	for i, a := range assets {
		low := l.bound[node[i]]
		dst[i] = a <= low+1e-9*(1+math.Abs(low))
	}
}
