package distribution

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"cistern/output/stats"
)

// TestKeys: keys order floats as numbers and can be undone.
func TestKeys(t *testing.T) {
	x := []float64{math.Inf(-1), -math.MaxFloat64, -500, -1, -math.SmallestNonzeroFloat64, 0, math.SmallestNonzeroFloat64, 1, 1 + 0x1p-52, 500, math.MaxFloat64, math.Inf(1)}
	for i, v := range x {
		if fromKey(key(v)) != v || i > 0 && key(x[i-1]) >= key(v) {
			t.Errorf("key of %v is %#x, back %v", v, key(v), fromKey(key(v)))
		}
	}
	if z := fromKey(key(math.Copysign(0, -1))); math.Signbit(z) {
		t.Error("negative zero comes back")
	}
}

// TestGiniJackknife compares the one-sweep jackknife with plain deletion.
func TestGiniJackknife(t *testing.T) {
	r := rand.New(rand.NewPCG(2, 2))
	var so sampler
	var x []float64
	b := &block{values: make([][]float64, 1)}
	for range 500 {
		v := math.Exp(r.NormFloat64()) - 0.5
		x = append(x, v)
		b.values[0], b.tags = append(b.values[0], v), append(b.tags, uint8(r.IntN(7)))
	}
	tags := b.tags
	so.load([][]piece{{{b, 0, 500}}}, &Target{Cells: []Cell{{0, 1}}}, 0, 0)
	var without, sizes [7]float64
	for g := range without {
		var rest []float64
		for i, v := range x {
			if int(tags[i]) == g {
				sizes[g]++
			} else {
				rest = append(rest, v)
			}
		}
		slices.Sort(rest)
		without[g], _ = stats.GiniUnbiased(rest)
	}
	slices.Sort(x)
	full, _ := stats.GiniUnbiased(x)
	want, _ := stats.Jackknife(full, without[:], sizes[:])
	value, se, groups := so.gini()
	near(t, "gini", value, full, 1e-13)
	near(t, "its error", se, want, 1e-11)
	if groups != 7 {
		t.Errorf("%d groups, want 7", groups)
	}
}

func near(t testing.TB, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s = %v, want %v within %g", what, got, want, tolerance)
	}
}
