package stats

import (
	"fmt"
	"math"
	"sort"
)

// MeanError says why an inequality measure relative to the mean is refused.
type MeanError struct{ Mean float64 }

func (e *MeanError) Error() string {
	return fmt.Sprintf("stats: shares of a total need a positive mean, not %v", e.Mean)
}

// Gini returns the plug-in Gini coefficient, half the mean absolute difference
// between two draws with replacement, relative to the mean:
//
//	G = Σ_i (2i − n − 1)·x_i / (n²·mean).
//
// Negative values are legal and G may then exceed 1. A mean that is not
// positive is refused with a *[MeanError], since G means nothing there.
func Gini(sorted []float64) (float64, error) {
	n := float64(len(sorted))
	var spread, sum float64
	for i, x := range sorted {
		spread += float64((2*float64(i+1) - n - 1) * x)
		sum += x
	}
	if !(sum > 0) {
		return math.NaN(), &MeanError{sum / n}
	}
	return spread / (n * sum), nil
}

// GiniUnbiased returns [Gini] times n/(n−1): draws without replacement, so
// that the mean absolute difference in the numerator is unbiased. The ratio is
// unbiased in no form.
func GiniUnbiased(sorted []float64) (float64, error) {
	g, err := Gini(sorted)
	n := float64(len(sorted))
	return g * n / (n - 1), err
}

// WeightedGini returns the plug-in Gini coefficient of a weighted sample,
//
//	G = 1 − Σ_i (w_i/W)·(S_(i−1) + S_i)/S_n,   S_i = Σ_(k≤i) w_k·x_k,
//
// the same for frequency and for sampling weights.
func WeightedGini(sorted, weight []float64) (float64, error) {
	cum := cumulate(sorted, weight)
	var s, area float64
	for i, x := range sorted {
		next := s + float64(weight[i]*x)
		area += weight[i] * (s + next)
		s = next
	}
	n := len(cum)
	if n == 0 || !(s > 0) {
		return math.NaN(), &MeanError{s}
	}
	return 1 - area/(cum[n-1]*s), nil
}

// Lorenz returns the share of the total that the poorest p of the sample hold,
// linear between the points (C_k/W, S_k/S_n). A nil weight means equal
// weights. A mean that is not positive is refused with a *[MeanError].
func Lorenz(sorted, weight []float64, p float64) (float64, error) {
	n := len(sorted)
	weightOf := func(i int) float64 {
		if weight == nil {
			return 1
		}
		return weight[i]
	}
	c, s := make([]float64, n+1), make([]float64, n+1)
	for i, x := range sorted {
		c[i+1] = c[i] + weightOf(i)
		s[i+1] = s[i] + float64(weightOf(i)*x)
	}
	if n == 0 || !(s[n] > 0) {
		return math.NaN(), &MeanError{s[n] / c[n]}
	}
	target := p * c[n]
	k := sort.SearchFloat64s(c, target)
	if k == 0 {
		return 0, nil
	}
	if k > n {
		return 1, nil
	}
	return Between(s[k-1], s[k], (target-c[k-1])/(c[k]-c[k-1])) / s[n], nil
}

// TopShare returns the share of the total that the richest p of the sample
// hold: 1 − Lorenz(1−p).
func TopShare(sorted, weight []float64, p float64) (float64, error) {
	l, err := Lorenz(sorted, weight, 1-p)
	return 1 - l, err
}
