package stats

import (
	"fmt"
	"math"
)

// Hill returns the tail index α of a Pareto upper tail from the k largest
// values and its large-sample standard error α/√k:
//
//	1/α = (1/k)·Σ_(i≤k) ln( x_(n−i+1) / x_(n−k) ).
//
// Source: B. M. Hill (1975), Annals of Statistics 3, 1163–1174. It panics
// unless 1 ≤ k < n and is NaN where the threshold x_(n−k) is not positive.
func Hill(sorted []float64, k int) (alpha, se float64) {
	return hill(sorted, nil, k)
}

// WeightedHill is [Hill] with the mean log excess weighted; the standard error
// takes Kish's effective number (Σw)²/Σw² for k.
func WeightedHill(sorted, weight []float64, k int) (alpha, se float64) {
	cumulate(sorted, weight)
	return hill(sorted, weight, k)
}

func hill(sorted, weight []float64, k int) (alpha, se float64) {
	n := len(sorted)
	if k < 1 || k >= n {
		panic(fmt.Sprintf("stats: tail of %d among %d values", k, n))
	}
	threshold := sorted[n-k-1]
	if !(threshold > 0) {
		return math.NaN(), math.NaN()
	}
	var sum, total, squares float64
	for i := n - k; i < n; i++ {
		w := 1.0
		if weight != nil {
			w = weight[i]
		}
		sum += w * math.Log(sorted[i]/threshold)
		total += w
		squares += w * w
	}
	alpha = total / sum
	return alpha, alpha * math.Sqrt(squares) / total
}

// ExpectedShortfall returns the mean of the lowest share a of the sample, the
// observation on the edge counted in part:
//
//	(1/(n·a))·[ Σ_(i≤⌊na⌋) x_i + (na − ⌊na⌋)·x_(⌊na⌋+1) ].
//
// Source: Acerbi and Tasche (2002), Journal of Banking & Finance 26,
// 1487–1503. It panics unless 0 < a ≤ 1.
func ExpectedShortfall(sorted []float64, a float64) float64 {
	if !(a > 0 && a <= 1) {
		panic(fmt.Sprintf("stats: expected shortfall of the lowest %v", a))
	}
	n := float64(len(sorted))
	if n == 0 {
		return math.NaN()
	}
	whole, part := math.Modf(n * a)
	var sum float64
	for _, x := range sorted[:int(whole)] {
		sum += x
	}
	if part > 0 {
		sum += part * sorted[int(whole)]
	}
	return sum / (n * a)
}
