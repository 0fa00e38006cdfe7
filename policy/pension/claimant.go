package pension

import "fmt"

// A Claimant is a household under a law that works until it claims in a given year.
// Its methods are what the solver asks of public rules (the interface Laws of the
// package policy).
type Claimant struct {
	law     *Law
	claim   int
	initial Entitlement
	typical Entitlement
	final   float64
}

// Claimant returns the household that begins with an entitlement, claims in the
// given year and does not work from then on. typical and final are the entitlement
// and final earnings (money) of a household like it; they say where the bends of one
// pillar's pension lie that depend on the other's.
//
// Rules that look at assets are not the claimant's to judge: it is an error if there
// is a test of assets that takes anything, or a consumption floor. Taxes on interest
// and on consumption are left to who sets the return and the price of consumption.
func (l *Law) Claimant(claim int, initial, typical Entitlement, final float64) (*Claimant, error) {
	if claim < l.claims.earliest || claim > l.claims.latest {
		return nil, fmt.Errorf("pension: claim at %d, want from %d to %d", l.cohort.FirstAge+claim, l.cohort.FirstAge+l.claims.earliest, l.cohort.FirstAge+l.claims.latest)
	}
	for t := range l.years {
		if s := &l.years[t].support; s.Amount > 0 && s.AssetsTaper > 0 {
			return nil, fmt.Errorf("pension: assistance that depends on assets, at %d", l.cohort.FirstAge+t)
		}
	}
	if l.rules.Floor != nil {
		return nil, fmt.Errorf("pension: a consumption floor depends on assets")
	}
	return &Claimant{l, claim, initial, typical, final}, nil
}

// Pillars returns how many entitlements accrue.
func (c *Claimant) Pillars() int { return len(c.law.pillars) }

// Initial returns the entitlement at the beginning of the first year, twice.
func (c *Claimant) Initial() (low, high Entitlement) { return c.initial, c.initial }

// Work returns what a household that has not claimed can spend in year t of its
// earnings, or without employment of its benefit, and its next entitlement.
func (c *Claimant) Work(t int, e Entitlement, earnings float64, employed bool) (income float64, next Entitlement) {
	return c.law.Resources(t, Receipts{Earnings: earnings, Employed: employed}, 0), c.law.Next(t, e, earnings, employed)
}

// Pension returns what it can spend of its pension in year t from the claim on.
func (c *Claimant) Pension(t int, e Entitlement, final float64) float64 {
	return c.law.Resources(t, Receipts{Pension: c.law.Pension(c.claim, t, e, final), Claimed: true}, 0)
}

// GrossPension returns the pension of year t from the claim on before taxes and
// contributions, with what tops it up.
func (c *Claimant) GrossPension(t int, e Entitlement, final float64) float64 {
	p := c.law.Pension(c.claim, t, e, final)
	return p + c.law.years[t].minimum.at(p)
}

// Bends returns the entitlements at which Pension may bend in year t, pillar by
// pillar.
func (c *Claimant) Bends(t int) [MaxPillars][]float64 {
	return c.law.EntitlementKinks(c.claim, t, c.typical, c.final, 0)
}
