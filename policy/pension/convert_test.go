package pension_test

import (
	"testing"

	"cistern/policy/pension"
)

// Points that become a notional account, at 45: claimed at 67 without further credits
// both pay the same; what both rules have stays as it is; no new pillar is an error.
func TestConvert(t *testing.T) {
	s := mortal()
	before := rules()
	before.Contributions.Employee = constant(0.2)
	before.Claim = pension.Claim{Statutory: constant(65), Earliest: constant(62), Latest: constant(70), Increase: pension.FlatRate(0.06), Reduction: pension.FlatRate(0.04)}
	before.Points = &pension.Points{Cap: constant(2), Value: constant(0.01), Indexation: pension.WithWages()}
	before.FundedAccount = &pension.FundedAccount{Credit: constant(0.02)}
	after := before
	after.Claim.Statutory = constant(67)
	after.Points = nil
	after.NotionalAccount = &pension.NotionalAccount{Credit: constant(0.16), Return: pension.WithPrices(), DivisorRate: constant(0.02)}
	old, l := law(t, before, cohort(s)), law(t, after, cohort(s))
	e := pension.Entitlement{27, 3.5}
	got, err := l.Convert(old, 24, e)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "funded account", got[1], 3.5, 0)
	a, b := e, got
	for t := 25; t < 47; t++ {
		a, b = old.Next(t, a, 0, false), l.Next(t, b, 0, false)
	}
	p, q := old.Parts(47, 47, a, 0), l.Parts(47, 47, b, 0)
	near(t, "pension at 67", q.Pillars[0]/p.Pillars[0], 1, 1e-14)
	near(t, "of 27 points, two years late", p.Pillars[0], 27*0.01*1.12*old.Wage(47), 1e-9)

	// Into a career average with a formula.
	formula := before
	formula.Points = nil
	formula.CareerAverage = &pension.CareerAverage{Accrual: constant(0.01), Formula: []pension.Step{{From: constant(0), Rate: constant(0.9)}, {From: constant(0.1), Rate: constant(0.3)}}}
	l = law(t, formula, cohort(s))
	if b, err = l.Convert(old, 24, e); err != nil {
		t.Fatal(err)
	}
	a = e
	for t := 25; t < 45; t++ {
		a, b = old.Next(t, a, 0, false), l.Next(t, b, 0, false)
	}
	p, q = old.Parts(45, 45, a, 0), l.Parts(45, 45, b, 0)
	near(t, "pension at 65", q.Pillars[0]/p.Pillars[0], 1, 1e-14)

	// Out of a career average revalued with prices, which loses ground to wages.
	prices := before
	prices.Points = nil
	prices.CareerAverage = &pension.CareerAverage{Accrual: constant(0.01), Revaluation: pension.WithPrices()}
	lagging := law(t, prices, cohort(s))
	l = law(t, after, cohort(s))
	if b, err = l.Convert(lagging, 24, pension.Entitlement{0.3, 0}); err != nil {
		t.Fatal(err)
	}
	a = pension.Entitlement{0.3, 0}
	for t := 25; t < 47; t++ {
		a, b = lagging.Next(t, a, 0, false), l.Next(t, b, 0, false)
	}
	p, q = lagging.Parts(47, 47, a, 0), l.Parts(47, 47, b, 0)
	near(t, "pension at 67, in real money of 2024", p.Pillars[0], 0.3*1.12*lagging.Wage(24), 1e-9)
	near(t, "the same from the account", q.Pillars[0]/p.Pillars[0], 1, 1e-14)

	same, err := old.Convert(old, 24, e)
	if err != nil || same != e {
		t.Errorf("no change turns %v into %v, %v", e, same, err)
	}
	nothing := before
	nothing.Points = nil
	if _, err := law(t, nothing, cohort(s)).Convert(old, 24, e); err == nil {
		t.Error("points with nowhere to go")
	}
	if got, err := law(t, nothing, cohort(s)).Convert(old, 24, pension.Entitlement{0, 3.5}); err != nil || got != (pension.Entitlement{3.5, 0}) {
		t.Errorf("an account that moves to the first place: %v, %v", got, err)
	}
	late := after
	late.Claim.Statutory, late.Claim.Latest = constant(72), constant(72)
	if _, err := law(t, late, cohort(s)).Convert(old, 24, e); err == nil {
		t.Error("an age at which nobody could claim before")
	}
	other := cohort(s)
	other.Birth++
	if _, err := law(t, after, other).Convert(old, 24, e); err == nil {
		t.Error("another cohort")
	}
	if _, err := l.Convert(old, 47, e); err == nil {
		t.Error("after the claim")
	}
}
