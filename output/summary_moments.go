package output

import (
	"math"

	"cistern/output/stats"
)

// groupSums are sums over the rows of one cell in one jackknife group. The
// variables are taken about a pivot, a value of the cell, so that squares cost
// no digits and a constant has no variance at all.
type groupSums struct {
	first, second [variables]float64 // Σ(x−pivot), Σ(x−pivot)²
	propensity    float64
	gap           float64 // Σ(assets − twin's assets)
}

// cellSums are the sums of one cell (age and group), by jackknife group.
type cellSums struct {
	cell  int
	any   bool
	pivot [variables]float64
	sums  [groupsJackknife]groupSums
	rows  [groupsJackknife]int64
	limit [groupsJackknife]int64
}

// blockSums are the sums of one block, one entry a cell that occurs.
type blockSums struct {
	cells []cellSums
	used  int
}

// open returns the sums of a cell, those in use last if it is the same.
func (b *blockSums) open(cell int) *cellSums {
	if b.used > 0 && b.cells[b.used-1].cell == cell {
		return &b.cells[b.used-1]
	}
	if b.used == len(b.cells) {
		b.cells = append(b.cells, cellSums{})
	}
	c := &b.cells[b.used]
	*c = cellSums{cell: cell}
	b.used++
	return c
}

func (s *Summary) take() *blockSums {
	s.mu.Lock()
	defer s.mu.Unlock()
	if n := len(s.spare); n > 0 {
		b := s.spare[n-1]
		s.spare = s.spare[:n-1]
		b.used = 0
		return b
	}
	return &blockSums{}
}

func (s *Summary) give(b *blockSums) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.spare = append(s.spare, b)
}

// sum forms the sums of a block.
func (s *Summary) sum(b *blockSums, r *SummaryRows) {
	for _, sp := range r.Spans {
		if sp.From == sp.To {
			continue
		}
		c := b.open(s.cellOf(sp))
		if !c.any {
			c.any = true
			c.pivot = [variables]float64{r.Income[sp.From], r.Consumption[sp.From], r.Assets[sp.From]}
		}
		c.add(r, sp.From, sp.To)
	}
}

func (c *cellSums) add(r *SummaryRows, from, to int) {
	household := r.Household[from:to]
	inc, con, ass := r.Income[from:to][:len(household)], r.Consumption[from:to][:len(household)], r.Assets[from:to][:len(household)]
	pi, pc, pa := c.pivot[income], c.pivot[consumption], c.pivot[assets]
	for k, id := range household {
		g := id & (groupsJackknife - 1)
		c.rows[g]++
		s := &c.sums[g]
		x := inc[k] - pi
		s.first[income] += x
		s.second[income] += float64(x * x)
		x = con[k] - pc
		s.first[consumption] += x
		s.second[consumption] += float64(x * x)
		x = ass[k] - pa
		s.first[assets] += x
		s.second[assets] += float64(x * x)
	}
	if len(r.Propensity) > 0 {
		for k, v := range r.Propensity[from:to][:len(household)] {
			c.sums[household[k]&(groupsJackknife-1)].propensity += v
		}
	}
	if len(r.TwinAssets) > 0 {
		for k, v := range r.TwinAssets[from:to][:len(household)] {
			c.sums[household[k]&(groupsJackknife-1)].gap += ass[k] - v
		}
	}
	if len(r.AtLimit) > 0 {
		for k, v := range r.AtLimit[from:to][:len(household)] {
			var one int64
			if v {
				one = 1 // compiled without a jump
			}
			c.limit[household[k]&(groupsJackknife-1)] += one
		}
	}
}

// finite reports whether all sums are.
func (c *cellSums) finite() bool {
	var sum float64
	for g := range c.sums {
		s := &c.sums[g]
		for v := range variables {
			sum += s.first[v] - s.first[v] // 0, or NaN where infinite or NaN
		}
		sum += (s.propensity - s.propensity) + (s.gap - s.gap)
	}
	return sum == 0
}

// fold adds the sums of another part of the cell, moved to c's pivot.
func (c *cellSums) fold(part *cellSums) {
	if !part.any {
		return
	}
	if !c.any {
		*c = *part
		return
	}
	var d [variables]float64
	for v := range variables {
		d[v] = part.pivot[v] - c.pivot[v]
	}
	for g := range c.sums {
		n := float64(part.rows[g])
		to, from := &c.sums[g], &part.sums[g]
		for v := range variables {
			to.first[v] += from.first[v] + float64(n*d[v])
			to.second[v] += from.second[v] + float64(2*d[v]*from.first[v]) + float64(n*float64(d[v]*d[v]))
		}
		to.propensity += from.propensity
		to.gap += from.gap
		c.rows[g] += part.rows[g]
		c.limit[g] += part.limit[g]
	}
}

