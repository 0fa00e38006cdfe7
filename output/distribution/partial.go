package distribution

import (
	"math"
	"math/bits"
	"slices"
	"sync"
)

// planEdges sets the thresholds whose partial sums a result needs: in the order of
// Options those of Lorenz ordinates, of top shares, of S80/S20, of shortfalls, of
// tails and of classes. All are planned where any is wanted.
func (r *result) planEdges(o *Options) {
	add := func(p float64) { r.edges = append(r.edges, edge{rank: position(r.total, p)}) }
	for _, p := range o.Lorenz {
		add(p / 100)
	}
	for _, p := range o.TopShares {
		add(1 - p/100)
	}
	add(0.2)
	add(0.8)
	for _, p := range o.Shortfalls {
		add(p / 100)
	}
	for _, p := range o.Tails {
		add(1 - p/100)
	}
	for i := 1; i < o.Classes; i++ {
		add(float64(i) / float64(o.Classes))
	}
}

// partial are the sums of one variable in one target between its thresholds.
// Class j holds the values above limits[j−1] and at most limits[j]; the last class
// those above all.
type partial struct {
	limits []float64         // ascending, each once
	of     []int             // [edge] place of its value among limits
	own    classSums         // of the variable itself
	means  []classSums       // [place in Options.Means] of another, over the same rows
	logs   [][Groups]float64 // [tail] Σ w·max(0, log x − log u)
}

// classSums are Σ w and Σ w·x by class and jackknife group.
type classSums struct{ mass, sum [][Groups]float64 }

// classSets form partial sums for all results that want them.
type classSets struct {
	o      *Options
	sets   []classSet
	uses   [][]use          // [cell] the sets it counts in
	copies [][]accumulators // [copy][set]
}

// use says that a cell counts in a set, with a weight.
type use struct {
	set    int
	unit   uint64  // weight of a row in units
	weight float64 // of the cell
}

// classSet is how the rows of one result are summed.
type classSet struct {
	result   int
	variable int
	scale    float64 // units per weight, where rows have weights
	limits   []float64
	of       []int
	ranges   []span  // [class]
	means    []int   // variables
	others   []span  // [place in means]
	tails    []upper // [tail]
}

// span is a range of values that sums are formed in: a value counts as its distance
// from low in parts of 2^-52 of the width.
type span struct{ low, width, perUnit float64 }

// parts of the width of a span.
const parts = 1 << 52

func newSpan(low, high float64) span {
	s := span{low: low, width: high - low}
	if s.width > 0 {
		s.perUnit = parts / s.width
	}
	return s
}

// count is the place of x in the span.
func (s span) count(x float64) uint64 { return uint64((x - s.low) * s.perUnit) }

// sum undoes count for rows of the given mass.
func (s span) sum(mass float64, a *total) float64 {
	return mass*s.low + s.width*a.parts()/parts
}

// upper is a threshold of the upper tail.
type upper struct {
	u    float64
	logs span
}

// total is a sum of counts times units: whole numbers of 128 bits, so that the
// order of rows does not matter.
type total struct{ mass, high, low uint64 }

func (t *total) add(unit, count uint64) {
	t.mass += unit
	h, l := bits.Mul64(unit, count)
	var carry uint64
	t.low, carry = bits.Add64(t.low, l, 0)
	t.high, _ = bits.Add64(t.high, h, carry)
}

func (t *total) join(u *total) {
	var carry uint64
	t.mass += u.mass
	t.low, carry = bits.Add64(t.low, u.low, 0)
	t.high, _ = bits.Add64(t.high, u.high, carry)
}

// parts returns the sum of counts, weighed.
func (t *total) parts() float64 { return math.Ldexp(float64(t.high), 64) + float64(t.low) }

// accumulators are the totals of one set; the lock is for workers that share them.
type accumulators struct {
	mu    sync.Mutex
	own   [][Groups]total   // [class]
	means [][][Groups]total // [mean][class]
	logs  [][Groups]total   // [tail]
}

// newClassSets prepares the partial sums of all results that want some; nil if
// none does.
func (s *Study) newClassSets() *classSets {
	c := &classSets{o: &s.o, uses: make([][]use, s.o.Cells)}
	for k := range s.results {
		r := &s.results[k]
		if r.rows == 0 || len(r.edges) == 0 {
			continue
		}
		t := &s.o.Targets[k/len(s.held)]
		for _, cell := range t.Cells {
			c.uses[cell.Index] = append(c.uses[cell.Index], use{set: len(c.sets), unit: r.unit(cell.Weight), weight: cell.Weight})
		}
		c.sets = append(c.sets, s.newClassSet(k, r, t))
	}
	if len(c.sets) == 0 {
		return nil
	}
	c.copies = make([][]accumulators, min(s.o.Workers, maxCopies))
	for i := range c.copies {
		c.copies[i] = make([]accumulators, len(c.sets))
		for j := range c.sets {
			c.copies[i][j].grow(&c.sets[j])
		}
	}
	return c
}

func (a *accumulators) grow(s *classSet) {
	classes := len(s.ranges)
	a.own = make([][Groups]total, classes)
	a.means = make([][][Groups]total, len(s.means))
	for i := range a.means {
		a.means[i] = make([][Groups]total, classes)
	}
	a.logs = make([][Groups]total, len(s.tails))
}

