package distribution

import (
	"math"
	"slices"

	"cistern/output/stats"
)

// The statistics as their definitions say, by sorting, for the tests to compare
// with. They share nothing with the engine but the functions of stats, which are
// tested against published values there.

// person is a row of a test: a value, its weight and its jackknife group.
type person struct {
	x, w  float64
	group int
}

// crowd is the rows of one target, ascending by value.
type crowd []person

func newCrowd(x, w []float64, unit []int64) crowd {
	var c crowd
	for i, v := range x {
		if math.IsNaN(v) {
			continue
		}
		p := person{v, 1, int(unit[i] % Groups)}
		if w != nil {
			p.w = w[i]
		}
		c = append(c, p)
	}
	slices.SortStableFunc(c, func(a, b person) int {
		switch {
		case a.x < b.x:
			return -1
		case a.x > b.x:
			return 1
		}
		return 0
	})
	return c
}

// columns splits a crowd; weights of zero are left out, as nobody.
func (c crowd) columns() (x, w []float64) {
	for _, p := range c {
		if p.w > 0 {
			x, w = append(x, p.x), append(w, p.w)
		}
	}
	return x, w
}

func (c crowd) mass() (m float64) {
	for _, p := range c {
		m += p.w
	}
	return m
}

// quantile is the least value with F(x) ≥ p; unweighted it is of type 7.
func (c crowd) quantile(p float64, weighted bool) float64 {
	x, w := c.columns()
	if weighted {
		return stats.WeightedQuantile(x, w, p, stats.Type1)
	}
	return stats.Quantile(x, p, stats.Type7)
}

func (c crowd) mean() float64 {
	x, w := c.columns()
	return stats.WeightedMean(x, w)
}

// sd is the standard deviation with the factor n/(n−1).
func (c crowd) sd() float64 {
	x, w := c.columns()
	n := float64(len(x))
	return math.Sqrt(stats.WeightedVariance(x, w) * n / (n - 1))
}

// gini is the plug-in coefficient over 1 − Σw²/W², which without weights is the
// factor n/(n−1).
func (c crowd) gini() float64 {
	x, w := c.columns()
	g, err := stats.WeightedGini(x, w)
	if err != nil || len(x) < 2 {
		return math.NaN()
	}
	var squares float64
	for _, v := range w {
		squares += v * v
	}
	m := c.mass()
	return g / (1 - squares/(m*m))
}

func (c crowd) lorenz(p float64) float64 {
	x, w := c.columns()
	l, err := stats.Lorenz(x, w, p)
	if err != nil {
		return math.NaN()
	}
	return l
}

func (c crowd) topShare(p float64) float64 { return 1 - c.lorenz(1-p) }

func (c crowd) s80s20() float64 { return c.topShare(0.2) / c.lorenz(0.2) }

// shortfall is the mean of the lowest share p, the row on the edge in part.
func (c crowd) shortfall(p float64) float64 {
	var sum, taken float64
	need := p * c.mass()
	for _, q := range c {
		part := min(q.w, need-taken)
		if part <= 0 {
			break
		}
		sum += part * q.x
		taken += part
	}
	return sum / need
}

// hill is the index of the tail of the k highest rows.
func (c crowd) hill(k int) float64 {
	x, w := c.columns()
	if k < 1 || k >= len(x) {
		return math.NaN()
	}
	alpha, _ := stats.WeightedHill(x, w, k)
	return alpha
}

// share is the share of rows at or below a value, or below it.
func (c crowd) share(t Threshold) float64 {
	var sum float64
	for _, p := range c {
		if p.x < t.Value || p.x == t.Value && !t.Strict {
			sum += p.w
		}
	}
	return sum / c.mass()
}

// jackknife is the delete-a-group error of any statistic, every replication by
// recomputing all of it.
func (c crowd) jackknife(of func(crowd) float64) float64 {
	var without, sizes [Groups]float64
	for g := range sizes {
		var rest crowd
		for _, p := range c {
			if p.group == g {
				sizes[g] += p.w
			} else {
				rest = append(rest, p)
			}
		}
		if sizes[g] > 0 {
			without[g] = of(rest)
		}
	}
	se, _ := stats.Jackknife(of(c), without[:], sizes[:])
	return se
}
