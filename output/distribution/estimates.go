package distribution

import (
	"math"

	"cistern/output/stats"
)

// pool folds the cells of a target, in their order.
func (s *Study) pool(t *Target) *cellSums {
	c := new(cellSums)
	c.reset(-1, s)
	for v := range c.vars {
		c.vars[v].mass = make([]float64, Groups)
	}
	for _, cell := range t.Cells {
		if m := &s.moments[cell.Index]; m.vars != nil {
			c.fold(m, cell.Weight)
		}
	}
	return c
}

// jackknife returns a statistic with its error: of is called with every group and
// without each in turn, given what is left out (−1: nothing).
func jackknife(sizes []float64, of func(without int) float64) stats.Estimate {
	full := of(-1)
	var without [Groups]float64
	for g := range without {
		if sizes[g] > 0 {
			without[g] = of(g)
		}
	}
	se, n := stats.Jackknife(full, without[:], sizes)
	return stats.JackknifeInterval(full, se, n, confidence)
}

// part is a pooled variable, all of it or without a jackknife group.
type part struct{ mass, first, second float64 }

func (s *variableSums) total() (all part) {
	for g := range s.sums {
		all.mass += s.mass[g]
		all.first += s.sums[g].first
		all.second += s.sums[g].second
	}
	return all
}

// left returns the total without a group; −1: all.
func (s *variableSums) left(all part, without int) part {
	if without >= 0 {
		all.mass -= s.mass[without]
		all.first -= s.sums[without].first
		all.second -= s.sums[without].second
	}
	return all
}

func (s *variableSums) mean() stats.Estimate {
	all := s.total()
	return jackknife(s.mass, func(without int) float64 {
		t := s.left(all, without)
		return s.pivot + t.first/t.mass
	})
}

// sd is the standard deviation, with the factor n/(n−1) for n rows. Its interval
// is that of the logarithm, whose sampling distribution is nearer to the normal.
func (s *variableSums) sd() stats.Estimate {
	all := s.total()
	of := func(without int) float64 {
		t := s.left(all, without)
		n := float64(s.values) * t.mass / all.mass
		if n < 2 {
			return math.NaN()
		}
		return math.Sqrt(max(0, t.second-t.first*t.first/t.mass) / t.mass * (n / (n - 1)))
	}
	e := jackknife(s.mass, of)
	if e.Value > 0 {
		log := jackknife(s.mass, func(without int) float64 { return math.Log(of(without)) })
		e.Lower, e.Upper = math.Exp(log.Lower), math.Exp(log.Upper)
	}
	return e
}

// share is the share of rows that threshold i counts.
func (s *variableSums) share(i int, independent bool) stats.Estimate {
	all := s.total()
	counted := 0.0
	for _, c := range s.shares[i] {
		counted += c
	}
	return s.proportion(jackknife(s.mass, func(without int) float64 {
		c := counted
		if without >= 0 {
			c -= s.shares[i][without]
		}
		return c / s.left(all, without).mass
	}), independent)
}

// proportion gives a share the interval of Clopper and Pearson, with the effective
// number of rows that the jackknife error implies where rows are not independent.
func (s *variableSums) proportion(e stats.Estimate, independent bool) stats.Estimate {
	e.Value = min(max(0, e.Value), 1) // sums of weights, rounded
	n := float64(s.values)
	if p := e.Value; !independent && e.StandardError > 0 {
		n = min(n, p*(1-p)/(e.StandardError*e.StandardError))
	}
	e.Lower, e.Upper = stats.ProportionInterval(e.Value, max(1, n), confidence)
	return e
}

// ratio is the mean of s over the mean of by, over their own rows; NaN unless the
// latter is positive.
func (s *variableSums) ratio(by *variableSums) stats.Estimate {
	top, bottom := s.total(), by.total()
	return jackknife(by.mass, func(without int) float64 {
		t, b := s.left(top, without), by.left(bottom, without)
		below := by.pivot + b.first/b.mass
		if !(below > 0) {
			return math.NaN()
		}
		return (s.pivot + t.first/t.mass) / below
	})
}