func (s *Study) newClassSet(k int, r *result, t *Target) classSet {
	v := s.held[k%len(s.held)]
	set := classSet{result: k, variable: v, scale: r.scale, of: make([]int, len(r.edges))}
	for _, e := range r.edges {
		set.limits = append(set.limits, e.value)
	}
	slices.Sort(set.limits)
	set.limits = slices.Compact(set.limits)
	for i, e := range r.edges {
		set.of[i], _ = slices.BinarySearch(set.limits, e.value)
	}
	low, high := r.low, r.high
	from := low
	for _, l := range set.limits {
		set.ranges = append(set.ranges, newSpan(from, l))
		from = l
	}
	set.ranges = append(set.ranges, newSpan(from, max(from, high)))
	wants := t.Wants[v]
	if wants&Classes != 0 {
		set.means = s.o.Means
		for _, m := range s.o.Means {
			set.others = append(set.others, newSpan(s.extremes(t, m)))
		}
	}
	if wants&Tail != 0 {
		first := len(s.o.Lorenz) + len(s.o.TopShares) + 2 + len(s.o.Shortfalls)
		for i := range s.o.Tails {
			u := r.edges[first+i].value
			top := upper{u: math.Inf(1)} // no tail: nothing lies above it
			if u > 0 {
				top = upper{u: u, logs: newSpan(0, math.Log(max(high, u)/u))}
			}
			set.tails = append(set.tails, top)
		}
	}
	return set
}

// extremes returns the lowest and highest value of one of Options.Means in a
// target.
func (s *Study) extremes(t *Target, m int) (low, high float64) {
	low, high = math.Inf(1), math.Inf(-1)
	for _, c := range t.Cells {
		if cell := &s.moments[c.Index]; cell.vars != nil {
			low, high = min(low, cell.vars[m].low), max(high, cell.vars[m].high)
		}
	}
	if low > high {
		return 0, 0
	}
	return low, high
}

// add sums the rows of a block.
func (c *classSets) add(worker int, r *Rows) {
	var buffer [512]uint8
	for _, sp := range r.Spans {
		for at := sp.From; at < sp.To; at += len(buffer) {
			to := min(at+len(buffer), sp.To)
			tags := buffer[:to-at]
			for k, u := range r.Unit[at:to] {
				tags[k] = uint8(u & (Groups - 1))
			}
			c.addRows(worker, sp.Cell, at, to, r.Values, tags, nil)
		}
	}
}

// addBlock sums the rows of a block that was held.
func (c *classSets) addBlock(worker int, spans []Span, values [][]float64, tags []uint8, weights []float64) {
	for _, sp := range spans {
		var w []float64
		if weights != nil {
			w = weights[sp.From:sp.To]
		}
		c.addRows(worker, sp.Cell, sp.From, sp.To, values, tags[sp.From:sp.To], w)
	}
}

func (c *classSets) addRows(worker, cell, from, to int, values [][]float64, tags []uint8, weights []float64) {
	copy := c.copies[worker%len(c.copies)]
	for _, u := range c.uses[cell] {
		set, a := &c.sets[u.set], &copy[u.set]
		a.mu.Lock()
		set.add(a, u, from, to, values, tags, weights)
		a.mu.Unlock()
	}
}

func (set *classSet) add(a *accumulators, u use, from, to int, values [][]float64, tags []uint8, weights []float64) {
	x := values[set.variable][from:to][:len(tags)]
	unit := u.unit
	for k, g := range tags {
		v := x[k]
		if v != v {
			continue
		}
		if weights != nil {
			unit = units(float64(weights[k]*u.weight), set.scale)
		}
		class := set.class(v)
		g &= Groups - 1
		a.own[class][g].add(unit, set.ranges[class].count(v))
		for i, m := range set.means {
			if y := values[m][from+k]; y == y {
				a.means[i][class][g].add(unit, set.others[i].count(y))
			}
		}
		for i := range set.tails {
			if t := &set.tails[i]; v > t.u {
				a.logs[i][g].add(unit, t.logs.count(math.Log(v/t.u)))
			}
		}
	}
}

// class returns the class of a value: the number of limits below it.
func (set *classSet) class(v float64) int {
	lo, n := 0, len(set.limits)
	for n > 0 { // halves without a jump on the comparison
		half := n >> 1
		mid := lo + half
		step := 0
		if set.limits[mid] < v {
			step = half + 1
		}
		lo += step
		if step > 0 {
			n -= half + 1
		} else {
			n = half
		}
	}
	return lo
}

// finish puts the sums into the results.
func (c *classSets) finish(results []result) {
	for j := range c.sets {
		set := &c.sets[j]
		sum := &c.copies[0][j]
		for _, more := range c.copies[1:] {
			sum.join(&more[j])
		}
		p := &partial{limits: set.limits, of: set.of, own: newClassSums(len(set.ranges)), logs: make([][Groups]float64, len(set.tails))}
		for class := range set.ranges {
			for g := range Groups {
				p.own.put(class, g, set.ranges[class], &sum.own[class][g])
			}
		}
		for i := range set.means {
			m := newClassSums(len(set.ranges))
			for class := range set.ranges {
				for g := range Groups {
					m.put(class, g, set.others[i], &sum.means[i][class][g])
				}
			}
			p.means = append(p.means, m)
		}
		for i := range set.tails {
			for g := range Groups {
				p.logs[i][g] = set.tails[i].logs.sum(float64(sum.logs[i][g].mass), &sum.logs[i][g])
			}
		}
		results[set.result].partial = p
	}
}

func (a *accumulators) join(b *accumulators) {
	for class := range a.own {
		for g := range Groups {
			a.own[class][g].join(&b.own[class][g])
			for i := range a.means {
				a.means[i][class][g].join(&b.means[i][class][g])
			}
		}
	}
	for i := range a.logs {
		for g := range Groups {
			a.logs[i][g].join(&b.logs[i][g])
		}
	}
}

func newClassSums(classes int) classSums {
	return classSums{make([][Groups]float64, classes), make([][Groups]float64, classes)}
}

func (c *classSums) put(class, g int, s span, t *total) {
	c.mass[class][g] = float64(t.mass)
	c.sum[class][g] = s.sum(float64(t.mass), t)
}
