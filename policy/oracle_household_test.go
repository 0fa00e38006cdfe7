package policy

import (
	"fmt"
	"math"
	"testing"

	"cistern/income"
)

// shortLife is a household small enough for the oracle that meets everything at
// once: persistent and transitory risk, job loss, mortality, a pension.
func shortLife(t *testing.T, u Utility) Household {
	t.Helper()
	e := process{years: 4, profile: func(i int) float64 { return 1 + 0.1*float64(i) - 0.01*float64(i*i) }, chain: rouwenhorst(t, 2, 0.9, 0.3),
		transitory: income.Transitory{SD: 0.2, Nodes: 2, Rule: income.GaussHermite},
		jobLoss:    income.JobLoss{Probability: 0.05, BenefitRate: 0.4}}.build(t, 64)
	return Household{FirstAge: 64, Survival: []float64{0.99, 0.97, 0.95, 0.9, 0.8, 0.7, 0}, Utility: u,
		DiscountFactor: 0.95, Return: 0.03, Earnings: e, Pension: Pension{ClaimAge: 68, FinalEarningsRate: 0.5, Flat: 0.1}}
}

// The solver meets the slow solver, which shares no method with it, wherever the
// household may stand (derived: bisection of the Euler equation, kept to 1e-9 a year, so
// about 1e-8 over the seven years). The fast solver has 1000 asset points and a node
// at every kink.
func TestSolveAgainstOracle(t *testing.T) {
	if testing.Short() {
		t.Skip("the slow solver takes seconds")
	}
	for _, tt := range []struct {
		name    string
		utility Utility
		limit   Limit
		bequest Bequest
	}{
		{"crra", CRRA{2.5}, Limit{}, Bequest{}},
		{"log, natural limit", CRRA{1}, Limit{Kind: LimitNatural}, Bequest{}},
		{"crra, debt and bequest", CRRA{0.7}, Limit{Amount: 0.3}, Bequest{Weight: 2, Shift: 0.5}},
		{"stone_geary", StoneGeary{2, 0.1}, Limit{}, Bequest{}},
		{"quadratic, limit", Quadratic{15}, Limit{}, Bequest{}},
		{"cara, limit", CARA{1.5}, Limit{Amount: 0.2}, Bequest{}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			h := shortLife(t, tt.utility)
			h.Limit, h.Bequest = tt.limit, tt.bequest
			o := DefaultOptions()
			o.AssetPoints, o.HighestAssets, o.KinkThreshold = 1000, 30, 0
			rule := solve(t, h, o)
			p := oracleProblemOf(t, h)
			p.Poorest = -3
			exact := newOracleRule(&p, 0, 0.3, 5, 1e-9)
			low, _ := p.reach(0, 0.3, 5)
			worst, at := 0.0, ""
			for year := range h.Years() {
				for j := range h.Nodes() {
					for m := math.Max(0.05, low[year][j]); m < 5; m *= 1.013 {
						got, want := rule.Consumption(year, j, m), exact.Consumption(year, j, m)
						if e := math.Abs(got-want) / math.Max(math.Abs(want), 0.1); e > worst || math.IsNaN(e) {
							worst, at = e, fmt.Sprintf("year %d node %d: c(%.4f) = %.10f, want %.10f", year, j, m, got, want)
						}
					}
				}
			}
			t.Logf("largest relative difference %.1e; %s", worst, at)
			if !(worst < 1e-8) {
				t.Errorf("largest relative difference %.1e: %s", worst, at)
			}
		})
	}
}
