package pension

import (
	"fmt"
	"math"
)

// Convert returns the entitlement under new rules, after year t, of a household that
// has accrued e under the rules before: what a reform owes to those it finds at work.
//
// Pillars that both have keep what is in them. What the others would pay, claimed at
// the new rules' statutory age without further credits, the first pillar that is new
// must pay in that year: for pensions P of the pillars that are gone,
//
//	P = unit·F(e′·Π_{k=t+1}^{c} grow_k).
//
// It is an error if rights are left over with no new pillar to take them, or that
// claim age is none of the old rules.
func (l *Law) Convert(before *Law, t int, e Entitlement) (Entitlement, error) {
	var out Entitlement
	if before.cohort.Birth != l.cohort.Birth || before.cohort.FirstAge != l.cohort.FirstAge || len(before.years) != len(l.years) {
		return out, fmt.Errorf("pension: entitlements are converted within a cohort")
	}
	c := l.claims.normal
	if t >= c {
		return out, fmt.Errorf("pension: entitlements are converted before the claim")
	}
	owed := 0.0
	for i := range before.pillars {
		old := &before.pillars[i]
		if k := l.find(old.kind); k >= 0 {
			out[k] = e[i]
			continue
		}
		if e[i] == 0 {
			continue
		}
		if c < before.claims.earliest || c > before.claims.latest {
			return out, fmt.Errorf("pension: nobody born in %d can claim at %d under the rules before, and what %s has accrued is worth what it would pay then", l.cohort.Birth, l.cohort.FirstAge+c, old.kind)
		}
		owed += old.pays(c, c, e[i]*before.carry(i, t+1, c-1))
	}
	if owed == 0 {
		return out, nil
	}
	for k := range l.pillars {
		if before.find(l.pillars[k].kind) >= 0 {
			continue
		}
		p := &l.pillars[k]
		x, ok := owed/p.claimed[c].unit, true
		if f := p.claimed[c].formula; f != nil {
			x, ok = solve(f.At, 0, math.Inf(1), x)
		}
		if x /= p.grow[c] * l.carry(k, t+1, c-1); !ok || math.IsNaN(x) || math.IsInf(x, 0) {
			return out, fmt.Errorf("pension: no entitlement in %s pays %v a year", p.kind, owed)
		}
		out[k] = x
		return out, nil
	}
	return out, fmt.Errorf("pension: accrued pensions of %v a year have no pillar to go to", owed)
}

// find returns the place of a kind among the pillars, −1 if it is not there.
func (l *Law) find(k Kind) int {
	for i := range l.pillars {
		if l.pillars[i].kind == k {
			return i
		}
	}
	return -1
}

// carry returns what becomes of a unit in pillar i over the years from … to.
func (l *Law) carry(i, from, to int) float64 {
	g := 1.0
	for t := from; t <= to; t++ {
		g *= l.years[t].motion[i].grow
	}
	return g
}
