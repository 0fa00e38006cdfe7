package policy

import "math"

// CertainLimit is the solution without risk but with a borrowing limit, under CRRA
// or Stone–Geary utility. A household that next meets its limit in year t+h has
// until then no use for later income, so
//
//	c_t(m) = min_h ( m + Σ_{i≤h} y_{t+i}/R^i + b_{t+h}/R^h ) / Σ_{i≤h} (βR)^(i/γ)/R^i,
//
// h from 0 to T−t, R^i and (βR)^(i/γ) products over years (derived: consumption
// can grow faster than (βR)^(1/γ) a year, never slower, which bounds c_t by every
// term; the first year in which the limit binds attains the bound). Every change of
// the minimum is a kink of the rule.
type CertainLimit struct {
	lifetime    Lifetime
	growth      []float64 // [T−1] (β_t·R_t)^(1/γ)
	limit       []float64 // [T] b_t
	subsistence float64
}

// NewCertainLimit returns the solution when assets at the end of year t must stay
// at or above −b_t, where b_t is the amount borrowing ≥ 0 while income still to come
// above subsistence can repay it, and what it can repay afterwards. +Inf is the
// natural limit. CRRA utility is Stone–Geary utility with subsistence 0.
func NewCertainLimit(u StoneGeary, l Lifetime, borrowing float64) CertainLimit {
	l = l.less(u.subsistence)
	b := l.HumanWealth()
	for t := range b {
		b[t] = math.Min(b[t], borrowing)
	}
	return CertainLimit{l, growthCRRA(u.excess(), l), b, u.subsistence}
}

// Consumption returns c_t with the given cash-on-hand, in money, and the year in
// which the limit binds next (t itself where it binds now, the last year where it
// never does).
func (s CertainLimit) Consumption(t int, cash float64) (consumption float64, binds int) {
	resources, annuity, factor := cash-s.subsistence, 1.0, 1.0
	discount := 1.0
	best := math.Inf(1)
	for k := t; ; k++ {
		if c := (resources + discount*s.limit[k]) / annuity; c < best {
			best, binds = c, k
		}
		if k == len(s.growth) {
			return s.subsistence + best, binds
		}
		discount /= s.lifetime.Gross[k]
		factor *= s.growth[k]
		resources += discount * s.lifetime.Income[k+1]
		annuity += discount * factor
	}
}

// Path returns consumption by year, [T], from the given cash-on-hand in year 0.
func (s CertainLimit) Path(cash float64) []float64 {
	c := s.lifetime.path(cash-s.subsistence, func(t int, cash float64) float64 {
		c, _ := s.Consumption(t, cash+s.subsistence)
		return c - s.subsistence
	})
	for t := range c {
		c[t] += s.subsistence
	}
	return c
}
