package pension

import "fmt"

// Claiming is a Law as a household meets it that works until it claims and not
// after: what the problem of policy.Household asks of its laws. Money is before
// assistance, which depends on assets. It is immutable and safe for concurrent use.
type Claiming struct {
	law       *Law
	claim     int
	low, high Entitlement
}

// Claiming returns the law for households that claim in year claim (see
// [Law.Claims]), by which they must have begun to work: at the earliest in year 1.
// They begin with an entitlement from low to high. A law with assistance or a
// consumption floor is refused, as a *FieldError: what those pay depends on assets.
func (l *Law) Claiming(claim int, low, high Entitlement) (Claiming, error) {
	l.checkClaim(claim)
	switch {
	case l.rules.Assistance != nil:
		return Claiming{}, &FieldError{Field: "Assistance", Value: "set", Want: "none: it depends on assets"}
	case l.rules.Floor != nil:
		return Claiming{}, &FieldError{Field: "Floor", Value: "set", Want: "none: it depends on assets"}
	case claim == 0:
		return Claiming{}, &FieldError{Field: "claim", Value: fmt.Sprint("age ", l.cohort.FirstAge), Want: "an age above the first: somebody must work"}
	}
	return Claiming{l, claim, low, high}, nil
}

// Pillars returns the number of pillars that accrue an entitlement.
func (c Claiming) Pillars() int { return len(c.law.pillars) }

// Initial returns the entitlements to begin with.
func (c Claiming) Initial() (low, high Entitlement) { return c.low, c.high }

// Work returns net income of working year t ([Law.Net]) and the entitlement after it
// ([Law.Next]).
func (c Claiming) Work(t int, e Entitlement, earnings float64, employed bool) (income float64, next Entitlement) {
	return c.law.Net(t, Receipts{Earnings: earnings, Employed: employed}), c.law.Next(t, e, earnings, employed)
}

// Pension returns net income of year t from the claim on, of a household that claimed
// with entitlement e.
func (c Claiming) Pension(t int, e Entitlement, final float64) float64 {
	return c.law.Net(t, Receipts{Pension: c.law.Pension(c.claim, t, e, final), Claimed: true})
}

// Bends returns the entitlements at which Pension bends in year t, pillar by pillar,
// each as if there were nothing else but the pension from average final earnings.
func (c Claiming) Bends(t int) [MaxPillars][]float64 {
	return c.law.EntitlementKinks(c.claim, t, Entitlement{}, c.law.years[c.claim-1].wage, 0)
}
