package decomposition

import (
	"math"
	"testing"

	"cistern/income"
	"cistern/policy"
	"cistern/sim"
)

// The value of life before it begins is the mean over simulated households of
// discounted utility, of what they leave too (definition), to within its Monte Carlo
// error; with scaled consumption as well. The quadrature of the solver against the
// continuous shock of the simulation is far below that error.
func TestValueIsMeanUtility(t *testing.T) {
	of := func(u policy.Utility, err error) policy.Utility {
		if err != nil {
			t.Fatal(err)
		}
		return u
	}
	for _, tt := range []struct {
		name   string
		change func(h *policy.Household, p *income.Process)
	}{
		{"crra", func(h *policy.Household, _ *income.Process) { h.Bequest = policy.Bequest{Weight: 0.5, Shift: 3} }},
		{"stone_geary", func(h *policy.Household, _ *income.Process) { h.Utility = of(policy.NewStoneGeary(1.5, 1)) }},
		{"cara", func(h *policy.Household, _ *income.Process) { h.Utility = of(policy.NewCARA(0.1)) }},
		{"quadratic", func(h *policy.Household, _ *income.Process) { h.Utility = of(policy.NewQuadratic(200)) }},
	} {
		t.Run(tt.name, func(t *testing.T) {
			p := town(t, 20000, tt.change)
			h := &p.Types[0].Rule.Household
			for _, k := range []float64{1, 0.9} {
				lives := make([]float64, p.Households)
				_, err := sim.Simulate(t.Context(), p, sim.Options{Workers: 2, Columns: sim.Identity | sim.Fates}, func(_ int, b *sim.Block) (func() error, error) {
					for _, s := range b.Runs {
						discount := math.Pow(h.DiscountFactor, float64(s.T))
						for i := s.From; i < s.To; i++ {
							u := h.Utility.Value(k * b.Consumption[i])
							if b.Died[i] && h.Bequest.Weight > 0 {
								u += h.DiscountFactor * h.Bequest.Weight * h.Utility.Value((1+h.Return)*b.Assets[i]+h.Bequest.Shift)
							}
							lives[b.Household[i]] += discount * u
						}
					}
					return nil, nil
				})
				if err != nil {
					t.Fatal(err)
				}
				mean, squares := 0.0, 0.0
				for _, x := range lives {
					mean += x / float64(len(lives))
				}
				for _, x := range lives {
					squares += (x - mean) * (x - mean)
				}
				se := math.Sqrt(squares) / float64(len(lives))
				got := policy.NewValue(p.Types[0].Rule, k).Expected(begins(p.Types[0].Start))
				if math.Abs(got-mean) > 4*se {
					t.Errorf("scale %v: a life is worth %v, want %v ± %v", k, got, mean, se)
				}
				if se > 0.02*math.Abs(mean) {
					t.Errorf("scale %v: %v ± %v is too uncertain for a test", k, mean, se)
				}
			}
		})
	}
}
