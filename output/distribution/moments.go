package distribution

import (
	"math"

	"cistern/output/stats"
)

// tally are the sums of one variable over rows of one jackknife group. Values are
// taken about a pivot, a value of the cell, so that squares cost no digits and a
// constant has no variance at all.
type tally struct {
	mass          float64 // Σ w
	first, second float64 // Σ w·(x − pivot), Σ w·(x − pivot)²
}

// variableSums are the sums of one variable in one cell, by jackknife group.
type variableSums struct {
	any       bool
	pivot     float64
	low, high float64 // extremes, for the variables of Options.Means
	sums      [Groups]tally
	shares    [][Groups]float64 // [threshold] Σ w of the rows counted
}

// cellSums are the sums of one cell.
type cellSums struct {
	cell int
	rows [Groups]int64
	vars []variableSums
}

// reset empties the sums for a cell and keeps their memory.
func (c *cellSums) reset(cell int, o *Options) {
	c.cell, c.rows = cell, [Groups]int64{}
	if c.vars == nil {
		c.vars = make([]variableSums, len(o.Variables))
	}
	for v := range c.vars {
		s := &c.vars[v]
		shares := s.shares
		*s = variableSums{low: math.Inf(1), high: math.Inf(-1)}
		if shares == nil {
			shares = make([][Groups]float64, len(o.Variables[v].Shares))
		}
		clear(shares)
		s.shares = shares
	}
}

// blockSums are the sums of one block, one entry a cell that occurs.
type blockSums struct {
	cells []cellSums
	used  int
}

// open returns the sums of a cell, those in use last if it is the same.
func (b *blockSums) open(cell int, o *Options) *cellSums {
	if b.used > 0 && b.cells[b.used-1].cell == cell {
		return &b.cells[b.used-1]
	}
	if b.used == len(b.cells) {
		b.cells = append(b.cells, cellSums{})
	}
	c := &b.cells[b.used]
	c.reset(cell, o)
	b.used++
	return c
}

func (s *Study) take() *blockSums {
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

func (s *Study) give(b *blockSums) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.spare = append(s.spare, b)
}

// sum forms the sums of a block.
func (s *Study) sum(b *blockSums, r *Rows) {
	for _, sp := range r.Spans {
		if sp.From == sp.To {
			continue
		}
		c := b.open(sp.Cell, &s.o)
		unit := r.Unit[sp.From:sp.To]
		for _, u := range unit {
			c.rows[u&(Groups-1)]++
		}
		for v := range c.vars {
			x := r.Values[v][sp.From:sp.To]
			switch {
			case s.o.Weighted:
				c.vars[v].addWeighted(unit, x, r.Weight[sp.From:sp.To])
			case s.o.Variables[v].Optional:
				c.vars[v].addOptional(unit, x)
			default:
				c.vars[v].add(unit, x)
			}
			c.vars[v].count(s.o.Variables[v].Shares, unit, x, r, sp)
			if s.bounded[v] {
				c.vars[v].bound(x)
			}
		}
	}
	if s.o.Weighted {
		return
	}
	for i := range b.used { // where every row has a value, rows are mass
		c := &b.cells[i]
		for v := range c.vars {
			if !s.o.Variables[v].Optional {
				for g, n := range c.rows {
					c.vars[v].sums[g].mass = float64(n)
				}
			}
		}
	}
}

// add takes values of which none is missing and none weighs more than another;
// their mass is left to the caller.
func (s *variableSums) add(unit []int64, x []float64) {
	if !s.any {
		s.any, s.pivot = true, x[0]
	}
	pivot := s.pivot
	x = x[:len(unit)]
	for k, u := range unit {
		t := &s.sums[u&(Groups-1)]
		d := x[k] - pivot
		t.first += d
		t.second += float64(d * d)
	}
}

func (s *variableSums) addOptional(unit []int64, x []float64) {
	for k, u := range unit {
		if v := x[k]; v == v {
			if !s.any {
				s.any, s.pivot = true, v
			}
			t := &s.sums[u&(Groups-1)]
			d := v - s.pivot
			t.mass++
			t.first += d
			t.second += float64(d * d)
		}
	}
}

func (s *variableSums) addWeighted(unit []int64, x, weight []float64) {
	for k, u := range unit {
		if v := x[k]; v == v {
			if !s.any {
				s.any, s.pivot = true, v
			}
			t := &s.sums[u&(Groups-1)]
			d, w := v-s.pivot, weight[k]
			t.mass += w
			t.first += float64(w * d)
			t.second += float64(w * float64(d*d))
		}
	}
}

// count counts the rows on the near side of each threshold. A missing value is on
// neither side.
func (s *variableSums) count(shares []Threshold, unit []int64, x []float64, r *Rows, sp Span) {
	for i, t := range shares {
		highest := t.Value
		if t.Strict {
			highest = math.Nextafter(highest, math.Inf(-1))
		}
		at := &s.shares[i]
		if r.Weight != nil {
			for k, w := range r.Weight[sp.From:sp.To] {
				if x[k] <= highest {
					at[unit[k]&(Groups-1)] += w
				}
			}
			continue
		}
		for k, u := range unit {
			var one float64
			if x[k] <= highest {
				one = 1
			}
			at[u&(Groups-1)] += one
		}
	}
}

func (s *variableSums) bound(x []float64) {
	low, high := s.low, s.high
	for _, v := range x {
		if v < low {
			low = v
		}
		if v > high {
			high = v
		}
	}
	s.low, s.high = low, high
}

