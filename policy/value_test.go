package policy

import (
	"context"
	"math"
	"testing"

	"cistern/income"
)

// valueOf follows a rule through every outcome that can come: the definition of its
// value, without interpolation, for a few years.
func valueOf(r *Rule, k float64, t, node int, e Entitlement, m float64) float64 {
	h := &r.Household
	c, _ := r.At(t, node, e, m)
	v := h.Utility.Value(k * c)
	a := m - c
	s := h.Survival[t]
	R := 1 + h.ReturnIn(t+1)
	if w := h.Bequest.Weight; w > 0 {
		v += h.DiscountFactor * (1 - s) * w * h.Utility.Value(R*a+h.Bequest.Shift)
	}
	if t+1 == h.Years() {
		return v
	}
	row := []float64{1}
	first := node
	if h.Moves(t) {
		row, first = h.Earnings.Chain.Row(node), 0
	}
	for z, p := range row {
		h.forEachOutcome(t+1, first+z, e, func(y float64, next Entitlement, weight float64) {
			v += h.DiscountFactor * s * p * weight * valueOf(r, k, t+1, first+z, next, R*a+y)
		})
	}
	return v
}

// shortLives are households of a few years with risk, a pension, death, estates.
func shortLives(t *testing.T) map[string]Household {
	t.Helper()
	chain, err := income.Rouwenhorst{Points: 3}.Discretise(income.AR1{Autocorrelation: 0.9, InnovationSD: 0.2})
	if err != nil {
		t.Fatal(err)
	}
	make := func(u Utility, form income.Form, limit Limit, bequest Bequest) Household {
		e, err := income.Process{FirstAge: 60, Profile: []float64{3, 3.5, 3.2}, Form: form, Chain: chain, Initial: chain.Stationary(),
			Transitory: income.Transitory{SD: 0.3, Nodes: 5}, JobLoss: income.JobLoss{Probability: 0.1, BenefitRate: 0.4}}.Build()
		if err != nil {
			t.Fatal(err)
		}
		return Household{FirstAge: 60, Survival: []float64{0.95, 0.9, 0.8, 0.7, 0}, Utility: u, DiscountFactor: 0.95, Return: 0.03,
			Bequest: bequest, Limit: limit, Earnings: e, Pension: Pension{ClaimAge: 63, FinalEarningsRate: 0.4, Flat: 0.3}}
	}
	of := family(t)
	return map[string]Household{
		"crra":              make(of(NewCRRA(3)), income.Log, Limit{}, Bequest{}),
		"crra with estates": make(of(NewCRRA(2)), income.Log, Limit{}, Bequest{Weight: 0.5, Shift: 1}),
		"log":               make(of(NewCRRA(1)), income.Log, Limit{Kind: LimitNatural}, Bequest{}),
		"low aversion":      make(of(NewCRRA(0.5)), income.Log, Limit{Amount: 0.3}, Bequest{}),
		"stone_geary":       make(of(NewStoneGeary(2, 0.2)), income.Log, Limit{}, Bequest{}),
		"cara":              make(of(NewCARA(0.8)), income.Level, Limit{Kind: LimitNone}, Bequest{}),
		"cara with a limit": make(of(NewCARA(0.8)), income.Level, Limit{}, Bequest{}),
		"quadratic":         make(of(NewQuadratic(40)), income.Level, Limit{Kind: LimitNone}, Bequest{}),
		"another's":         make(foreign{of(NewCRRA(3))}, income.Log, Limit{}, Bequest{}),
	}
}

// foreign is a family that the package does not know.
type foreign struct{ Utility }

// The value is that of following the rule through every outcome: derived from the
// definition. Errors are measured in certain consumption.
func TestValue(t *testing.T) {
	for name, h := range shortLives(t) {
		t.Run(name, func(t *testing.T) {
			r, err := Solve(context.Background(), h, DefaultOptions())
			if err != nil {
				t.Fatal(err)
			}
			for _, k := range []float64{1, 0.9} {
				v := NewValue(r, k)
				worth := func(x float64) float64 { return v.felicity.inverse(x/v.horizon[0], v.felicity.neutral(), 1) }
				for _, m := range []float64{0.35, 0.9, 2.31, 3.77, 5.9, 12.3, 60} {
					for node := range h.Nodes() {
						want := valueOf(r, k, 0, node, Entitlement{}, m)
						got, slope := v.At(0, node, Entitlement{}, m)
						q, exact := worth(got), worth(want)
						if math.Abs(q-exact) > 1e-6*math.Abs(exact) {
							t.Errorf("scale %v, node %d, m = %v: worth %v a year, want %v", k, node, m, q, exact)
						}
						d := 1e-4 * m
						if numeric := (valueOf(r, k, 0, node, Entitlement{}, m+d) - valueOf(r, k, 0, node, Entitlement{}, m-d)) / (2 * d); math.Abs(slope-numeric) > 2e-3*math.Abs(numeric) {
							t.Errorf("scale %v, node %d, m = %v: slope %v, want %v", k, node, m, slope, numeric)
						}
						if envelope := h.Utility.Marginal(r.Consumption(0, node, m)); k == 1 && math.Abs(slope-envelope) > 1e-4*envelope {
							t.Errorf("node %d, m = %v: slope %v, want u'(c) = %v", node, m, slope, envelope)
						}
					}
				}
			}
		})
	}
}

