package distribution

import "math"

// tally are the sums of one variable over rows of one jackknife group. Values are
// taken about a pivot, a value of the cell, so that squares cost no digits and a
// constant has no variance at all.
type tally struct{ first, second float64 } // Σ w·(x − pivot), Σ w·(x − pivot)²

// variableSums are the sums of one variable in one cell, by jackknife group.
type variableSums struct {
	any       bool // there is a value
	pivot     float64
	low, high float64 // extremes, of Options.Means alone
	sums      [Groups]tally
	mass      []float64         // [group] Σ w; nil: the cell's rows, where all have a value and weigh 1
	values    int64             // rows with a value, where mass is counted
	shares    [][Groups]float64 // [threshold] Σ w of the rows counted
}

// cellSums are the sums of one cell.
type cellSums struct {
	cell int
	rows [Groups]int64
	vars []variableSums
}

// reset empties the sums for a cell and keeps their memory.
func (c *cellSums) reset(cell int, s *Study) {
	c.cell, c.rows = cell, [Groups]int64{}
	if c.vars == nil {
		c.vars = make([]variableSums, len(s.o.Variables))
		for v := range c.vars {
			c.vars[v].shares = make([][Groups]float64, len(s.o.Variables[v].Shares))
			if s.o.Weighted || s.o.Variables[v].Optional {
				c.vars[v].mass = make([]float64, Groups)
			}
		}
	}
	for v := range c.vars {
		u := &c.vars[v]
		clear(u.shares)
		clear(u.mass)
		*u = variableSums{low: math.Inf(1), high: math.Inf(-1), mass: u.mass, shares: u.shares}
	}
}

// blockSums are the sums of one block, one entry a cell that occurs.
type blockSums struct {
	cells []cellSums
	used  int
}

// open returns the sums of a cell, those in use last if it is the same.
func (b *blockSums) open(cell int, s *Study) *cellSums {
	if b.used > 0 && b.cells[b.used-1].cell == cell {
		return &b.cells[b.used-1]
	}
	if b.used == len(b.cells) {
		b.cells = append(b.cells, cellSums{})
	}
	c := &b.cells[b.used]
	c.reset(cell, s)
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
		c := b.open(sp.Cell, s)
		unit := r.Unit[sp.From:sp.To]
		column := func(v int) []float64 { return r.Values[v][sp.From:sp.To] }
		var weight []float64
		if s.o.Weighted {
			weight = r.Weight[sp.From:sp.To]
		}
		s.sumPlain(c, unit, column)
		for _, v := range s.gappy {
			if weight != nil {
				c.vars[v].addWeighted(unit, column(v), weight, s.o.Variables[v].Optional)
			} else {
				c.vars[v].addOptional(unit, column(v))
			}
		}
		if weight != nil {
			countRows(&c.rows, unit, weight)
		}
		for v := range c.vars {
			if shares := s.o.Variables[v].Shares; len(shares) > 0 {
				c.vars[v].count(shares, unit, column(v), weight)
			}
		}
		for _, v := range s.o.Means {
			c.vars[v].bound(column(v))
		}
	}
}

// sumPlain sums the variables of which every row has a value and all weigh the
// same, three at a time, and counts rows.
func (s *Study) sumPlain(c *cellSums, unit []int64, column func(int) []float64) {
	rows := &c.rows
	if s.o.Weighted {
		return
	}
	spread := s.spread
	for ; len(spread) >= 3; spread = spread[3:] {
		i, j, k := spread[0], spread[1], spread[2]
		addThree(rows, &c.vars[i], &c.vars[j], &c.vars[k], unit, column(i), column(j), column(k))
		rows = new([Groups]int64) // counted once
	}
	for _, v := range spread {
		c.vars[v].add(unit, column(v))
	}
	for _, v := range s.level {
		c.vars[v].addMean(unit, column(v))
	}
	if len(s.spread) < 3 {
		countRows(&c.rows, unit, nil)
	}
}

// begin sets the pivot.
func (s *variableSums) begin(x float64) float64 {
	if !s.any {
		s.any, s.pivot = true, x
	}
	return s.pivot
}

// addThree takes values of three variables and counts rows: together they wait
// less for memory.
func addThree(rows *[Groups]int64, a, b, c *variableSums, unit []int64, x, y, z []float64) {
	p, q, r := a.begin(x[0]), b.begin(y[0]), c.begin(z[0])
	x, y, z = x[:len(unit)], y[:len(unit)], z[:len(unit)]
	for k, u := range unit {
		g := u & (Groups - 1)
		rows[g]++
		t := &a.sums[g]
		d := x[k] - p
		t.first += d
		t.second += float64(d * d)
		t = &b.sums[g]
		d = y[k] - q
		t.first += d
		t.second += float64(d * d)
		t = &c.sums[g]
		d = z[k] - r
		t.first += d
		t.second += float64(d * d)
	}
}

