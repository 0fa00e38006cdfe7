package stats

import (
	"fmt"
	"math"
	"sort"
)

// Type is one of the nine sample quantiles of Hyndman and Fan (1996).
// Types 1–3 return an observation (type 2: or the midpoint of two); types 4–9
// interpolate linearly between plotting positions p_k of the order statistics.
type Type int

// The nine types; the comment gives p_k, the probability at which Q equals x_k.
const (
	Type1 Type = 1 + iota // inverse of the empirical distribution function
	Type2                 // as type 1, with the average where it is flat
	Type3                 // nearest order statistic, ties to the even one
	Type4                 // k/n
	Type5                 // (k−1/2)/n
	Type6                 // k/(n+1)
	Type7                 // (k−1)/(n−1); the default of this program
	Type8                 // (k−1/3)/(n+1/3); recommended by the authors
	Type9                 // (k−3/8)/(n+1/4)
)

// plotting gives a and b of the plotting position p_k = (k−a)/(n+b) of the
// continuous types 4–9.
func (t Type) plotting() (a, b float64) {
	switch t {
	case Type4:
		return 0, 0
	case Type5:
		return 0.5, 0
	case Type6:
		return 0, 1
	case Type7:
		return 1, -1
	case Type8:
		return 1. / 3, 1. / 3
	case Type9:
		return 3. / 8, 1. / 4
	}
	panic(fmt.Sprintf("stats: no plotting position for quantile type %d", int(t)))
}

// Position returns the order statistics that a quantile is made of: of n
// sorted values x_1 … x_n, Q(p) = (1−g)·x_j + g·x_(j+1) with 1 ≤ j ≤ n and
// 0 ≤ g ≤ 1; g is 0 where j = n. A product n·p that misses an integer by
// rounding only (4 machine epsilons, relative) counts as that integer.
// n is real so that it can be a sum of frequency weights. It panics unless
// n ≥ 1 and 0 ≤ p ≤ 1.
func (t Type) Position(n, p float64) (j, g float64) {
	if !(n >= 1) || !(p >= 0 && p <= 1) {
		panic(fmt.Sprintf("stats: quantile position of p = %v among n = %v", p, n))
	}
	var at float64
	switch t {
	case Type1, Type2:
		at = n * p
	case Type3:
		at = n*p - 0.5
	default:
		a, b := t.plotting()
		at = a + p*(n+b)
	}
	fuzz := 4 * 0x1p-52 * math.Max(1, n*p)
	j = math.Floor(at + fuzz)
	g = math.Max(0, at-j)
	if g < fuzz {
		g = 0
	}
	switch {
	case t == Type1 && g > 0:
		g = 1
	case t == Type2 && g > 0:
		g = 1
	case t == Type2:
		g = 0.5
	case t == Type3 && (g > 0 || math.Mod(j, 2) != 0):
		g = 1
	}
	if j < 1 {
		return 1, 0
	}
	if j >= n {
		return math.Floor(n), 0
	}
	return j, g
}

// Quantile returns the p-quantile of sorted by the given definition; NaN for
// an empty sample.
func Quantile(sorted []float64, p float64, t Type) float64 {
	n := len(sorted)
	if n == 0 {
		return math.NaN()
	}
	j, g := t.Position(float64(n), p)
	lo := sorted[int(j)-1]
	if g == 0 {
		return lo
	}
	return Between(lo, sorted[int(j)], g)
}

// Between returns (1−g)·lo + g·hi, exactly lo where g = 0 or hi = lo.
func Between(lo, hi, g float64) float64 {
	switch {
	case g == 0:
		return lo
	case g == 1:
		return hi
	}
	return lo + float64(g*(hi-lo))
}

// FrequencyQuantile is the quantile of the long form in which row i stands
// weight[i] times. Weights need not be whole; their sum must be at least 1.
func FrequencyQuantile(sorted, weight []float64, p float64, t Type) float64 {
	if len(sorted) == 0 {
		return math.NaN()
	}
	cum := cumulate(sorted, weight)
	j, g := t.Position(cum[len(cum)-1], p)
	at := func(rank float64) float64 {
		k := sort.SearchFloat64s(cum, rank-1e-9*math.Max(1, rank)*0x1p-20)
		return sorted[min(k, len(sorted)-1)]
	}
	if g == 0 {
		return at(j)
	}
	return Between(at(j), at(j+1), g)
}

// WeightedQuantile is the quantile under sampling weights. With C_k the sum of
// the first k weights and W the sum of all, type 1 is the smallest x_k with
// C_k ≥ p·W, type 2 the average where C_k = p·W, and types 4–9 interpolate
// between the plotting positions that put weights in place of counts:
//
//	(C_k − a·w_k)/(W + b·w_n), for type 7 C_(k−1)/C_(n−1),
//
// with a and b as without weights. They equal the unweighted types where all
// weights are equal. Type 3 has no such form and panics.
func WeightedQuantile(sorted, weight []float64, p float64, t Type) float64 {
	n := len(sorted)
	if n == 0 {
		return math.NaN()
	}
	cum := cumulate(sorted, weight)
	if t == Type1 || t == Type2 {
		return weightedInverse(sorted, cum, p, t)
	}
	a, b := t.plotting()
	total := cum[n-1] + b*weight[n-1]
	position := func(k int) float64 { return (cum[k] - a*weight[k]) / total }
	k := sort.Search(n, func(k int) bool { return position(k) >= p })
	switch k {
	case 0:
		return sorted[0]
	case n:
		return sorted[n-1]
	}
	lo, hi := position(k-1), position(k)
	return Between(sorted[k-1], sorted[k], (p-lo)/(hi-lo))
}

func weightedInverse(sorted, cum []float64, p float64, t Type) float64 {
	n := len(sorted)
	target := p * cum[n-1]
	fuzz := 4 * 0x1p-52 * math.Max(1, float64(n)) * cum[n-1]
	k := sort.SearchFloat64s(cum, target-fuzz)
	k = min(k, n-1)
	if t == Type2 && math.Abs(cum[k]-target) <= fuzz && k+1 < n {
		return Between(sorted[k], sorted[k+1], 0.5)
	}
	return sorted[k]
}

// cumulate returns the running sums of weight and panics where the slices do
// not fit or a weight is not positive.
func cumulate(sorted, weight []float64) []float64 {
	if len(sorted) != len(weight) {
		panic(fmt.Sprintf("stats: %d values but %d weights", len(sorted), len(weight)))
	}
	cum := make([]float64, len(weight))
	var sum float64
	for i, w := range weight {
		if !(w > 0) {
			panic(fmt.Sprintf("stats: weight %d is %v, must be positive", i, w))
		}
		sum += w
		cum[i] = sum
	}
	return cum
}

// QuantileSE returns the large-sample standard error of a p-quantile from n
// independent rows, sqrt(p(1−p)/n)/f, with f the density at the quantile
// (Cramér 1946, Mathematical Methods of Statistics, section 28.5).
func QuantileSE(p, n, density float64) float64 {
	return math.Sqrt(p*(1-p)/n) / density
}