// Over a whole certain life the value is the sum of discounted utilities along the
// path that the rule takes.
func TestValueOfCertainLife(t *testing.T) {
	h := certainHousehold(t, family(t)(NewCRRA(2.5)), func(t int) float64 { return 1 + 0.05*float64(t) - 0.0009*float64(t*t) }, 60, 0.96, 0.03, Limit{})
	r, err := Solve(context.Background(), h, DefaultOptions())
	if err != nil {
		t.Fatal(err)
	}
	v := NewValue(r, 1)
	worth := func(x float64) float64 { return v.felicity.inverse(x/v.horizon[0], v.felicity.neutral(), 1) }
	for _, m := range []float64{0.4, 1.3, 4, 20} {
		want, cash, weight := 0.0, m, 1.0
		for year := range h.Years() {
			c := r.Consumption(year, 0, cash)
			want += weight * h.Utility.Value(c)
			if year+1 < h.Years() {
				incomes, _ := h.Income(year+1, 0)
				cash = 1.03*(cash-c) + incomes[0]
			}
			weight *= h.DiscountFactor * h.Survival[year]
		}
		got, _ := v.At(0, 0, Entitlement{}, m)
		q, exact := worth(got), worth(want)
		if math.Abs(q-exact) > 1e-6*exact {
			t.Errorf("m = %v: worth %v a year, want %v", m, q, exact)
		}
	}
}

// Under laws the value is that of following the rule through every outcome too, the
// entitlement with it. What is lost between entitlement nodes falls with their number.
func TestValueWithEntitlement(t *testing.T) {
	average := careerAverage{rate: 0.3, ceiling: 1.4, growth: 0.02, flat: 0.1, final: 0.1, high: 0.4}
	for _, tt := range []struct {
		name    string
		utility Utility
		limit   Limit
		bequest Bequest
		laws    Laws
	}{
		{"crra", CRRA{2.5}, Limit{}, Bequest{}, average},
		{"pensions alike", CRRA{2}, Limit{}, Bequest{}, careerAverage{rate: 0.3, ceiling: 1.4, flat: 0.1, high: 0.4}},
		{"bequest", CRRA{0.8}, Limit{Amount: 0.2}, Bequest{Weight: 2, Shift: 0.5}, average},
		{"cara without limit", CARA{1.5}, Limit{Kind: LimitNone}, Bequest{}, average},
		{"nothing accrues", CRRA{3}, Limit{}, Bequest{}, noLaws{Pension{ClaimAge: 63, FinalEarningsRate: 0.4, Flat: 0.1}}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			h := shortAccrual(t, 2, income.Transitory{SD: 0.2, Nodes: 21}, tt.laws)
			h.Utility, h.Limit, h.Bequest = tt.utility, tt.limit, tt.bequest
			r := solved(t, h)
			v := NewValue(r, 1)
			for _, e := range []float64{0.31, 0.47, 0.55} {
				for _, m := range []float64{0.4, 0.9, 1.7, 4} {
					for node := range h.Nodes() {
						want := valueOf(r, 1, 0, node, Entitlement{e}, m)
						got, slope := v.At(0, node, Entitlement{e}, m)
						exact := v.felicity.inverse(want/v.horizon[0], v.felicity.neutral(), 1)
						if q := v.Equivalent(0, node, Entitlement{e}, m); math.Abs(q-exact) > 2e-5*math.Abs(exact) {
							t.Errorf("node %d, entitlement %v, m = %v: worth %v a year, want %v", node, e, m, q, exact)
						} else if back := v.horizon[0] * h.Utility.Value(q); math.Abs(got-back) > 1e-13*math.Abs(back) {
							t.Errorf("value %v, but worth %v a year", got, q)
						}
						c, _ := r.At(0, node, Entitlement{e}, m)
						if envelope := h.Utility.Marginal(c); math.Abs(slope-envelope) > 1e-3*envelope {
							t.Errorf("node %d, entitlement %v, m = %v: slope %v, want u'(c) = %v", node, e, m, slope, envelope)
						}
					}
				}
			}
			var want float64
			for j, p := range h.Earnings.Distribution[0] {
				h.forEachOutcome(0, j, Entitlement{0.2}, func(y float64, next Entitlement, weight float64) {
					want += p * weight * valueOf(r, 1, 0, j, next, 1.03*0.5+y)
				})
			}
			if got := v.Expected([]Begin{{Assets: 0.5, Entitlement: Entitlement{0.2}, Probability: 1}}); math.Abs(got-want) > 2e-5*math.Abs(want) {
				t.Errorf("a life is worth %v, want %v", got, want)
			}
		})
	}
}
