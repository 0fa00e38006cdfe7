package distribution

import (
	"math"
)

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
