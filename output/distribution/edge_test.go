package distribution

import (
	"math"
	"slices"
	"strings"
	"testing"
)

// TestStudyEdges: targets without rows, with one, with equal values only, with
// nothing but losses, and with values missing throughout.
func TestStudyEdges(t *testing.T) {
	nan := math.NaN()
	for _, tt := range []struct {
		name string
		x    []float64
		want map[string]float64 // NaN: missing; the rest is not looked at
	}{
		{"none", nil, map[string]float64{"rows": 0, "mean": nan, "sd": nan, "share": nan, "gini": nan, "percentile": nan, "lorenz": nan, "top share": nan, "s80/s20": nan, "shortfall": nan, "hill": nan, "rows of hill": 0}},
		{"one", []float64{3}, map[string]float64{"rows": 1, "mean": 3, "sd": nan, "gini": nan, "percentile": 3, "shortfall": 3, "hill": nan, "share": 0}},
		{"equal", slices.Repeat([]float64{0.1}, 500), map[string]float64{"rows": 500, "mean": 0.1, "sd": 0, "percentile": 0.1, "shortfall": 0.1, "s80/s20": 1, "share": 1, "hill": nan}},
		{"zeros", slices.Repeat([]float64{0}, 500), map[string]float64{"mean": 0, "gini": nan, "lorenz": nan, "top share": nan, "s80/s20": nan, "shortfall": 0, "hill": nan}},
		{"debts", []float64{-4, -3, -2, -1, -4, -3, -2, -1}, map[string]float64{"mean": -2.5, "gini": nan, "lorenz": nan, "hill": nan, "shortfall": -4, "share": 1}},
		{"absent", []float64{nan, nan, nan}, map[string]float64{"rows": 3, "values": 0, "mean": nan, "gini": nan, "percentile": nan, "lorenz": nan, "shortfall": nan}},
		{"huge", []float64{-1e150, 1e150, 2e150, 3e150}, map[string]float64{"mean": 1.25e150, "shortfall": -1e150}},
		{"tiny", []float64{1e-310, 2e-310, 3e-310}, map[string]float64{"rows": 3, "values": 3}},
	} {
		for _, budget := range []int64{0, 64} {
			o := alone(1000)
			o.Budget = budget
			o.Variables[0].Optional = true
			o.Percentiles, o.Lorenz, o.TopShares, o.Shortfalls, o.Tails = []float64{1e-9}, []float64{50}, []float64{10}, []float64{0.1}, []float64{20}
			s := run(t, o, column(tt.x))
			names, list := figures(s)
			for i, name := range names {
				for kind, want := range tt.want {
					if at := strings.TrimRight(name, " 0"); at != kind {
						continue
					}
					if got := list[i].Value; !(math.Abs(got-want) <= 1e-12*math.Abs(want)) && !(math.IsNaN(got) && math.IsNaN(want)) {
						t.Errorf("%s, budget %d: %s is %v, want %v", tt.name, budget, kind, got, want)
					}
				}
			}
		}
	}
}
