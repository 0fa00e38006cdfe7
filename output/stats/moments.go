package stats

import "math"

// Mean returns the arithmetic mean; NaN for an empty sample.
func Mean(x []float64) float64 {
	var sum float64
	for _, v := range x {
		sum += v
	}
	return sum / float64(len(x))
}

// SD returns the standard deviation with divisor n−1; NaN for fewer than two
// values. It takes two passes, so that a large mean costs no digits.
func SD(x []float64) float64 {
	if len(x) < 2 {
		return math.NaN()
	}
	mean := Mean(x)
	var sum, rest float64
	for _, v := range x {
		d := v - mean
		sum += d * d
		rest += d
	}
	n := float64(len(x))
	return math.Sqrt((sum - rest*rest/n) / (n - 1))
}

// WeightedMean returns Σ w·x / Σ w, whatever a weight means.
func WeightedMean(x, weight []float64) float64 {
	var sum, total float64
	for i, v := range x {
		sum += weight[i] * v
		total += weight[i]
	}
	return sum / total
}

// WeightedVariance returns Σ w·(x−mean)² / Σ w, the plug-in variance of the
// weighted distribution, without correction for the number of rows.
func WeightedVariance(x, weight []float64) float64 {
	mean := WeightedMean(x, weight)
	var sum, total float64
	for i, v := range x {
		d := v - mean
		sum += weight[i] * d * d
		total += weight[i]
	}
	return sum / total
}

// WeightedMeanSE returns the standard error of [WeightedMean] under sampling
// weights and independent rows, by linearisation:
//
//	sqrt( n/(n−1) · Σ (w_i (x_i − mean) / Σ w)² ).
//
// Source: Särndal, Swensson and Wretman (1992), Model Assisted Survey
// Sampling, section 5.7.
func WeightedMeanSE(x, weight []float64) float64 {
	mean := WeightedMean(x, weight)
	var sum, total float64
	for i, v := range x {
		d := weight[i] * (v - mean)
		sum += d * d
		total += weight[i]
	}
	n := float64(len(x))
	return math.Sqrt(n/(n-1)*sum) / total
}
