package policy

import (
	"errors"
	"math"
	"strings"
	"testing"

	"cistern/income"
)

// With certain income 1, R = 1.25 and T = 4 the natural limit is the present value
// of what is still to come: 0.8, 0.8 + 0.64, … (derived by hand), and an amount
// below it holds until less than that can be repaid.
func TestBounds(t *testing.T) {
	h := certainHousehold(t, family(t)(NewCRRA(2)), constant(1), 4, 0.9, 0.25, Limit{Kind: LimitNatural})
	for _, tt := range []struct {
		name  string
		limit Limit
		want  []float64
	}{
		{"natural", Limit{Kind: LimitNatural}, []float64{-(0.8 + 0.64 + 0.512), -(0.8 + 0.64), -0.8, 0}},
		{"amount", Limit{Amount: 1}, []float64{-1, -1, -0.8, 0}},
		{"none to owe", Limit{}, []float64{0, 0, 0, 0}},
	} {
		h.Limit = tt.limit
		got, err := h.bounds(nil)
		if err != nil {
			t.Fatal(err)
		}
		for year, want := range tt.want {
			if math.Abs(got[year][0]-want) > 1e-15 {
				t.Errorf("%s: bound of year %d is %v, want %v", tt.name, year, got[year][0], want)
			}
		}
	}
}

// With income 1 and R = 1.25 a household that may owe nothing must begin with more
// than −1/1.25, and one that may owe 1.952 with more than −(1 + 1.952)/1.25
// (derived by hand).
func TestLeastStart(t *testing.T) {
	h := certainHousehold(t, family(t)(NewCRRA(2)), constant(1), 4, 0.9, 0.25, Limit{})
	if got := h.LeastStart(); math.Abs(got+0.8) > 1e-15 {
		t.Errorf("without debt: %v, want -0.8", got)
	}
	h.Limit = Limit{Kind: LimitNatural}
	if got := h.LeastStart(); math.Abs(got+2.952*0.8) > 1e-15 {
		t.Errorf("with the natural limit: %v, want %v", got, -2.952*0.8)
	}
	h.Utility = family(t)(NewCARA(1))
	if got := h.LeastStart(); !math.IsInf(got, -1) {
		t.Errorf("where consumption may be negative: %v, want -Inf", got)
	}
}

// Households that cannot live by what they face are refused, with the reason.
func TestImpossibleHouseholds(t *testing.T) {
	risky := riskyHousehold(t)
	level := exponentialHousehold(t, income.Level, income.Degenerate())
	level.Utility, level.Limit = family(t)(NewCRRA(2)), Limit{Kind: LimitNatural}
	for _, tt := range []struct {
		name   string
		h      Household
		change func(*Household)
		field  string
		want   string
	}{
		{"subsistence above the lowest income", risky, func(h *Household) { h.Utility = family(t)(NewStoneGeary(2, 0.5)) }, "Earnings", "stays above 0.5"},
		{"subsistence that only debt would pay for", risky, func(h *Household) {
			h.Utility, h.Pension.Flat = family(t)(NewStoneGeary(2, 0.5)), 10
		}, "Earnings", "stays above 0.5"},
		{"estate in debt", risky, func(h *Household) { h.Bequest.Weight, h.Limit.Amount = 1, 0.1 }, "Bequest.Shift", "at least 0.103"},
		{"natural limit without a lowest income", level, func(*Household) {}, "Earnings", "the natural limit reckons"},
		{"debt beyond the lowest income", risky, func(h *Household) { h.Limit.Amount = 1e6 }, "Limit.Amount", "at most"},
		{"no limit with power utility", risky, func(h *Household) { h.Limit.Kind = LimitNone }, "Limit", "natural"},
		{"discount factor", risky, func(h *Household) { h.DiscountFactor = math.NaN() }, "DiscountFactor", "positive"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			h := tt.h
			tt.change(&h)
			err := h.Validate()
			var f *FieldError
			if !errors.As(err, &f) || f.Field != tt.field || !strings.Contains(f.Want, tt.want) {
				t.Errorf("got %v, want a fault of %s with %q", err, tt.field, tt.want)
			}
		})
	}
}

// Powers are taken in a unit near income: the rule does not depend on the unit of
// money, and strong curvature stays within the range of numbers.
func TestUnitOfMoney(t *testing.T) {
	for _, gamma := range []float64{0.5, 2, 40, 100} {
		var rules [2]*Rule
		for k, y := range []float64{1, 65536} {
			h := certainHousehold(t, family(t)(NewCRRA(gamma)), func(i int) float64 { return y * hump(i) }, 61, 0.96, 0.03, Limit{})
			rules[k] = solve(t, h, DefaultOptions())
		}
		for _, m := range []float64{0.5, 1.3, 9} {
			a, b := rules[0].Consumption(10, 0, m), rules[1].Consumption(10, 0, 65536*m)/65536
			if relative(a, b) > 1e-12 {
				t.Errorf("gamma %g: consumption at %g is %v, in the small unit %v", gamma, m, a, b)
			}
		}
	}
}
