package sim

import (
	"math"
	"math/rand/v2"
	"testing"
)

// corners are the draws where tables go wrong: ends of the tails, ends of octaves
// and of pieces.
func corners() []uint64 {
	var draws []uint64
	for k := range 52 {
		for _, w := range []uint64{1<<k - 1, 1 << k, 1<<k + 1, 1<<k + 1<<k/64, 1<<k + 1<<k/64 - 1, 1<<52 - 1<<k} {
			draws = append(draws, w&(1<<52-1)<<11)
		}
	}
	draws = append(draws, 0, (1<<52-1)<<11, (1<<52-2)<<11)
	for _, x := range draws[:len(draws):len(draws)] {
		draws = append(draws, x|1<<63)
	}
	return draws
}

// Expected values: normalQuantile, that is mathext.NormalQuantile (algorithm AS 241, Wichura 1988, Applied
// Statistics 37), accurate to about 1e-16.
func TestNormalTable(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 2))
	draws := corners()
	for range 20_000 {
		draws = append(draws, random.Uint64(), random.Uint64()>>random.IntN(52)&^(1<<63), random.Uint64()>>random.IntN(52)|1<<63)
	}
	for _, tt := range []struct {
		name string
		f    func(float64) float64
		unit func(float64) float64 // what an error is measured in
	}{
		{"ε, sd 1", func(x float64) float64 { return x }, func(x float64) float64 { return math.Max(1, math.Abs(x)) }},
		{"exp(0.2·x − 0.02)", func(x float64) float64 { return math.Exp(0.2*x - 0.02) }, func(x float64) float64 { return math.Exp(0.2*x - 0.02) }},
		{"exp(0.5·x)", func(x float64) float64 { return math.Exp(0.5 * x) }, func(x float64) float64 { return math.Exp(0.5 * x) }},
	} {
		table := newNormalTable(tt.f)
		worst, where := 0.0, uint64(0)
		for _, d := range draws {
			x := normalQuantile(d)
			if e := math.Abs(table.at(d)-tt.f(x)) / tt.unit(x); !(e <= worst) {
				worst, where = e, d
			}
		}
		t.Logf("%s: worst error %.2g", tt.name, worst)
		if !(worst <= 1e-10) {
			t.Errorf("%s: error %.2g at draw %#x (x = %g), want at most 1e-10", tt.name, worst, where, normalQuantile(where))
		}
	}
}

// The exact quantile itself, against printed values.
func TestNormalQuantile(t *testing.T) {
	for _, tt := range []struct {
		u, want float64
		source  string
	}{
		{0.5, 0, "derived: symmetry"},
		{0.25, -0.674489750196082, "from memory: the normal quartile"},
		{0.025, -1.959963984540054, "from memory: the normal 2.5 % point"},
		{1e-10, -6.361340902404056, "from memory: the normal 1e-10 point"},
	} {
		bits := uint64(tt.u*0x1p53) << 11 // u ≤ ½: the lower tail
		if tt.u == 0.5 {
			bits = (1<<52 - 1) << 11
		}
		// u is met to 2^−53, which moves the quantile by that over the density.
		tolerance := 1e-14 + 0x1p-53/(math.Exp(-tt.want*tt.want/2)/math.Sqrt(2*math.Pi))
		if got := normalQuantile(bits); math.Abs(got-tt.want) > tolerance {
			t.Errorf("quantile at %g: %.15f, want %.15f ± %.1g (%s)", tt.u, got, tt.want, tolerance, tt.source)
		}
		if low, high := normalQuantile(bits), normalQuantile(bits|1<<63); low != -high {
			t.Errorf("quantile at %g: %v in the lower tail, %v in the upper", tt.u, low, high)
		}
	}
}

// derived: the law is symmetric, so the upper tail is the lower one's mirror image,
// to the bit, and rising bits mean falling distance from the mean.
func TestNormalTableSymmetricAndMonotone(t *testing.T) {
	table := newNormalTable(func(x float64) float64 { return x })
	random := rand.New(rand.NewPCG(3, 4))
	for range 100_000 {
		d := random.Uint64() >> (1 + random.IntN(40)) &^ (1 << 63)
		if low, high := table.at(d), table.at(d|1<<63); low != -high {
			t.Fatalf("draw %#x: %v in the lower tail, %v in the upper", d, low, high)
		}
		next := d + 1<<40
		if next>>63 == 0 && table.at(next) < table.at(d) {
			t.Fatalf("draw %#x gives %v, draw %#x less: %v", d, table.at(d), next, table.at(next))
		}
	}
}

// The lowest eleven bits do not count, so that no draw falls between two others.
func TestNormalTableIgnoresLowBits(t *testing.T) {
	table := newNormalTable(math.Exp)
	random := rand.New(rand.NewPCG(5, 6))
	for range 1000 {
		d := random.Uint64()
		if a, b := table.at(d), table.at(d|(1<<11-1)); a != b {
			t.Fatalf("draws %#x and %#x: %v and %v", d, d|(1<<11-1), a, b)
		}
	}
}

func BenchmarkNormalTable(b *testing.B) {
	table := newNormalTable(math.Exp)
	var draws [chunk]uint64
	random := rand.New(rand.NewPCG(1, 2))
	for i := range draws {
		draws[i] = random.Uint64()
	}
	sum := 0.0
	for b.Loop() {
		for _, d := range draws {
			sum += table.at(d)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/chunk, "ns/draw")
	benchSum = sum
}

var benchSum float64
