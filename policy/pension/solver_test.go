package pension_test

import (
	"context"
	"fmt"
	"math"
	"testing"

	"cistern/income"
	"cistern/policy"
	"cistern/policy/pension"
)

// The solver takes a claimant as it is.
var _ policy.Laws = (*pension.Claimant)(nil)

// certainHousehold earns its mean for sure, does not die before the last age, and
// lives under l; borrowing is whatever limit says.
func certainHousehold(t *testing.T, l *pension.Law, earnings []float64, limit policy.Limit) policy.Household {
	t.Helper()
	e, err := income.Process{FirstAge: 20, Profile: earnings, Chain: income.Degenerate(), Initial: []float64{1}, Transitory: income.Transitory{Nodes: 1}}.Build()
	if err != nil {
		t.Fatal(err)
	}
	claim, _, _ := l.Claims()
	laws, err := l.Claimant(claim, pension.Entitlement{}, pension.Entitlement{}, 0)
	if err != nil {
		t.Fatal(err)
	}
	u, err := policy.NewCRRA(2)
	if err != nil {
		t.Fatal(err)
	}
	return policy.Household{FirstAge: 20, Survival: income.Certain(20, 80), Utility: u, DiscountFactor: 0.97, Return: 0.03, Limit: limit,
		Earnings: e, Pension: policy.Pension{ClaimAge: 20 + claim}, Laws: laws}
}

// consume follows the rule from no assets on and returns consumption by year and
// private assets with the funded balance at the claim.
func consume(t *testing.T, h policy.Household, l *pension.Law) (c []float64, assets, balance float64) {
	t.Helper()
	o := policy.DefaultOptions()
	o.AssetPoints = 60
	rule, err := policy.Solve(context.Background(), h, o)
	if err != nil {
		t.Fatal(err)
	}
	a, claim := 0.0, h.WorkingYears()
	var e pension.Entitlement
	for k := range h.Years() {
		y := 0.0
		if k < claim {
			y, e = h.Laws.Work(k, e, h.Earnings.Mean(k), true)
		} else {
			y = h.Laws.Pension(k, e, 0)
		}
		m := 1.03*a + y
		x, _ := rule.At(k, 0, e, m)
		c = append(c, x)
		a = m - x
		if k == claim-1 {
			assets, balance = a, l.Balance(claim, k, e)
		}
	}
	return c, assets, balance
}

// Derived (Feldstein 1974, Journal of Political Economy 82): with certain income, no
// limit that binds and a funded pillar at the market return, forced saving displaces
// private saving one for one and changes no consumption; with a limit that binds it
// does change it.
func TestFundedPillarDisplacesSaving(t *testing.T) {
	earnings := make([]float64, 45)
	for k := range earnings {
		earnings[k] = 20000 + 800*float64(k) - 10*float64(k*k)
	}
	without := rules()
	without.Flat = &pension.Flat{Amount: constant(5000)}
	with := without
	with.Contributions.Employee = constant(0.1)
	with.FundedAccount = &pension.FundedAccount{Credit: constant(0.1), DrawdownYears: 16}
	c := cohort(income.Certain(20, 80))
	for _, tt := range []struct {
		limit policy.Limit
		same  bool
	}{{policy.Limit{Kind: policy.LimitNatural}, true}, {policy.Limit{Kind: policy.LimitAmount}, false}} {
		l0, l1 := law(t, without, c), law(t, with, c)
		before, assets, _ := consume(t, certainHousehold(t, l0, earnings, tt.limit), l0)
		after, private, balance := consume(t, certainHousehold(t, l1, earnings, tt.limit), l1)
		worst := 0.0
		for k := range before {
			worst = math.Max(worst, math.Abs(after[k]/before[k]-1))
		}
		if !(balance > 100000) {
			t.Fatalf("a balance of %v", balance)
		}
		displaced := (assets - private) / balance
		switch {
		case tt.same && !(worst < 1e-7 && math.Abs(displaced-1) < 1e-6):
			t.Errorf("consumption changes by %.3g, %.9f of the balance is displaced", worst, displaced)
		case !tt.same && !(worst > 0.01 && displaced < 0.99):
			t.Errorf("with a limit consumption changes by %.3g only, and %.6f of the balance is displaced", worst, displaced)
		}
	}
}

func TestClaimantFaults(t *testing.T) {
	l := law(t, rules(), cohort(mortal()))
	if _, err := l.Claimant(44, pension.Entitlement{}, pension.Entitlement{}, 0); err == nil || fmt.Sprint(err) != "pension: claim at 64, want from 65 to 65" {
		t.Errorf("too early: %v", err)
	}
	r := rules()
	r.Floor = &pension.ConsumptionFloor{Amount: constant(1000)}
	if _, err := law(t, r, cohort(mortal())).Claimant(45, pension.Entitlement{}, pension.Entitlement{}, 0); err == nil {
		t.Error("a floor")
	}
	r = rules()
	r.Assistance = &pension.Assistance{Amount: constant(1000), FromAge: constant(65), Assets: pension.Test{Taper: constant(0.1)}}
	if _, err := law(t, r, cohort(mortal())).Claimant(45, pension.Entitlement{}, pension.Entitlement{}, 0); err == nil {
		t.Error("a test of assets")
	}
}
