package distribution

import (
	"math"

	"cistern/output/stats"
)

// quantileType is the definition of quantiles of rows that weigh the same.
const quantileType = stats.Type7

// quantile is a quantile, the positions of what it is made of among all rows,
// counted in units from 1, and the values found there. Without weights a unit is
// a row.
type quantile struct {
	j            int64
	g            float64 // the quantile is (1−g)·x_j + g·x_(j+1)
	lower, upper int64   // ends of the interval; lower 0 or upper total+1: no bound
	value        stats.Estimate
}

// plan returns the positions of the p-quantile of n rows of total units. effect is
// the design effect.
func plan(n, total int64, weighted bool, p, effect float64) quantile {
	var q quantile
	if weighted {
		q.j = position(total, p)
	} else {
		j, g := quantileType.Position(float64(n), p)
		q.j, q.g = int64(j), g
	}
	effective := max(1, int64(float64(n)/effect))
	lower, upper, _ := stats.OrderInterval(effective, p, confidence)
	q.lower, q.upper = lower, upper
	if effective < total {
		stretch := float64(total) / float64(effective)
		q.lower = int64(math.Floor(float64(lower) * stretch))
		q.upper = int64(math.Ceil(float64(upper) * stretch))
	}
	if lower == 0 {
		q.lower = 0
	}
	if q.upper = min(q.upper, total); upper > effective {
		q.upper = total + 1
	}
	return q
}

// position returns the least position, from 1, at which the share p of total units
// is reached; a product that misses a whole number by rounding only counts as that
// number. Units are rounded weights: where there are many, 2^−42 of them are spared.
func position(total int64, p float64) int64 {
	j, g := stats.Type1.Position(float64(total), p)
	at := int64(j) - total>>42
	if g > 0 {
		at++
	}
	return min(max(1, at), total)
}

// ranks lists the positions that the quantile needs.
func (q *quantile) ranks(total int64) []int64 {
	ranks := []int64{q.j}
	if q.g > 0 {
		ranks = append(ranks, q.j+1)
	}
	if q.lower >= 1 {
		ranks = append(ranks, q.lower)
	}
	if q.upper <= total {
		ranks = append(ranks, q.upper)
	}
	return ranks
}

// normalHalfWidth is the 97.5 % point of the normal distribution: half the width
// of a 95 % interval in standard errors.
const normalHalfWidth = 1.959963984540054

// set fills in the values, at being the value at a position.
func (q *quantile) set(total int64, at func(rank int64) float64) {
	nan := math.NaN()
	q.value = stats.Estimate{Value: at(q.j), StandardError: nan, Lower: nan, Upper: nan}
	if q.g > 0 {
		q.value.Value = stats.Between(q.value.Value, at(q.j+1), q.g)
	}
	if q.lower >= 1 {
		q.value.Lower = at(q.lower)
	}
	if q.upper <= total {
		q.value.Upper = at(q.upper)
	}
	q.value.StandardError = (q.value.Upper - q.value.Lower) / (2 * normalHalfWidth)
}

// designEffect returns by how much weights, and the likeness of a unit's rows,
// inflate the variance of the share of rows up to the p-quantile: its jackknife
// variance over that of independent rows, at least 1.
func (s *sample) designEffect(p float64) float64 {
	n := len(s.keys)
	if n == 0 {
		return 1
	}
	at := s.walk()
	edge := s.keys[at.row(p*s.whole.mass)]
	var below [Groups]float64
	var count float64
	for i, k := range s.keys {
		if k > edge {
			break
		}
		below[s.tags[i]] += s.unit(i)
		count += s.unit(i)
	}
	share := count / s.whole.mass
	var without, masses [Groups]float64
	for g := range below {
		masses[g] = s.plain[g].mass
		without[g] = (count - below[g]) / (s.whole.mass - masses[g])
	}
	se, groups := stats.Jackknife(share, without[:], masses[:])
	if groups < 2 || !(share < 1) {
		return 1
	}
	return max(1, se*se*s.whole.rows/(share*(1-share)))
}

// walk finds rows by their cumulated weight, ascending.
type walk struct {
	s     *sample
	k     int
	below int64 // units before row k
}

func (s *sample) walk() walk { return walk{s: s} }

// at returns the value at a position, counted in units from 1. Positions must not
// descend from call to call.
func (w *walk) at(rank int64) float64 {
	if w.s.units == nil {
		return fromKey(w.s.keys[rank-1])
	}
	last := len(w.s.keys) - 1
	for w.k < last && w.below+int64(w.s.units[w.k]) < rank {
		w.below += int64(w.s.units[w.k])
		w.k++
	}
	return fromKey(w.s.keys[w.k])
}

// row returns the row at which the cumulated weight reaches mass.
func (w *walk) row(mass float64) int {
	last := len(w.s.keys) - 1
	if w.s.units == nil {
		j, _ := stats.Type1.Position(float64(last+1), mass/float64(last+1))
		return min(max(0, int(j)-1), last)
	}
	below := 0.0
	for k, u := range w.s.units {
		if below += float64(u); below >= mass {
			return k
		}
	}
	return last
}
