package pension

import (
	"fmt"
	"math"
)

// An accrued is a pillar of a Law.
type accrued struct {
	kind    Kind
	claimed []claimable // [c]
	grow    []float64   // [c] of an entitlement from the last working year to c
	index   []float64   // [T] level of pensions in payment, of which ratios count
	paid    [][]float64 // [c][t] what a unit of F(e) claimed in c pays in t; nil where nobody can claim
	years   int         // how long it is paid
	rate    []float64   // [c] the return that prices a drawdown; nil for life
}

// fillPillars sets entitlements and pensions.
func (l *Law) fillPillars(r *resolver) {
	T := len(l.years)
	ceiling := make([]float64, T)
	for t := range ceiling {
		ceiling[t] = l.years[t].ceiling
	}
	for i, p := range l.rules.pillars() {
		m := p.motions(r, ceiling)
		for t := range m {
			l.years[t].motion[i] = m[t]
		}
		if fund, ok := p.(*FundedAccount); ok {
			fund.checkCredit(r, l.rules.Contributions)
		}
		if len(*r.f) == 0 {
			l.pillars = append(l.pillars, l.accrue(r, p, m))
		}
	}
	if len(*r.f) > 0 {
		return
	}
	if p := l.rules.FinalEarnings; p != nil {
		l.final = accrued{claimed: make([]claimable, T), grow: make([]float64, T), index: r.chain("FinalEarnings.Indexation", p.Indexation), years: T}
		base := make([]float64, T)
		for c := l.lowest(); c <= l.claims.latest; c++ {
			l.final.grow[c], base[c] = 1, r.at("FinalEarnings.Rate", p.Rate, c)
			l.final.claimed[c].unit = base[c]
		}
		l.adjust(r, &l.final, base)
		l.fillPaid(&l.final)
	}
	if p := l.rules.Flat; p != nil {
		l.flat = r.amounts("Flat.Amount", p.Amount, r.levels("Flat.Uprating", p.Uprating))
		a := accrued{claimed: make([]claimable, T), index: l.flat}
		for c := range T {
			a.claimed[c].unit = 1
		}
		l.adjust(r, &a, l.flat)
		l.factor = make([]float64, T)
		for c := range T {
			l.factor[c] = a.claimed[c].unit
		}
	}
}

// lowest returns the first year whose claims are looked at: the earliest, or that
// of the whole age before the statutory one.
func (l *Law) lowest() int {
	return max(0, min(l.claims.earliest, int(math.Floor(l.claims.statutory))-l.cohort.FirstAge))
}

// accrue returns a pillar by claim year.
func (l *Law) accrue(r *resolver, p pillar, m []motion) accrued {
	T := len(l.years)
	payment, years := p.payment()
	a := accrued{kind: p.kind(), claimed: make([]claimable, T), grow: make([]float64, T), years: years}
	a.index = r.chain(p.kind().field()+".Indexation", payment)
	if years == 0 {
		a.years = T
	} else if fund, ok := p.(*FundedAccount); ok {
		a.rate = make([]float64, T)
		for c := range a.rate {
			a.rate[c] = fund.gross(r, c) - 1
		}
	}
	for c := l.lowest(); c <= l.claims.latest; c++ {
		a.grow[c], a.claimed[c] = m[c].grow, p.claimed(r, c, a.index)
	}
	if p.adjusted() {
		base, kept := make([]float64, T), 1.0
		for c := range T {
			if c > 0 {
				kept *= m[c].grow
			}
			base[c] = kept * a.claimed[c].unit
		}
		l.adjust(r, &a, base)
	}
	l.fillPaid(&a)
	return a
}

// adjust multiplies what a pillar pays with the factor for the claim age. base is
// what a claim in year c pays in that year if nothing is credited any more, [c]; it
// may be 0 where nobody claims.
func (l *Law) adjust(r *resolver, a *accrued, base []float64) {
	if len(*r.f) > 0 {
		return
	}
	factor := func(c int) float64 { return l.rules.Claim.factor(r, l.claims.statutory, c) }
	if fair := l.rules.Claim.Fair; fair != nil {
		ratio := make([]float64, len(base))
		for c := range ratio {
			if ratio[c] = base[c] / a.index[c]; a.index[c] == 0 {
				ratio[c] = 1 // a flat pension of nothing
			}
		}
		v := worths(l.cohort.Survival, ratio, a.index, r.at("Claim.Fair.Rate", fair.Rate, 0))
		normal := l.worthAt(v, l.claims.statutory)
		factor = func(c int) float64 {
			if v[c] == 0 {
				return 1
			}
			return normal / v[c]
		}
	}
	for c := l.claims.earliest; c <= l.claims.latest; c++ {
		x := factor(c)
		if !(x >= 0) || math.IsInf(x, 1) {
			r.f.add("Claim", fmt.Sprintf("a factor of %.6g", x), fmt.Sprintf("one of at least 0 at claim age %d (birth year %d): a smaller reduction or a later earliest age", l.cohort.FirstAge+c, l.cohort.Birth))
			return
		}
		a.claimed[c].unit *= x
	}
}

// fillPaid sets paid from what it is made of.
func (l *Law) fillPaid(a *accrued) {
	a.paid = make([][]float64, len(l.years))
	for c := l.claims.earliest; c <= l.claims.latest; c++ {
		a.paid[c] = make([]float64, len(l.years))
		for t := c; t < min(c+a.years, len(l.years)); t++ {
			a.paid[c][t] = a.claimed[c].unit * (a.index[t] / a.index[c])
		}
	}
}

// worthAt reads v at an age; between whole ages its logarithm is linear.
func (l *Law) worthAt(v []float64, age float64) float64 {
	t := age - float64(l.cohort.FirstAge)
	k := int(math.Floor(t))
	part := t - float64(k)
	if part == 0 || v[k] == 0 || v[k+1] == 0 {
		return v[k]
	}
	return math.Pow(v[k], 1-part) * math.Pow(v[k+1], part)
}
