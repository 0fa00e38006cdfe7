package sim

import (
	"math"
	"math/bits"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// Drift guard (pinned: our own output). A change here changes every panel.
func TestStreamFirstDraws(t *testing.T) {
	for _, tt := range []struct {
		seed uint64
		id   int64
		want [3]uint64
	}{
		{0, 0, [3]uint64{0x76455ac6a3b04a67, 0x7e901154e70627f8, 0x7d63cdd1a066714d}},
		{20260401, 0, [3]uint64{0xfddcad187f962c3, 0xc6db8dec8659034c, 0xf3c51d1a0d8522c7}},
		{20260401, 1, [3]uint64{0x649b22cf9e75ceb8, 0xf800a16ad73884f8, 0xba29b1addef04570}},
		{20260401, 1 << 40, [3]uint64{0xacddc2175ad9482c, 0x1858e93f8c41520a, 0xed583e49e1a8f969}},
	} {
		s := NewStream(tt.seed, tt.id)
		for k, want := range tt.want {
			if got := s.Uint64(); got != want {
				t.Errorf("seed %d, household %d, draw %d: %#x, want %#x (pinned)", tt.seed, tt.id, k, got, want)
			}
		}
	}
}

// The loop over households steps the generator itself. It must give the library's
// numbers in the library's order: eight at birth, then three a year.
func TestDrawsEqualLibrary(t *testing.T) {
	const households, years = 50, 20
	var streams [households]state
	library := make([]func() uint64, households)
	for i := range streams {
		source := NewStream(7, int64(i))
		library[i] = source.Uint64
		x, s := drawBirth(7, int64(i))
		streams[i] = s
		for k, got := range x {
			if want := library[i](); got != want {
				t.Fatalf("household %d, birth draw %d: %#x, want %#x", i, k, got, want)
			}
		}
	}
	var x [YearDraws][households]uint64
	for year := range years {
		drawShocks(streams[:], x[0][:])
		drawJobs(streams[:], x[2][:])
		drawFates(streams[:], x[1][:])
		for i := range streams {
			for k := range YearDraws {
				want := library[i]()
				if got := x[k][i]; got != want {
					t.Fatalf("household %d, year %d, draw %d: %#x, want %#x", i, year, k, got, want)
				}
			}
		}
	}
}

// significance of each statistical test here: a correct generator fails one seed in
// 10,000; the seed is fixed, so a passing test stays passing.
const significance = 1e-4

// Draws of one place in the stream, taken across neighbouring households, must be
// uniform and independent: this is where seeding by raw ids breaks down (common
// practice: chi-square on leading bits, correlation at small lags).
func TestStreamsAcrossHouseholds(t *testing.T) {
	const households = 1 << 15
	draws := make([][households]uint64, BirthDraws+2*YearDraws)
	for i := range households {
		s := NewStream(20260401, int64(i))
		for k := range draws {
			draws[k][i] = s.Uint64()
		}
	}
	tests := 2 * len(draws) * 6 // of every kind together
	z := distuv.UnitNormal.Quantile(1 - significance/2/float64(tests))
	chi := distuv.ChiSquared{K: 255}.Quantile(1 - significance/float64(tests))
	for k := range draws {
		for _, shift := range []uint{56, 24} { // top bits of either half
			if got := chiSquare(draws[k][:], shift); got > chi {
				t.Errorf("draw %d, bits from %d: chi-square(255) = %.1f, want at most %.1f", k, shift, got, chi)
			}
		}
		for _, lag := range []int{1, 2, 4096} {
			if got := lagCorrelation(draws[k][:], draws[k][:], lag); math.Abs(got) > z {
				t.Errorf("draw %d, households %d apart: correlation is %.1f standard errors, want at most %.1f", k, lag, got, z)
			}
		}
		if k > 0 {
			if got := lagCorrelation(draws[k][:], draws[k-1][:], 0); math.Abs(got) > z {
				t.Errorf("draws %d and %d of a household: correlation is %.1f standard errors, want at most %.1f", k-1, k, got, z)
			}
		}
	}
}

// The test above must find what it is for: streams seeded by raw ids, whose
// neighbours are correlated.
func TestStreamTestsHavePower(t *testing.T) {
	const households = 1 << 15
	var draws [households]uint64
	for i := range draws {
		draws[i] = state{high: uint64(i) << 32, low: uint64(i) << 32}.after(&two).output()
	}
	if got := lagCorrelation(draws[:], draws[:], 1); math.Abs(got) < 6 {
		t.Errorf("streams seeded by raw ids: correlation of neighbours is %.1f standard errors, want it beyond 6", got)
	}
	for i := range draws {
		draws[i] = uint64(i%250) << 56 // six of 256 values never come
	}
	if got := chiSquare(draws[:], 56); got < 400 {
		t.Errorf("chi-square(255) of draws that miss six values = %.1f, want it beyond 400", got)
	}
}

// Every bit of seed and id must move about half of the state's bits.
func TestStreamStateAvalanche(t *testing.T) {
	const trials = 2000
	for bit := range 64 {
		var bySeed, byID int
		for i := range trials {
			h, l := streamState(uint64(i), int64(3*i))
			for of, flip := range []func() (uint64, uint64){
				func() (uint64, uint64) { return streamState(uint64(i)^1<<bit, int64(3*i)) },
				func() (uint64, uint64) { return streamState(uint64(i), int64(uint64(3*i)^1<<bit)) },
			} {
				h2, l2 := flip()
				moved := bits.OnesCount64(h^h2) + bits.OnesCount64(l^l2)
				if of == 0 {
					bySeed += moved
				} else {
					byID += moved
				}
			}
		}
		// Binomial(128·trials, ½), 6 standard errors.
		tolerance := 6 * math.Sqrt(128*trials) / 2
		for name, moved := range map[string]int{"seed": bySeed, "id": byID} {
			if math.Abs(float64(moved)-64*trials) > tolerance {
				t.Errorf("bit %d of the %s moves %.2f of 128 bits, want 64 ± %.2f", bit, name, float64(moved)/trials, tolerance/trials)
			}
		}
	}
}

// chiSquare tests eight bits of the draws for uniformity: 255 degrees of freedom.
func chiSquare(draws []uint64, shift uint) float64 {
	var counts [256]float64
	for _, x := range draws {
		counts[x>>shift&255]++
	}
	want := float64(len(draws)) / 256
	sum := 0.0
	for _, n := range counts {
		sum += (n - want) * (n - want) / want
	}
	return sum
}

// lagCorrelation returns the correlation of uniform numbers x(i+lag), y(i) in
// standard errors (1/√n under independence).
func lagCorrelation(x, y []uint64, lag int) float64 {
	n := len(y) - lag
	sum := 0.0
	for i := range n {
		sum += (float64(x[i+lag])*0x1p-64 - 0.5) * (float64(y[i])*0x1p-64 - 0.5)
	}
	return sum / float64(n) * 12 * math.Sqrt(float64(n))
}

func BenchmarkDrawYear(b *testing.B) {
	var streams [chunk]state
	for i := range streams {
		_, streams[i] = drawBirth(1, int64(i))
	}
	var x [YearDraws][chunk]uint64
	for b.Loop() {
		drawShocks(streams[:], x[0][:])
		drawJobs(streams[:], x[2][:])
		drawFates(streams[:], x[1][:])
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/chunk, "ns/household-year")
}
