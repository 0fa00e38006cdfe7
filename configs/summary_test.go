package configs

import (
	"reflect"
	"strings"
	"testing"
)

// TestSummaryKeys reads what the summary and its population are asked for, and
// what they are without being asked (common practice: deciles, the top tenth,
// hundredth and thousandth, the worst hundredth and twentieth).
func TestSummaryKeys(t *testing.T) {
	sc, err := Parse("small.yaml", []byte(small), nil)
	if err != nil {
		t.Fatal(err)
	}
	want := Summary{Percentiles: []float64{1, 5, 10, 25, 50, 75, 90, 95, 99}, By: []string{"age", "group"}, Lorenz: []float64{10, 20, 30, 40, 50, 60, 70, 80, 90},
		TopShares: []float64{10, 1, 0.1}, Shortfall: []float64{1, 5}, Tail: 5, Mobility: []Mobility{{35, 55, 5}},
		RunwayMonths: []float64{1, 3, 6}, ConsumptionFalls: []float64{5, 10, 20}}
	if !reflect.DeepEqual(sc.Summary, want) || sc.Growth != 0 {
		t.Errorf("unasked: %+v, growth %v, want %+v and 0", sc.Summary, sc.Growth, want)
	}
	text := small + "population: {growth: -0.004}\nsummary: {percentiles: [99.9], by: [], lorenz: [50], top_shares: [0.01], shortfall: [100], tail: 0.5, runway_months: [12, 0.5], consumption_falls: [150]}\n"
	if sc, err = Parse("small.yaml", []byte(text), nil); err != nil {
		t.Fatal(err)
	}
	want = Summary{Percentiles: []float64{99.9}, Lorenz: []float64{50}, TopShares: []float64{0.01}, Shortfall: []float64{100}, Tail: 0.5, Mobility: []Mobility{{35, 55, 5}},
		RunwayMonths: []float64{12, 0.5}, ConsumptionFalls: []float64{150}}
	if !reflect.DeepEqual(sc.Summary, want) || sc.Growth != -0.004 {
		t.Errorf("asked: %+v, growth %v, want %+v and -0.004", sc.Summary, sc.Growth, want)
	}
	for _, line := range []string{"growth: -0.004", "lorenz: [50]", "top_shares: [0.01]", "shortfall: [100]", "tail: 0.5", "runway_months: [12, 0.5]", "consumption_falls: [150]"} {
		if !strings.Contains(string(sc.YAML()), line) {
			t.Errorf("no %q in the resolved scenario:\n%s", line, sc.YAML())
		}
	}
}
