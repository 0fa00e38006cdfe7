package mobility

import "slices"

// window is the half width of the ranks about a limit, in widths of a class, in
// which households stand for those at the limit.
const window = 0.25

// edges are what divides the classes of one target at both ages.
type edges [2]struct {
	limits    []float64 // [limit]
	low, high []float64 // [limit] the window about it
}

// beginCounting takes over the limits found.
func (s *Study) beginCounting() {
	s.phase = counting
	for i := range s.targets() {
		t := s.limits.Target(i)
		var e edges
		for age := range e {
			for k := 0; k < len(s.levels); k += 3 {
				e[age].low = append(e[age].low, t.Percentile(age, k).Value)
				e[age].limits = append(e[age].limits, t.Percentile(age, k+1).Value)
				e[age].high = append(e[age].high, t.Percentile(age, k+2).Value)
			}
		}
		s.edges = append(s.edges, e)
	}
	s.limits = nil
	for range s.o.Workers {
		c := make([]counts, s.targets())
		for i := range c {
			c[i] = newCounts(s.o.Quantiles)
		}
		s.counts = append(s.counts, c)
	}
}

// counts are numbers of households of one target.
type counts struct {
	cells [Parts][]int64 // [part][from·k + to]
	near  [2][]int64     // [age][limit·k + class at the other age] those in the window about a limit
	tied  [2][]int64     // [age][limit] those with just as much
}

func newCounts(k int) (c counts) {
	for g := range c.cells {
		c.cells[g] = make([]int64, k*k)
	}
	for age := range c.near {
		c.near[age], c.tied[age] = make([]int64, (k-1)*k), make([]int64, k-1)
	}
	return c
}

// count counts pairs in the classes of their group and of everybody.
func (s *Study) count(worker int, pairs []pair) {
	all := len(s.o.Groups)
	for i := range pairs {
		p := &pairs[i]
		s.counts[worker][p.group].add(&s.edges[p.group], s.o.Quantiles, p)
		s.counts[worker][all].add(&s.edges[all], s.o.Quantiles, p)
	}
}

func (c *counts) add(e *edges, k int, p *pair) {
	var class [2]int
	for age, x := range p.assets {
		class[age], _ = slices.BinarySearch(e[age].limits, x) // the number of limits below
	}
	c.cells[p.part][class[0]*k+class[1]]++
	for age, x := range p.assets {
		at, other := &e[age], class[1-age]
		for limit := max(0, class[age]-1); limit <= min(class[age], k-2); limit++ { // those on either side
			if at.low[limit] < x && x <= at.high[limit] {
				c.near[age][limit*k+other]++
			}
		}
		for limit := class[age]; limit < k-1 && x == at.limits[limit]; limit++ {
			c.tied[age][limit]++
		}
	}
}

// total adds the counts of all workers.
func (s *Study) total(target int) *counts {
	sum := newCounts(s.o.Quantiles)
	add := func(to, from []int64) {
		for i, n := range from {
			to[i] += n
		}
	}
	for _, c := range s.counts {
		for g := range sum.cells {
			add(sum.cells[g], c[target].cells[g])
		}
		for age := range sum.near {
			add(sum.near[age], c[target].near[age])
			add(sum.tied[age], c[target].tied[age])
		}
	}
	return &sum
}
