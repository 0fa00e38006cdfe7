package policy

import "math"

// Closed forms: exact solutions for households whose problem has one. They share
// nothing with the solver and judge it. All of them concern a household without a
// bequest motive that keeps no debt at the end of its last year.

// Lifetime is what a household without risk faces over T years. Discount and
// Gross may differ by year; mortality belongs into Discount.
type Lifetime struct {
	Income   []float64 // [T] net income, money
	Discount []float64 // [T−1] β·s_t > 0 from year t to t+1
	Gross    []float64 // [T−1] gross return R > 0 from year t to t+1
}

// Prospects is Lifetime with risk: a finite chain of persistent nodes, and at each
// node and year finitely many outcomes of income, independent of all else.
type Prospects struct {
	Income     [][][]float64 // [T][node][outcome] net income, money
	Weight     [][][]float64 // [T][node][outcome] probabilities, sum 1 over outcomes
	Transition [][]float64   // [T−1] n×n row-major from year t (row) to t+1 (column)
	Discount   []float64     // [T−1] β·s_t > 0 from year t to t+1
	Gross      []float64     // [T−1] gross return R > 0 from year t to t+1
}

// LinearRule is a rule linear in cash-on-hand m,
//
//	c_t(z, m) = Level[t][z] + Propensity[t]·m,
//
// the form of every solution here without a borrowing limit. It is exact where
// the consumption that it gives lies in the domain of the utility.
type LinearRule struct {
	Level      [][]float64 // [T][node] money
	Propensity []float64   // [T] dc/dm
}

// Consumption returns c_t at a node with the given cash-on-hand.
func (r LinearRule) Consumption(t, node int, cash float64) float64 {
	return r.Level[t][node] + r.Propensity[t]*cash
}

// Path returns consumption by year, [T], of a household that follows the rule's
// node 0 under certain income and has the given cash-on-hand in the first year.
func (r LinearRule) Path(l Lifetime, cash float64) []float64 {
	return l.path(cash, func(t int, cash float64) float64 { return r.Consumption(t, 0, cash) })
}

// path follows a rule under certain income.
func (l Lifetime) path(cash float64, rule func(t int, cash float64) float64) []float64 {
	l.check()
	c := make([]float64, len(l.Income))
	for t := range c {
		c[t] = rule(t, cash)
		if t < len(c)-1 {
			cash = l.Gross[t]*(cash-c[t]) + l.Income[t+1]
		}
	}
	return c
}

// PresentValue returns Σ_t x_t / (R_0·…·R_{t−1}), the value in year 0 of payments
// x, [T]; gross, [T−1], holds R_t from year t to t+1 (textbook definition).
func PresentValue(x, gross []float64) float64 {
	if len(gross) != len(x)-1 {
		panic("policy: present value wants one gross return between neighbouring payments")
	}
	v := x[len(x)-1]
	for t := len(gross) - 1; t >= 0; t-- {
		v = x[t] + v/gross[t]
	}
	return v
}

// HumanWealth returns H_t, [T], the value in year t of income from year t+1 on:
// H_t = (y_{t+1} + H_{t+1})/R_t, 0 in the last year (textbook definition).
func (l Lifetime) HumanWealth() []float64 {
	l.check()
	h := make([]float64, len(l.Income))
	for t := len(l.Gross) - 1; t >= 0; t-- {
		h[t] = (l.Income[t+1] + h[t+1]) / l.Gross[t]
	}
	return h
}

// LifetimeResources returns the present value of what a household can spend from
// year 0 on: cash-on-hand, this year's income in it, plus human wealth.
func (l Lifetime) LifetimeResources(cash float64) float64 { return cash + l.HumanWealth()[0] }

// AnnuityFactors returns A_t, [T], the value in year t of one unit of money a year
// from t to the last year: A_t = 1 + A_{t+1}/R_t (textbook definition).
func AnnuityFactors(gross []float64) []float64 { return growingAnnuity(gross, nil) }

// growingAnnuity returns D_t = 1 + growth_t·D_{t+1}/R_t, [T]: the value of payments
// that grow by these factors. nil means no growth.
func growingAnnuity(gross, growth []float64) []float64 {
	d := make([]float64, len(gross)+1)
	d[len(gross)] = 1
	for t := len(gross) - 1; t >= 0; t-- {
		d[t] = d[t+1] / gross[t]
		if growth != nil {
			d[t] *= growth[t]
		}
		d[t]++
	}
	return d
}

// Lifetime returns what h faces when income at every age is its mean: the problem
// of its certain twin. The estate and the limit are left out.
func (h Household) Lifetime() Lifetime {
	l := Lifetime{Discount: h.discount(), Gross: h.gross()}
	for t := range h.Years() {
		l.Income = append(l.Income, h.MeanIncome(t))
	}
	return l
}

// Prospects returns the income risk that h's solution reckons with. The estate and
// the limit are left out.
func (h Household) Prospects() Prospects {
	n := h.Nodes()
	p := Prospects{Discount: h.discount(), Gross: h.gross()}
	for t := range h.Years() {
		values, weights := make([][]float64, n), make([][]float64, n)
		for j := range n {
			values[j], weights[j] = h.Income(t, j)
		}
		p.Income, p.Weight = append(p.Income, values), append(p.Weight, weights)
		if t == h.Years()-1 {
			break
		}
		move := make([]float64, n*n)
		for j := range n {
			if h.Moves(t) {
				copy(move[j*n:], h.Earnings.Chain.Row(j))
			} else {
				move[j*n+j] = 1
			}
		}
		p.Transition = append(p.Transition, move)
	}
	return p
}

func (h Household) discount() []float64 {
	d := make([]float64, h.Years()-1)
	for t := range d {
		d[t] = h.DiscountFactor * h.Survival[t]
	}
	return d
}

func (h Household) gross() []float64 {
	g := make([]float64, h.Years()-1)
	for t := range g {
		g[t] = 1 + h.ReturnIn(t+1)
	}
	return g
}

// check panics unless the shapes fit.
func (l Lifetime) check() {
	if n := len(l.Income) - 1; n < 0 || len(l.Discount) != n || len(l.Gross) != n {
		panic("policy: lifetime wants T incomes, T−1 discount factors and T−1 returns")
	}
}

// check panics unless the shapes fit; it returns years and nodes.
func (p Prospects) check() (years, nodes int) {
	years = len(p.Income)
	if n := years - 1; n < 0 || len(p.Weight) != years || len(p.Transition) != n || len(p.Discount) != n || len(p.Gross) != n {
		panic("policy: prospects want T years of outcomes and T−1 transitions, discount factors and returns")
	}
	nodes = len(p.Income[0])
	for t := range years {
		if len(p.Income[t]) != nodes || len(p.Weight[t]) != nodes || t < years-1 && len(p.Transition[t]) != nodes*nodes {
			panic("policy: prospects want as many nodes in every year")
		}
		for j := range nodes {
			if len(p.Income[t][j]) != len(p.Weight[t][j]) {
				panic("policy: prospects want one weight for every outcome")
			}
		}
	}
	return years, nodes
}

// logs returns ln(β_t·R_t), [T−1].
func logs(discount, gross []float64) []float64 {
	g := make([]float64, len(gross))
	for t := range g {
		g[t] = math.Log(discount[t] * gross[t])
	}
	return g
}
