package stats

import (
	"fmt"
	"math"
	"sync"

	"gonum.org/v1/gonum/mathext"
)

// Estimate is a figure with its Monte Carlo error. Lower and Upper bound a
// confidence interval; NaN where there is none.
type Estimate struct {
	Value         float64
	StandardError float64
	Lower, Upper  float64
}

// Jackknife returns the standard error of a statistic by the delete-a-group
// jackknife. Group g holds sizes[g] of the rows, all rows of a household in
// the same group; full is the statistic from all rows and without[g] the
// statistic from all rows outside group g. Empty groups (size 0) are passed
// over; groups is the number of the others. With n rows, h_g = n/sizes[g] and
// pseudo-values τ_g = h_g·full − (h_g−1)·without_g,
//
//	variance = (1/G)·Σ_g (τ_g − mean)² / (h_g − 1),
//	mean     = G·full − Σ_g (1 − 1/h_g)·without_g.
//
// With equal groups this is (G−1)/G times the sum of squares of without about
// its mean; for a mean with one row a group it is the usual s/√n. Source:
// F. M. T. A. Busing, E. Meijer and R. van der Leeden, "Delete-m jackknife for
// unequal m", Statistics and Computing 9 (1999) 3–8.
//
// A paired difference is a statistic like any other: let full and without be
// differences computed on the same households. The standard error is NaN with
// fewer than two groups.
func Jackknife(full float64, without, sizes []float64) (se float64, groups int) {
	if len(without) != len(sizes) {
		panic(fmt.Sprintf("stats: %d group statistics but %d group sizes", len(without), len(sizes)))
	}
	var n, mean float64
	for _, m := range sizes {
		if m > 0 {
			n += m
			groups++
		}
	}
	if groups < 2 {
		return math.NaN(), groups
	}
	// Deviations from full keep digits. Since Σ (1 − 1/h) = G − 1,
	// mean − full = Σ (1 − 1/h)·(full − without) and τ − full = (h−1)·(full − without).
	for g, m := range sizes {
		if m > 0 {
			mean += (1 - m/n) * (full - without[g])
		}
	}
	var variance float64
	for g, m := range sizes {
		if m > 0 {
			h := n / m
			d := (h-1)*(full-without[g]) - mean
			variance += d * d / (h - 1)
		}
	}
	return math.Sqrt(variance / float64(groups)), groups
}

// JackknifeInterval turns a value and its jackknife error into an [Estimate]
// with a Student t interval on groups−1 degrees of freedom.
func JackknifeInterval(value, se float64, groups int, level float64) Estimate {
	e := Estimate{Value: value, StandardError: se, Lower: math.NaN(), Upper: math.NaN()}
	if groups >= 2 && !math.IsNaN(se) {
		half := StudentQuantile(1-(1-level)/2, groups-1) * se
		e.Lower, e.Upper = value-half, value+half
	}
	return e
}

// StudentQuantile returns the p-quantile of Student's t distribution. It
// remembers what it has computed, since summaries ask for the same thousands of
// times.
func StudentQuantile(p float64, degrees int) float64 {
	type question struct {
		p       float64
		degrees int
	}
	if t, known := studentQuantiles.Load(question{p, degrees}); known {
		return t.(float64)
	}
	t := studentQuantile(float64(degrees), p)
	studentQuantiles.Store(question{p, degrees}, t)
	return t
}

var studentQuantiles sync.Map

// studentQuantile inverts Student's distribution function with nu degrees of
// freedom through the incomplete beta function: P(|T| > t) = I_x(ν/2, ½) with
// x = ν/(ν + t²) (Abramowitz & Stegun 1964, 26.7.1). The distributions package that
// has it would bring all of linear algebra into the program.
func studentQuantile(nu, p float64) float64 {
	if p > 0.5 {
		return -studentQuantile(nu, 1-p)
	}
	x := mathext.InvRegIncBeta(nu/2, 0.5, 2*p)
	return -math.Sqrt(nu * (1 - x) / x)
}
