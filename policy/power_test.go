package policy

import (
	"fmt"
	"math"
	"math/big"
	"testing"

	"pgregory.net/rapid"
)

// exactPower returns x^g for integer or half-integer g to far more digits than a
// float64 holds.
func exactPower(x, g float64) float64 {
	twice := int(math.Abs(2 * g))
	one := new(big.Float).SetPrec(200).SetInt64(1)
	root := new(big.Float).SetPrec(200).SetFloat64(x)
	if twice%2 == 1 {
		root.Sqrt(root)
	} else {
		twice /= 2
	}
	p := new(big.Float).SetPrec(200).Set(one)
	for range twice {
		p.Mul(p, root)
	}
	if g < 0 {
		p.Quo(one, p)
	}
	v, _ := p.Float64()
	return v
}

// The documented error holds against exact powers (derived: rational arithmetic)
// where g allows, with the ends of cells and binades among the points.
func TestPowerTableExact(t *testing.T) {
	for _, tt := range []struct{ g, tolerance float64 }{
		{-1, 1e-15}, {-2, 1e-15}, {-0.5, 1e-15}, {-2.5, 1e-15}, {-3, 1e-15}, {0.5, 1e-15}, {2, 1e-15}, {-10, 2e-14},
	} {
		t.Run(fmt.Sprint("g=", tt.g), func(t *testing.T) {
			p := newPowerTable(tt.g)
			worst := 0.0
			for e := -60; e <= 60; e += 3 {
				for k := range 256 {
					low := math.Ldexp(1+float64(k)/256, e)
					high := math.Nextafter(low+math.Ldexp(1.0/256, e), 0)
					for _, x := range []float64{low, low + (high-low)*0.37, high} {
						worst = math.Max(worst, math.Abs(p.at(x)/exactPower(x, tt.g)-1))
					}
				}
			}
			t.Logf("largest relative error %.2g", worst)
			if worst > tt.tolerance {
				t.Errorf("largest relative error %.2g, want at most %.0e", worst, tt.tolerance)
			}
		})
	}
}

// Far from 1 the exponent times log₂ x must not round (derived: 60-digit decimal
// logarithm and exponential of the same binary numbers).
func TestPowerTableFarFromOne(t *testing.T) {
	for _, tt := range []struct{ g, x, want float64 }{
		{-0.3, 0x1.4cccccccccccdp+700, 5.617174360788821e-64},
		{-0.3, 0x1.e666666666666p-600, 1.2640758644411948e+54},
		{-0.3, 0x1p-999, 1.6545873532415374e+90},
		{-0.37037037037037035, 0x1.4cccccccccccdp+700, 8.184366475138604e-79},
		{-0.37037037037037035, 0x1.e666666666666p-600, 6.1988698423695085e+66},
		{-0.37037037037037035, 0x1p-999, 2.404907604760371e+111},
		{-2.1, 0x1.0295e9e1b089ap+333, 3.0238403145337167e-211},
		{1.7, 0x1.0295e9e1b089ap+333, 2.633297799748325e+170},
	} {
		if got := newPowerTable(tt.g).at(tt.x); relative(got, tt.want) > 1e-15 {
			t.Errorf("%g^%g = %.16g, want %.16g", tt.x, tt.g, got, tt.want)
		}
	}
}

// Any exponent agrees with math.Pow over the whole range where the power is a
// normal number. math.Pow itself is off by about |ln x^g| units, hence the bound.
func TestPowerTableAgainstPow(t *testing.T) {
	for _, g := range []float64{-0.3, -1, -2, -2.5, -10, 1 / -2.7, -0.1, 1.7, 0.25} {
		p := newPowerTable(g)
		rapid.Check(t, func(t *rapid.T) {
			x := math.Ldexp(rapid.Float64Range(1, 2).Draw(t, "m"), rapid.IntRange(-1022, 1022).Draw(t, "e"))
			got, want := p.at(x), math.Pow(x, g)
			if want < 1e-300 || want > 1e300 {
				if got > 1e-299 && got < 1e299 || math.IsNaN(got) {
					t.Errorf("%g^%g = %g, math.Pow %g", x, g, got, want)
				}
				return
			}
			bound := 2e-15 + 2.3e-16*math.Abs(g*math.Log(x))
			if g == -10 {
				bound += 2e-14
			}
			if !(math.Abs(got/want-1) <= bound) {
				t.Errorf("%g^%g = %.17g, math.Pow %.17g", x, g, got, want)
			}
		})
	}
}

func TestPowerTableEdges(t *testing.T) {
	inf := math.Inf(1)
	for _, tt := range []struct{ g, x, want float64 }{
		{-2, 0, inf}, {-2, math.Copysign(0, -1), inf}, {-2, math.SmallestNonzeroFloat64, inf}, {-2, 1e-310, inf},
		{-2, -1e-17, inf}, {-2, -5, inf}, {-2, inf, 0}, {-2, math.MaxFloat64, 0}, {-2, 1e-200, inf},
		{0.5, 0, 0}, {0.5, inf, inf}, {0.5, -5, math.NaN()},
	} {
		p := newPowerTable(tt.g)
		dst := []float64{1}
		p.into(dst, []float64{tt.x}, 1)
		for _, got := range []float64{p.at(tt.x), dst[0]} {
			if got != tt.want && !(math.IsNaN(got) && math.IsNaN(tt.want)) {
				t.Errorf("%g^%g = %g, want %g", tt.x, tt.g, got, tt.want)
			}
		}
	}
}

func TestPowerTableInto(t *testing.T) {
	p := newPowerTable(-2.5)
	src := []float64{0.01, 0.5, 1, 3, 1e4}
	dst := make([]float64, 7)
	p.into(dst, src, 1.5)
	for i, x := range src {
		if dst[i] != p.at(1.5*x) {
			t.Errorf("into gives %g for 1.5·%g, at gives %g", dst[i], x, p.at(1.5*x))
		}
	}
	if dst[5] != 0 {
		t.Error("wrote beyond the source's length")
	}
	p.into(src, src, 1.5)
	for i := range src {
		if src[i] != dst[i] {
			t.Errorf("in place entry %d is %g, want %g", i, src[i], dst[i])
		}
	}
}

var powerSink float64

func BenchmarkPower(b *testing.B) {
	const g = -2.5
	src, dst := make([]float64, 1024), make([]float64, 1024)
	for i := range src {
		src[i] = 0.05 * math.Exp(float64(i)/150)
	}
	p := newPowerTable(g)
	each := func(name string, f func()) {
		b.Run(name, func(b *testing.B) {
			for b.Loop() {
				f()
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(len(src)), "ns/power")
			powerSink += dst[7]
		})
	}
	each("method=pow", func() {
		for i, x := range src {
			dst[i] = math.Pow(x, g)
		}
	})
	each("method=table", func() {
		for i, x := range src {
			dst[i] = p.at(x)
		}
	})
	each("method=table-into", func() { p.into(dst, src, 1) })
	b.Run("make-table", func(b *testing.B) {
		for b.Loop() {
			p = newPowerTable(g)
		}
	})
}
