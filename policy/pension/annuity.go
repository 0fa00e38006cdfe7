package pension

import (
	"fmt"
	"math"
)

// Annuity returns the value, at the first payment, of 1 a year for life, paid in
// advance and growing by growth a year,
//
//	ä = Σ_k p_k·((1+growth)/(1+rate))^k,   p_0 = 1,  p_{k+1} = p_k·s_k,
//
// s the chances to live another year from the claim age on, the last 0. It is the
// divisor that turns a balance into a yearly pension indexed by growth.
func Annuity(survival []float64, rate, growth float64) float64 {
	step := (1 + growth) / (1 + rate)
	sum, weight := 0.0, 1.0
	for _, s := range survival {
		sum += weight
		weight *= s * step
	}
	return sum
}

// AnnuityCertain returns the value, at the first payment, of 1 a year for a number
// of years, paid in advance and growing by growth a year.
func AnnuityCertain(years int, rate, growth float64) float64 {
	step := (1 + growth) / (1 + rate)
	sum, weight := 0.0, 1.0
	for range years {
		sum += weight
		weight *= step
	}
	return sum
}

// PresentValue returns Σ_k p_k·x_k/(1+rate)^k, p_k the chance to live to year k by
// survival, [k].
func PresentValue(survival, x []float64, rate float64) float64 {
	sum, weight := 0.0, 1.0
	for k, y := range x {
		sum += float64(weight * y)
		weight /= 1 + rate
		if k < len(survival) {
			weight *= survival[k]
		}
	}
	return sum
}

// FairFactor returns by what a pension that grows by growth a year in payment must
// be multiplied when it is claimed at year to in place of year from, so that the
// claimant's present value stays the same; survival is [T] from year 0 on. What
// would be claimed stays the same in real terms while it is not claimed. The factor
// of a year later is ä_x/(ä_x − 1) without growth.
func FairFactor(survival []float64, rate, growth float64, from, to int) float64 {
	ratio, index := make([]float64, len(survival)), make([]float64, len(survival))
	level := 1.0
	for t := range index {
		ratio[t], index[t] = 1/level, level
		level *= 1 + growth
	}
	v := worths(survival, ratio, index, rate)
	return v[from] / v[to]
}

// worths returns V, [T]: the present value in year 0, survival counted, of a pension
// claimed in year c that pays ratio_c·index_k in every later year k,
//
//	V_c = Σ_{k≥c} p_k·(1+rate)^{−k}·ratio_c·index_k.
func worths(survival, ratio, index []float64, rate float64) []float64 {
	v, weight := make([]float64, len(survival)), make([]float64, len(survival))
	weight[0] = 1
	for t := 1; t < len(weight); t++ {
		weight[t] = weight[t-1] * survival[t-1] / (1 + rate)
	}
	ahead := 0.0
	for c := len(v) - 1; c >= 0; c-- {
		ahead += float64(weight[c] * index[c])
		v[c] = ratio[c] * ahead
	}
	return v
}

// InternalReturn returns the rate a year at which the present value of a flow of
// money, [k], is 0: that of contributions (negative) and the benefits after them.
// It is an error if the flow does not change its sign exactly once.
func InternalReturn(flow []float64) (float64, error) {
	changes, last := 0, 0.0
	for _, x := range flow {
		if x != 0 {
			if last != 0 && (x > 0) != (last > 0) {
				changes++
			}
			last = x
		}
	}
	if changes != 1 || math.IsNaN(last) || math.IsInf(last, 0) {
		return math.NaN(), fmt.Errorf("pension: a flow of money whose sign changes %d times has no single internal return", changes)
	}
	sign := math.Copysign(1, last)
	value := func(q float64) float64 { // Horner; q = 1/(1+r); rises from below 0
		sum := 0.0
		for k := len(flow) - 1; k >= 0; k-- {
			sum = float64(sum*q) + sign*flow[k]
		}
		return sum
	}
	low, high := 0.0, 1.0
	for value(high) < 0 {
		if low, high = high, 2*high; math.IsInf(value(high), 0) {
			return math.NaN(), fmt.Errorf("pension: the flow of money has no internal return above -1")
		}
	}
	for {
		mid := low + (high-low)/2
		if mid <= low || mid >= high {
			return 1/high - 1, nil
		}
		if value(mid) < 0 {
			low = mid
		} else {
			high = mid
		}
	}
}
