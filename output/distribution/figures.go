package distribution

import (
	"math"

	"cistern/output/stats"
)

// LeastRows is how many rows a share must have for [Result.Figures] to describe it
// on its own.
const LeastRows = 20

// Figure is one statistic of a variable.
type Figure struct {
	Statistic string  // mean, sd, percentile, gini, lorenz, top_share, s80_s20, expected_shortfall or hill
	Level     float64 // in percent: a share of the rows; NaN where the statistic has none
	stats.Estimate
	Rows int64 // it comes from
}

// Figures lists what the target asked for of variable v, the mean first. Figures
// about a share of fewer than LeastRows rows are left out.
func (r *Result) Figures(v int) []Figure {
	none := math.NaN()
	rows := r.Values(v)
	list := []Figure{{"mean", none, r.Mean(v), rows}}
	add := func(statistic string, level float64, e stats.Estimate) {
		list = append(list, Figure{statistic, level, e, rows})
	}
	enough := func(percent float64) bool { return float64(rows)*percent/100 >= LeastRows }
	wants, o := r.t.Wants[v], &r.s.o
	if wants&Percentiles != 0 {
		add("sd", none, r.SD(v))
		for k, p := range o.Percentiles {
			add("percentile", p, r.Percentile(v, k))
		}
	}
	if wants&Gini != 0 {
		add("gini", none, r.Gini(v))
	}
	if wants&Concentration != 0 {
		for k, p := range o.Lorenz {
			if enough(min(p, 100-p)) {
				add("lorenz", p, r.Lorenz(v, k))
			}
		}
		for k, p := range o.TopShares {
			if enough(p) {
				add("top_share", p, r.TopShare(v, k))
			}
		}
		if enough(20) {
			add("s80_s20", none, r.QuintileRatio(v))
		}
	}
	if wants&Shortfall != 0 {
		for k, p := range o.Shortfalls {
			if enough(p) {
				add("expected_shortfall", p, r.Shortfall(v, k))
			}
		}
	}
	if wants&Tail != 0 {
		for k, p := range o.Tails {
			if enough(p) {
				alpha, n := r.Hill(v, k)
				list = append(list, Figure{"hill", p, alpha, n})
			}
		}
	}
	return list
}