func (s *variableSums) add(unit []int64, x []float64) {
	pivot := s.begin(x[0])
	x = x[:len(unit)]
	for k, u := range unit {
		t := &s.sums[u&(Groups-1)]
		d := x[k] - pivot
		t.first += d
		t.second += float64(d * d)
	}
}

func (s *variableSums) addMean(unit []int64, x []float64) {
	pivot := s.begin(x[0])
	x = x[:len(unit)]
	for k, u := range unit {
		s.sums[u&(Groups-1)].first += x[k] - pivot
	}
}

func (s *variableSums) addOptional(unit []int64, x []float64) {
	for k, u := range unit {
		if v := x[k]; v == v {
			d := v - s.begin(v)
			t := &s.sums[u&(Groups-1)]
			t.first += d
			t.second += float64(d * d)
			s.mass[u&(Groups-1)]++
			s.values++
		}
	}
}

func (s *variableSums) addWeighted(unit []int64, x, weight []float64, optional bool) {
	for k, u := range unit {
		if v, w := x[k], weight[k]; (v == v || !optional) && w > 0 {
			d := v - s.begin(v)
			t := &s.sums[u&(Groups-1)]
			t.first += float64(w * d)
			t.second += float64(w * float64(d*d))
			s.mass[u&(Groups-1)] += w
			s.values++
		}
	}
}

// countRows counts rows; those that weigh nothing are not there.
func countRows(rows *[Groups]int64, unit []int64, weight []float64) {
	for k, u := range unit {
		if weight == nil || weight[k] > 0 {
			rows[u&(Groups-1)]++
		}
	}
}

// count counts the rows on the near side of each threshold. A missing value is on
// neither side.
func (s *variableSums) count(shares []Threshold, unit []int64, x, weight []float64) {
	x = x[:len(unit)]
	for i, t := range shares {
		highest := t.highest()
		at := &s.shares[i]
		if weight != nil {
			for k, w := range weight {
				if x[k] <= highest {
					at[unit[k]&(Groups-1)] += w
				}
			}
			continue
		}
		for k, u := range unit {
			if x[k] <= highest {
				at[u&(Groups-1)]++
			}
		}
	}
}

// highest is the highest value that counts.
func (t Threshold) highest() float64 {
	if t.Strict {
		return math.Nextafter(t.Value, math.Inf(-1))
	}
	return t.Value
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
			sum += (t.first - t.first) + (t.second - t.second) // 0, or NaN where infinite or NaN
		}
		if sum != 0 {
			return v, false
		}
	}
	return 0, true
}

// massOf is the weight of a variable's rows in a group.
func (c *cellSums) massOf(v, g int) float64 {
	if m := c.vars[v].mass; m != nil {
		return m[g]
	}
	return float64(c.rows[g])
}

// fold adds weight times the sums of another part, moved to c's pivot.
func (c *cellSums) fold(part *cellSums, weight float64) {
	for v := range c.vars {
		to, from := &c.vars[v], &part.vars[v]
		if !from.any {
			continue
		}
		d := from.pivot - to.begin(from.pivot)
		for g := range to.sums {
			t, f := &to.sums[g], &from.sums[g]
			mass := float64(weight * part.massOf(v, g))
			t.first += float64(weight*f.first) + float64(mass*d)
			t.second += float64(weight*f.second) + float64(2*d*float64(weight*f.first)) + float64(mass*float64(d*d))
			if to.mass != nil {
				to.mass[g] += mass
			}
		}
		to.values += part.valuesOf(v)
		for i := range to.shares {
			for g := range to.shares[i] {
				to.shares[i][g] += float64(weight * from.shares[i][g])
			}
		}
		to.low, to.high = min(to.low, from.low), max(to.high, from.high)
	}
	for g, n := range part.rows {
		c.rows[g] += n
	}
}

// valuesOf is the number of rows with a value of a variable.
func (c *cellSums) valuesOf(v int) (n int64) {
	if c.vars == nil {
		return 0
	}
	if c.vars[v].mass != nil {
		return c.vars[v].values
	}
	for _, m := range c.rows {
		n += m
	}
	return n
}