// finite reports whether all sums are, the variable in question where not.
func (c *cellSums) finite() (variable int, ok bool) {
	for v := range c.vars {
		var sum float64
		for g := range c.vars[v].sums {
			t := &c.vars[v].sums[g]
			sum += (t.first - t.first) + (t.second - t.second) + (t.mass - t.mass) // 0, or NaN where infinite or NaN
		}
		if sum != 0 {
			return v, false
		}
	}
	return 0, true
}

// fold adds weight times the sums of another part, moved to c's pivot.
func (s *variableSums) fold(part *variableSums, weight float64) {
	if !part.any {
		return
	}
	if !s.any {
		s.any, s.pivot = true, part.pivot
	}
	d := part.pivot - s.pivot
	for g := range s.sums {
		to, from := &s.sums[g], &part.sums[g]
		mass := float64(weight * from.mass)
		to.mass += mass
		to.first += float64(weight*from.first) + float64(mass*d)
		to.second += float64(weight*from.second) + float64(2*d*float64(weight*from.first)) + float64(mass*float64(d*d))
	}
	for i := range s.shares {
		for g := range s.shares[i] {
			s.shares[i][g] += float64(weight * part.shares[i][g])
		}
	}
	s.low, s.high = min(s.low, part.low), max(s.high, part.high)
}

func (c *cellSums) fold(part *cellSums, weight float64) {
	for v := range c.vars {
		c.vars[v].fold(&part.vars[v], weight)
	}
	for g, n := range part.rows {
		c.rows[g] += n
	}
}

// pool folds the cells of a target, in their order.
func (s *Study) pool(t *Target) *cellSums {
	c := new(cellSums)
	c.reset(-1, &s.o)
	for _, cell := range t.Cells {
		if m := &s.moments[cell.Index]; m.vars != nil {
			c.fold(m, cell.Weight)
		}
	}
	return c
}

// total returns the sums over all jackknife groups.
func (s *variableSums) total() (all tally) {
	for g := range s.sums {
		all.mass += s.sums[g].mass
		all.first += s.sums[g].first
		all.second += s.sums[g].second
	}
	return all
}

// jackknife returns a statistic with its error: of is called with every group and
// without each in turn, given what is left out (−1: nothing).
func jackknife(sizes *[Groups]float64, of func(without int) float64) stats.Estimate {
	full := of(-1)
	var without [Groups]float64
	for g := range without {
		if sizes[g] > 0 {
			without[g] = of(g)
		}
	}
	se, n := stats.Jackknife(full, without[:], sizes[:])
	return stats.JackknifeInterval(full, se, n, confidence)
}

// masses are the sizes of the jackknife groups.
func (s *variableSums) masses() *[Groups]float64 {
	var m [Groups]float64
	for g := range m {
		m[g] = s.sums[g].mass
	}
	return &m
}

// left returns the total without a group.
func (s *variableSums) left(all tally, without int) tally {
	if without >= 0 {
		t := &s.sums[without]
		all.mass -= t.mass
		all.first -= t.first
		all.second -= t.second
	}
	return all
}

func (s *variableSums) mean() stats.Estimate {
	all := s.total()
	return jackknife(s.masses(), func(without int) float64 {
		t := s.left(all, without)
		return s.pivot + t.first/t.mass
	})
}

// sd is the standard deviation, with the factor n/(n−1) for n rows. Its interval
// is that of the logarithm, whose sampling distribution is nearer to the normal.
func (s *variableSums) sd(rows float64) stats.Estimate {
	all := s.total()
	of := func(without int) float64 {
		t := s.left(all, without)
		n := rows * t.mass / all.mass
		if n < 2 {
			return math.NaN()
		}
		return math.Sqrt(max(0, t.second-t.first*t.first/t.mass) / t.mass * (n / (n - 1)))
	}
	e := jackknife(s.masses(), of)
	if e.Value > 0 {
		log := jackknife(s.masses(), func(without int) float64 { return math.Log(of(without)) })
		e.Lower, e.Upper = math.Exp(log.Lower), math.Exp(log.Upper)
	}
	return e
}

// share is the share of rows that threshold i counts. Its interval is that of
// Clopper and Pearson, with the effective number of rows that the jackknife error
// implies where rows are not independent.
func (s *variableSums) share(i int, rows float64, independent bool) stats.Estimate {
	all := s.total()
	counted := 0.0
	for _, c := range s.shares[i] {
		counted += c
	}
	e := jackknife(s.masses(), func(without int) float64 {
		c := counted
		if without >= 0 {
			c -= s.shares[i][without]
		}
		return c / s.left(all, without).mass
	})
	if e.Value > 1 { // sums of weights, rounded
		e.Value = 1
	}
	if p := e.Value; !independent && e.StandardError > 0 {
		rows = min(rows, p*(1-p)/(e.StandardError*e.StandardError))
	}
	e.Lower, e.Upper = stats.ProportionInterval(e.Value, max(1, rows), confidence)
	return e
}

// ratio is the mean of s over the mean of by, over their own rows; NaN unless the
// latter is positive.
func (s *variableSums) ratio(by *variableSums) stats.Estimate {
	top, bottom := s.total(), by.total()
	return jackknife(by.masses(), func(without int) float64 {
		t, b := s.left(top, without), by.left(bottom, without)
		below := by.pivot + b.first/b.mass
		if !(below > 0) {
			return math.NaN()
		}
		return (s.pivot + t.first/t.mass) / below
	})
}
