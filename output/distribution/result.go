package distribution

import (
	"math"

	"cistern/output/stats"
)

// Result is what a finished study says of one target. Variables are numbered as in
// Options.Variables, levels as in the lists of Options. A figure that does not
// exist (of no rows, of a concentration where the mean is not positive, of a bound
// beyond the extremes) is NaN.
type Result struct {
	s      *Study
	t      *Target
	target int
	sums   *cellSums
}

// Target returns what the study says of target i. It panics before the last
// EndPass.
func (s *Study) Target(i int) *Result {
	if s.phase != done {
		panic("distribution: study is not finished")
	}
	t := &s.o.Targets[i]
	return &Result{s: s, t: t, target: i, sums: s.pool(t)}
}

// CellRows returns the number of rows of a cell.
func (s *Study) CellRows(cell int) int64 {
	var n int64
	for _, m := range s.moments[cell].rows {
		n += m
	}
	return n
}

// CellValues returns the number of rows of a cell with a value of variable v.
func (s *Study) CellValues(cell, v int) int64 { return s.moments[cell].valuesOf(v) }

// Rows returns the number of rows of the target, with a value of any variable or
// without.
func (r *Result) Rows() int64 {
	var n int64
	for _, m := range r.sums.rows {
		n += m
	}
	return n
}

// Values returns the number of rows with a value of variable v.
func (r *Result) Values(v int) int64 { return r.sums.vars[v].values }

var missing = stats.Estimate{Value: math.NaN(), StandardError: math.NaN(), Lower: math.NaN(), Upper: math.NaN()}

// Mean returns the mean of variable v.
func (r *Result) Mean(v int) stats.Estimate {
	if !r.sums.vars[v].any {
		return missing
	}
	return r.sums.vars[v].mean()
}

// SD returns the standard deviation of variable v, with the factor n/(n−1); NaN
// where MeanOnly.
func (r *Result) SD(v int) stats.Estimate {
	if !r.sums.vars[v].any || r.s.o.Variables[v].MeanOnly {
		return missing
	}
	return r.sums.vars[v].sd()
}

// Share returns the share of rows that threshold i of variable v counts.
func (r *Result) Share(v, i int) stats.Estimate {
	if !r.sums.vars[v].any {
		return missing
	}
	return r.sums.vars[v].share(i, r.t.Independent)
}

// Proportion returns the mean of variable v, which is 0 or 1, with the interval of
// a share.
func (r *Result) Proportion(v int) stats.Estimate {
	e := r.Mean(v)
	if math.IsNaN(e.Value) {
		return e
	}
	return r.sums.vars[v].proportion(e, r.t.Independent)
}

// Ratio returns the mean of variable v over the mean of variable by; NaN unless the
// latter is positive.
func (r *Result) Ratio(v, by int) stats.Estimate {
	if !r.sums.vars[v].any || !r.sums.vars[by].any {
		return missing
	}
	return r.sums.vars[v].ratio(&r.sums.vars[by])
}

// of returns the result of a held variable.
func (r *Result) of(v int) *result {
	return &r.s.results[r.target*len(r.s.held)+r.s.slot[v]]
}

// wants panics unless the target asked for the part.
func (r *Result) wants(v int, part Set) *result {
	if r.t.Wants[v]&part == 0 {
		panic("distribution: the target did not ask for this of " + r.s.o.Variables[v].Name)
	}
	return r.of(v)
}

// Percentile returns percentile i of variable v.
func (r *Result) Percentile(v, i int) stats.Estimate {
	k := r.wants(v, Percentiles)
	if k.rows == 0 {
		return missing
	}
	return k.quantiles[i].value
}

// Median returns the median of variable v, of a target that asked for Median alone.
func (r *Result) Median(v int) stats.Estimate {
	k := r.wants(v, Median)
	if k.rows == 0 {
		return missing
	}
	for i, level := range k.levels {
		if level == 50 {
			return k.quantiles[i].value
		}
	}
	return missing
}

// Gini returns the Gini coefficient of variable v, half the mean absolute
// difference between two rows drawn without replacement over the mean.
func (r *Result) Gini(v int) stats.Estimate { return r.wants(v, Gini).gini }

// GiniBound returns by how much the Gini coefficient may be off since it comes from
// binned values: 0 where it does not.
func (r *Result) GiniBound(v int) float64 { return r.wants(v, Gini).giniBound }

// Lorenz returns the share of the total that the poorest Options.Lorenz[i] per cent
// have.
func (r *Result) Lorenz(v, i int) stats.Estimate {
	k := r.wants(v, Concentration)
	return k.figure(func(p *partial, without int) float64 { return p.lorenz(r.s.o.Lorenz[i]/100, i, without) })
}

