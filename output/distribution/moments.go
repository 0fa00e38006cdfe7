package distribution

import (
	"math"
)

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
