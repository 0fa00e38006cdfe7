package pension

import "fmt"

// Parts are the pensions of a household in one year, before any minimum, in money.
type Parts struct {
	Pillars [MaxPillars]float64 // in the order of [Law.Kinds]
	Final   float64             // from final earnings
	Flat    float64
}

// Total returns the sum of the parts.
func (p *Parts) Total() float64 {
	sum := 0.0
	for _, x := range p.Pillars {
		sum += x
	}
	return sum + p.Final + p.Flat
}

// pays returns what entitlement e that was claimed in year c pays in year t.
func (a *accrued) pays(c, t int, e float64) float64 {
	x := a.grow[c] * e
	if f := a.claimed[c].formula; f != nil {
		x = f.At(x)
	}
	return a.paid[c][t] * x
}

// slope returns its slope in e on one side.
func (a *accrued) slope(c, t int, e float64, side Side) float64 {
	d := a.grow[c] * a.paid[c][t]
	if f := a.claimed[c].formula; f != nil {
		d *= f.Marginal(a.grow[c]*e, side)
	}
	return d
}

// checkClaim panics if nobody can claim in year c.
func (l *Law) checkClaim(c int) {
	if c < l.claims.earliest || c > l.claims.latest {
		l.refuse(c)
	}
}

func (l *Law) refuse(c int) {
	panic(fmt.Sprintf("pension: claim in year %d, outside %d to %d", c, l.claims.earliest, l.claims.latest))
}

// Pension returns the gross pension in year t ≥ claim, before any minimum, of a
// household that claimed in year claim with entitlement e, that of the year before,
// and whose last working year's earnings were final; money. It does not fall with
// either. It panics if nobody can claim in that year ([Law.Claims]).
func (l *Law) Pension(claim, t int, e Entitlement, final float64) float64 {
	l.checkClaim(claim)
	sum := 0.0
	for i := range l.pillars {
		sum += l.pillars[i].pays(claim, t, e[i])
	}
	if l.final.paid != nil {
		sum += l.final.pays(claim, t, max(0, final))
	}
	if l.flat != nil && t >= claim {
		sum += l.factor[claim] * l.flat[t]
	}
	return sum
}

// Parts returns the parts of [Law.Pension].
func (l *Law) Parts(claim, t int, e Entitlement, final float64) (p Parts) {
	l.checkClaim(claim)
	for i := range l.pillars {
		p.Pillars[i] = l.pillars[i].pays(claim, t, e[i])
	}
	if l.final.paid != nil {
		p.Final = l.final.pays(claim, t, max(0, final))
	}
	if l.flat != nil && t >= claim {
		p.Flat = l.factor[claim] * l.flat[t]
	}
	return p
}

// PensionSlopes returns the slopes of [Law.Pension] in the entitlements and in final
// earnings, on one side.
func (l *Law) PensionSlopes(claim, t int, e Entitlement, final float64, side Side) (d Entitlement, dFinal float64) {
	l.checkClaim(claim)
	for i := range l.pillars {
		d[i] = l.pillars[i].slope(claim, t, e[i], side)
	}
	if l.final.paid != nil && side.past(final, 0) {
		dFinal = l.final.slope(claim, t, final, side)
	}
	return d, dFinal
}

// PensionKinks returns, pillar by pillar, the entitlements at which [Law.Pension]
// bends, ascending: those of the benefit formula.
func (l *Law) PensionKinks(claim int) (kinks [MaxPillars][]float64) {
	l.checkClaim(claim)
	for i := range l.pillars {
		a := &l.pillars[i]
		if f := a.claimed[claim].formula; f != nil && a.grow[claim] > 0 {
			for _, x := range f.Kinks() {
				kinks[i] = append(kinks[i], x/a.grow[claim])
			}
		}
	}
	return kinks
}

// Balance returns what the funded account of a household that dies at the end of
// year t leaves, in money: all of it before the claim, in a drawdown what has not
// been paid yet, nothing otherwise. e is the entitlement after year t, or after the
// claim that with which it was claimed. A household that has not claimed has claim
// t+1 or later.
func (l *Law) Balance(claim, t int, e Entitlement) float64 {
	for i := range l.pillars {
		a := &l.pillars[i]
		if a.kind != FundedKind {
			continue
		}
		switch {
		case t < claim && l.rules.FundedAccount.ShareDeaths:
			return 0
		case t < claim:
			return e[i] * l.years[t].wage
		case a.rate == nil:
			return 0
		}
		l.checkClaim(claim)
		rate := a.rate[claim]
		return a.pays(claim, claim, e[i]) * drawdown(a.index, rate, claim, t+1, a.years) / (1 + rate)
	}
	return 0
}