// pool folds the cells of a target, in their order.
func (s *Summary) pool(t *target) *cellSums {
	var c cellSums
	for _, cell := range t.cells {
		c.fold(&s.moments[cell])
	}
	return &c
}

// rows counts the rows of a target.
func (s *Summary) rows(target int) int64 {
	var n int64
	for _, c := range s.targets[target].cells {
		for _, m := range s.moments[c].rows {
			n += m
		}
	}
	return n
}

// households counts the households of a target, each once: those alive at its
// youngest age, since households leave by death only.
func (s *Summary) households(t *target) int64 {
	groups := len(s.o.Groups)
	var sum int64
	for g := range groups {
		if t.group >= 0 && t.group != g {
			continue
		}
		var most int64
		for a := t.first; a <= t.last; a++ {
			var n int64
			for _, m := range s.moments[(a-s.o.FirstAge)*groups+g].rows {
				n += m
			}
			most = max(most, n)
		}
		sum += most
	}
	return sum
}

// total returns the sums over all jackknife groups and their rows.
func (c *cellSums) total() (all groupSums, rows, limit int64) {
	for g := range c.sums {
		s := &c.sums[g]
		for v := range variables {
			all.first[v] += s.first[v]
			all.second[v] += s.second[v]
		}
		all.propensity += s.propensity
		all.gap += s.gap
		rows += c.rows[g]
		limit += c.limit[g]
	}
	return all, rows, limit
}

// less returns a without b.
func (a groupSums) less(b *groupSums) groupSums {
	for v := range variables {
		a.first[v] -= b.first[v]
		a.second[v] -= b.second[v]
	}
	a.propensity -= b.propensity
	a.gap -= b.gap
	return a
}

// estimate returns a statistic of the sums with its jackknife error. of is
// given sums, the number of rows and of rows at the limit.
func (c *cellSums) estimate(of func(s *groupSums, rows, limit float64) float64) stats.Estimate {
	all, rows, limit := c.total()
	full := of(&all, float64(rows), float64(limit))
	var without, sizes [groupsJackknife]float64
	for g := range c.sums {
		rest := all.less(&c.sums[g])
		sizes[g] = float64(c.rows[g])
		without[g] = of(&rest, float64(rows-c.rows[g]), float64(limit-c.limit[g]))
	}
	se, n := stats.Jackknife(full, without[:], sizes[:])
	return stats.JackknifeInterval(full, se, n, confidence)
}

// mean of a variable.
func (c *cellSums) mean(v int) stats.Estimate {
	return c.estimate(func(s *groupSums, n, _ float64) float64 { return c.pivot[v] + s.first[v]/n })
}

// sd of a variable, divisor n−1. Its interval is that of the logarithm, whose
// sampling distribution is nearer to the normal.
func (c *cellSums) sd(v int) stats.Estimate {
	sd := func(s *groupSums, n, _ float64) float64 {
		if n < 2 {
			return math.NaN()
		}
		return math.Sqrt(max(0, s.second[v]-s.first[v]*s.first[v]/n) / (n - 1))
	}
	e := c.estimate(sd)
	if e.Value > 0 {
		log := c.estimate(func(s *groupSums, n, limit float64) float64 { return math.Log(sd(s, n, limit)) })
		e.Lower, e.Upper = math.Exp(log.Lower), math.Exp(log.Upper)
	}
	return e
}

// meanPropensity is the mean marginal propensity to consume.
func (c *cellSums) meanPropensity() stats.Estimate {
	return c.estimate(func(s *groupSums, n, _ float64) float64 { return s.propensity / n })
}

// shareAtLimit is the share of rows at the borrowing limit. Its interval is
// that of Clopper and Pearson, with the effective number of rows that the
// jackknife error implies where rows of a household are pooled.
func (c *cellSums) shareAtLimit(independent bool) stats.Estimate {
	e := c.estimate(func(_ *groupSums, n, limit float64) float64 { return limit / n })
	_, rows, _ := c.total()
	n := float64(rows)
	if p := e.Value; !independent && e.StandardError > 0 {
		n = min(n, p*(1-p)/(e.StandardError*e.StandardError))
	}
	e.Lower, e.Upper = stats.ProportionInterval(e.Value, max(1, n), confidence)
	return e
}

// precautionary is mean assets minus the mean assets of the certain twins of
// the same households: a paired difference.
func (c *cellSums) precautionary() stats.Estimate {
	return c.estimate(func(s *groupSums, n, _ float64) float64 { return s.gap / n })
}

// precautionaryShare is the paired difference relative to mean assets; NaN
// unless they are positive.
func (c *cellSums) precautionaryShare() stats.Estimate {
	return c.estimate(func(s *groupSums, n, _ float64) float64 {
		mean := c.pivot[assets] + s.first[assets]/n
		if !(mean > 0) {
			return math.NaN()
		}
		return s.gap / n / mean
	})
}
