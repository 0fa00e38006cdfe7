package stats

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mathext"
)

// OrderInterval returns the distribution-free confidence interval for a
// p-quantile from n independent rows: from the lower-th to the upper-th order
// statistic, counted from 1. It covers the quantile of any continuous
// distribution with probability
//
//	coverage = P(lower ≤ B ≤ upper−1),   B ~ Binomial(n, p),
//
// at least level, with at most (1−level)/2 outside on either side: lower and
// upper−1 are the equal-tail quantiles of B. lower = 0 or upper = n+1 means
// that the sample is too small for a bound on that side. Source: Hahn and
// Meeker (1991), Statistical Intervals, section 5.2.
func OrderInterval(n int64, p, level float64) (lower, upper int64, coverage float64) {
	if n < 1 || !(p >= 0 && p <= 1) || !(level > 0 && level < 1) {
		panic(fmt.Sprintf("stats: order interval for n = %d, p = %v, level = %v", n, p, level))
	}
	tail := (1 - level) / 2
	lower = BinomialQuantile(n, p, tail)
	upper = BinomialQuantile(n, p, 1-tail) + 1
	return lower, upper, BinomialCDF(n, p, upper-1) - BinomialCDF(n, p, lower-1)
}

// BinomialCDF returns P(B ≤ k) for B ~ Binomial(n, p) by the regularised
// incomplete beta function.
func BinomialCDF(n int64, p float64, k int64) float64 {
	switch {
	case k < 0:
		return 0
	case k >= n:
		return 1
	case p == 0:
		return 1
	case p == 1:
		return 0
	}
	return mathext.RegIncBeta(float64(n-k), float64(k+1), 1-p)
}

// BinomialQuantile returns the smallest k with P(B ≤ k) ≥ q for
// B ~ Binomial(n, p). The search starts from the Cornish–Fisher approximation,
// which is rarely more than one off.
func BinomialQuantile(n int64, p, q float64) int64 {
	if p == 0 || n == 0 {
		return 0
	}
	if p == 1 {
		return n
	}
	z := mathext.NormalQuantile(q)
	mean, sd := float64(n)*p, math.Sqrt(float64(n)*p*(1-p))
	k := int64(math.Floor(mean + sd*z + (1-2*p)*(z*z-1)/6 + 0.5))
	k = max(0, min(k, n))
	if BinomialCDF(n, p, k) >= q {
		for k > 0 && BinomialCDF(n, p, k-1) >= q {
			k--
		}
		return k
	}
	for k < n && BinomialCDF(n, p, k) < q {
		k++
	}
	return k
}

// ProportionInterval returns the Clopper–Pearson (1934) interval for a share
// of which n independent rows showed the value share. n and n·share may be
// fractions: with n the effective sample size of a clustered sample this is
// the interval of Korn and Graubard (1998), Survey Methodology 24, 193–201.
// It is NaN for n < 1 or a share outside [0, 1].
func ProportionInterval(share, n, level float64) (lower, upper float64) {
	if !(n >= 1) || !(share >= 0 && share <= 1) {
		return math.NaN(), math.NaN()
	}
	tail := (1 - level) / 2
	k := share * n
	lower, upper = 0, 1
	if k > 0 {
		lower = mathext.InvRegIncBeta(k, n-k+1, tail)
	}
	if k < n {
		upper = mathext.InvRegIncBeta(k+1, n-k, 1-tail)
	}
	return lower, upper
}