// TopShare returns the share of the total that the richest Options.TopShares[i] per
// cent have.
func (r *Result) TopShare(v, i int) stats.Estimate {
	k, o := r.wants(v, Concentration), &r.s.o
	return k.figure(func(p *partial, without int) float64 {
		return 1 - p.lorenz(1-o.TopShares[i]/100, len(o.Lorenz)+i, without)
	})
}

// QuintileRatio returns S80/S20: what the richest fifth have over what the poorest
// fifth have; NaN unless the poorest fifth have something.
func (r *Result) QuintileRatio(v int) stats.Estimate {
	k, o := r.wants(v, Concentration), &r.s.o
	at := len(o.Lorenz) + len(o.TopShares)
	return k.figure(func(p *partial, without int) float64 {
		poorest := p.lorenz(0.2, at, without)
		if !(poorest > 0) {
			return math.NaN()
		}
		return (1 - p.lorenz(0.8, at+1, without)) / poorest
	})
}

// Shortfall returns the mean of the lowest Options.Shortfalls[i] per cent.
func (r *Result) Shortfall(v, i int) stats.Estimate {
	k, o := r.wants(v, Shortfall), &r.s.o
	at := len(o.Lorenz) + len(o.TopShares) + 2 + i
	share := o.Shortfalls[i] / 100
	return k.figure(func(p *partial, without int) float64 {
		return p.lowest(share, at, without) / (share * p.own.whole(without).mass)
	})
}

// Hill returns Hill's index of the upper Options.Tails[i] per cent, with the number
// of rows above the threshold. It is NaN unless the threshold is positive.
func (r *Result) Hill(v, i int) (alpha stats.Estimate, rows int64) {
	k, o := r.wants(v, Tail), &r.s.o
	if k.partial == nil {
		return missing, 0
	}
	p, first := k.partial, o.firstTail()+3*i
	at := p.of[first]
	u := p.limits[at]
	if !(u > 0) {
		return missing, 0
	}
	density := 0.0 // of log x at the threshold, over the rows
	if low, high := p.limits[p.of[first+1]], p.limits[p.of[first+2]]; low > 0 && high > low {
		density = 2 * k.besides(o.Tails[i]/100) / math.Log(high/low)
	}
	whole := p.own.whole(-1).mass
	share := 1 - p.own.upTo(at, -1).mass/whole
	for _, n := range p.rows[at+1:] {
		rows += n
	}
	return k.figure(func(p *partial, without int) float64 {
		all := p.own.whole(without).mass
		above := all - p.own.upTo(at, without).mass
		logs := -above * math.Log(u)
		for g := range Groups {
			if g != without {
				logs += p.logs[i][g]
			}
		}
		if without >= 0 && density > 0 {
			shift := (above/all - share) / density // by which the threshold moves
			logs += shift * (density*all*shift/2 - above)
			above = share * all
		}
		return above / logs
	}), rows
}

// MeanIn returns the mean of Options.Means[m] among the rows in class, from 0, of
// variable v. Rows of one value are in one class, the lower.
func (r *Result) MeanIn(v, class, m int) stats.Estimate {
	k, o := r.wants(v, Classes), &r.s.o
	if k.partial == nil {
		return missing
	}
	first := o.firstClass()
	above, to := -1, len(k.partial.own)-1
	if class > 0 {
		above = k.partial.of[first+class-1]
	}
	if class < o.Classes-1 {
		to = k.partial.of[first+class]
	}
	c := k.partial.means[m]
	inside := func(without int) heap { return c.upTo(to, without).less(c.upTo(above, without)) }
	if inside(-1).mass == 0 {
		return missing
	}
	return jackknife(c.masses(above, to), func(without int) float64 {
		h := inside(without)
		return h.sum / h.mass
	})
}

// figure returns a figure made of partial sums with its error.
func (k *result) figure(of func(p *partial, without int) float64) stats.Estimate {
	p := k.partial
	if p == nil {
		return missing
	}
	return jackknife(p.own.masses(-1, len(p.own)-1), func(without int) float64 { return of(p, without) })
}

// lowest returns share·N·x_p − D_p, what the lowest share of the rows have, the
// threshold being that of edge i.
func (p *partial) lowest(share float64, i, without int) float64 {
	at := p.of[i]
	below := p.own.upTo(at, without)
	return below.sum + (share*p.own.whole(without).mass-below.mass)*p.limits[at]
}

// lorenz is what the lowest share of the rows have of the total; NaN unless that is
// positive.
func (p *partial) lorenz(share float64, i, without int) float64 {
	total := p.own.whole(without).sum
	if !(total > 0) {
		return math.NaN()
	}
	return p.lowest(share, i, without) / total
}
