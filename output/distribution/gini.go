package distribution

import (
	"math"

	"cistern/output/stats"
)

// gini returns the Gini coefficient of the sample and its delete-a-group jackknife
// error, exactly and in one sweep. With C_i the weight up to row i, W = C_n,
// S = Σ w·x and A = Σ w_i·x_i·(C_(i−1) + C_i − W), half the sum of all weighted
// absolute differences,
//
//	G = A / ((W − Σw²/W)·S),
//
// which for equal weights is the plug-in coefficient times n/(n−1). Deleting a
// group g lowers C_i by c_g(i), the group's weight up to i, and
//
//	Σ_(i∉g) c_g(i)·w_i·x_i = Σ_(k∈g) w_k·(w_k·x_k + w_(k+1)·x_(k+1) + …) − Σ_(k∈g) c_g(k)·w_k·x_k.
//
// It is NaN unless the mean is positive and there are two rows.
func (s *sample) gini() (value, se float64, groups int) {
	mass := s.whole.mass
	var total, squares, area, below float64
	for i, k := range s.keys {
		w := s.unit(i)
		wx := float64(w * fromKey(k))
		total += wx
		squares += float64(w * w)
		area += float64(wx * (2*below + w - mass))
		below += w
	}
	var sum, square, own, drop, masses, up, without [Groups]float64
	ahead := total
	below = 0
	for i, k := range s.keys {
		w, g := s.unit(i), s.tags[i]
		wx := float64(w * fromKey(k))
		up[g] += w
		sum[g] += wx
		square[g] += float64(w * w)
		own[g] += float64(wx * (2*below + w - mass))
		drop[g] += float64(w*ahead) - float64(up[g]*wx)
		ahead -= wx
		below += w
	}
	value = giniOf(s.whole.rows, mass, squares, total, area)
	for g := range without {
		masses[g] = s.plain[g].mass
		without[g] = giniOf(s.whole.rows-s.plain[g].rows, mass-masses[g], squares-square[g], total-sum[g],
			area-own[g]-2*drop[g]+masses[g]*(total-sum[g]))
	}
	se, groups = stats.Jackknife(value, without[:], masses[:])
	return value, se, groups
}

func giniOf(rows, mass, squares, total, area float64) float64 {
	if rows < 2 || !(total > 0) {
		return math.NaN()
	}
	return area / ((mass - squares/mass) * total)
}

// giniOfBins returns the Gini coefficient of binned values whose sum is known in
// every bin, and a bound on its error. Without weights the factor n/(n−1) is
// included.
//
// In Σ (2·rank − n − 1)·x a bin of m values with b below it contributes
// (2b + m − n)·sum plus the spread within, Σ_(k≤m) (2k − m − 1)·x_(k). The
// spread is at least 0 and at most m²·f(1−f)·width, f the place of the bin's
// mean in it (half of the values at either end); two thirds of that are taken,
// right for an even spread. The bound is the sum of those two thirds. With weights
// m and n are sums of weights; squares is Σ w².
func giniOfBins(bins []bin, rows, squares float64) (gini, bound float64) {
	var mass, total float64
	for _, b := range bins {
		sum, _, _ := b.sum()
		mass += b.mass
		total += sum
	}
	var below, between, within float64
	for _, b := range bins {
		sum, low, width := b.sum()
		m := b.mass
		between += float64((2*below + m - mass) * sum)
		if width > 0 {
			f := max(0, min(1, (sum/m-low)/width))
			within += m * m * f * (1 - f) * width * 2 / 3
		}
		below += m
	}
	if rows < 2 || !(total > 0) {
		return math.NaN(), 0
	}
	scale := (mass - squares/mass) * total
	return (between + within) / scale, within / scale
}
