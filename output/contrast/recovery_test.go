package contrast

import (
	"fmt"
	"math"
	"testing"

	"cistern/output/stats"
)

// Published: Kaplan–Meier estimate of remission in the 6-MP arm of Freireich et al.
// (1963), the standard example (Cox and Oakes 1984, Analysis of Survival Data,
// table 1.1 and section 4.2); from memory: S after 6, 7, 10, 13, 16, 22, 23 weeks.
func TestKaplanMeier(t *testing.T) {
	f := newFates(40)
	for i, w := range []int{6, 6, 6, 7, 10, 13, 16, 22, 23} {
		f.add(int64(i), 1, &trail{outside: true, last: w - 1, seen: 50}) // back in week w
	}
	for i, w := range []int{6, 9, 10, 11, 17, 19, 20, 25, 32, 32, 34, 35} { // still outside when last seen in week w
		f.add(int64(20+i), 1, &trail{outside: true, last: w, seen: w})
	}
	f.add(50, 1, &trail{seen: 3}) // never outside: not at risk
	s := f.still(-1)
	for _, want := range []struct {
		week int
		s    float64
	}{{5, 1}, {6, 0.857}, {7, 0.807}, {9, 0.807}, {10, 0.753}, {13, 0.690}, {16, 0.627}, {22, 0.538}, {23, 0.448}, {35, 0.448}} {
		if math.Abs(s[want.week]-want.s) > 0.0005 {
			t.Errorf("S(%d) = %.4f, want %.3f", want.week, s[want.week], want.s)
		}
	}
	if m := median(f.recovered()); m.Value != 23 || !(m.Lower < 23) || !math.IsNaN(m.Upper) {
		t.Errorf("median %+v, want 23 (published), its upper end not reached", m)
	}
	if e := f.outsideShare(); math.Abs(e.Value-21.0/22) > 1e-12 || !(e.StandardError > 0) {
		t.Errorf("share affected %+v", e)
	}
}

// A household's time runs to the first year from which on it stays inside.
func TestTrails(t *testing.T) {
	for _, tt := range []struct {
		name  string
		usual []float64
		event []float64
		want  trail
	}{
		{"never outside", []float64{100, 100, 100}, []float64{100, 95.1, 104.9}, trail{false, 0, 2}},
		{"outside and back", []float64{100, 100, 100}, []float64{90, 94, 96}, trail{true, 1, 2}},
		{"back and outside again", []float64{100, 100, 100, 100}, []float64{90, 100, 90, 100}, trail{true, 2, 3}},
		{"above", []float64{100, 100}, []float64{100, 106}, trail{true, 1, 1}},
	} {
		var got trail
		for year := range tt.usual {
			got.add(year, tt.usual[year], tt.event[year], 0.05*tt.usual[year])
		}
		if got != tt.want {
			t.Errorf("%s: %+v, want %+v", tt.name, got, tt.want)
		}
	}
	// who owns next to nothing is measured against a year's consumption
	r := &Rows{Usual: World{Assets: []float64{1}, Consumption: []float64{100}}, Event: World{Assets: []float64{5.9}, Consumption: []float64{94}}}
	var p past
	p.follow(r, 0, &Span{}, newSplitter(&Options{Within: 0.05}))
	if p.trails[ofAssets].outside || !p.trails[ofConsumption].outside || !p.there {
		t.Errorf("%+v", p)
	}
}

// When a figure is back, by its value and by either end of its interval.
func TestBack(t *testing.T) {
	e := func(value, half float64) stats.Estimate {
		return stats.Estimate{Value: value, StandardError: half / 2, Lower: value - half, Upper: value + half}
	}
	usual := []stats.Estimate{e(100, 5), e(100, 5), e(-100, 5), e(100, 5)}
	for _, tt := range []struct {
		gap  []stats.Estimate
		want string // value, lower, upper
	}{
		{[]stats.Estimate{e(0, 0), e(0, 0), e(0, 0), e(0, 0)}, "0 0 0"},
		{[]stats.Estimate{e(-9, 1), e(-7, 1), e(-4, 0.5), e(-1, 0.5)}, "2 2 2"},
		{[]stats.Estimate{e(-9, 1), e(-5.5, 1), e(-4.5, 1), e(-1, 0.5)}, "2 1 3"},
		{[]stats.Estimate{e(-1, 1), e(-9, 1), e(6, 2), e(-4, 2)}, "3 2 NaN"}, // in time at first does not count
		{[]stats.Estimate{e(-1, 1), e(0, 9), e(0, 9), e(-9, 1)}, "NaN NaN NaN"},
	} {
		got := back(usual, tt.gap, 0.05)
		if s := fmt.Sprint(got.Value, got.Lower, got.Upper); s != tt.want {
			t.Errorf("%v: %s, want %s", tt.gap, s, tt.want)
		}
	}
}
