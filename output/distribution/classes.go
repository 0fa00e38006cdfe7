package distribution

import (
	"math"
	"sync"
)

// classSets form partial sums for all results that want them.
type classSets struct {
	slots  int
	sets   []classSet
	uses   [][]use           // [cell·slots + slot] the sets it counts in
	scales []scale           // [slot]
	copies [][]*accumulators // [copy][set]
	spaces []classSpace      // by worker
}

// use says that a cell counts in a set, with a weight.
type use struct {
	set    int
	unit   uint64  // weight of a row in units
	weight float64 // of the cell
}

// classSet is how the rows of one result are summed.
type classSet struct {
	result int
	scale  float64 // units per weight, where rows have weights
	limits classer
	own    scale
	means  []int   // variables
	others []scale // [place in means]
	tails  []upper // [tail]
}

// upper is where an upper tail begins: rows above its last stretch are in it, those
// below its first are not.
type upper struct{ edge, first, last int }

// logScale is that of logarithms.
var logScale = newScale(0, 1024)

// accumulators are the totals of one set; the lock is for workers that share them.
type accumulators struct {
	mu    sync.Mutex
	own   totals
	means []totals        // [mean]
	logs  [][Groups]total // [tail]
	rows  []int64         // [class], where rows are not units
	open  []openRow
	other []float64 // [open row·means + mean]
}

// openRow is a row in a stretch where a limit is not known yet.
type openRow struct {
	x       float64
	unit    uint64
	stretch uint16
	group   uint8
}

// openBytes is what such a row takes, in a slice that has grown, without the values
// of others.
const openBytes = 36

func newAccumulators(set *classSet, classes int) *accumulators {
	a := &accumulators{own: make(totals, classes*Groups), means: make([]totals, len(set.means)), logs: make([][Groups]total, len(set.tails)), rows: make([]int64, classes)}
	for i := range a.means {
		a.means[i] = make(totals, classes*Groups)
	}
	return a
}

// newClassSets prepares the partial sums of all results that want some; nil if none
// does. where returns the stretches in which the value of a result's edge lies.
func (s *Study) newClassSets(where func(k int, e edge) []stretch) *classSets {
	slots := len(s.held)
	c := &classSets{slots: slots, uses: make([][]use, s.o.Cells*slots), scales: make([]scale, slots), spaces: make([]classSpace, s.o.Workers)}
	for slot := range slots {
		low, high := math.Inf(1), math.Inf(-1)
		for k := slot; k < len(s.results); k += slots {
			if r := &s.results[k]; len(r.edges) > 0 {
				low, high = min(low, r.low), max(high, r.high)
			}
		}
		c.scales[slot] = newScale(low, high)
	}
	for k := range s.results {
		r := &s.results[k]
		if len(r.edges) == 0 {
			continue
		}
		t, slot := &s.o.Targets[k/slots], k%slots
		for _, cell := range t.Cells {
			at := cell.Index*slots + slot
			c.uses[at] = append(c.uses[at], use{set: len(c.sets), unit: r.unit(cell.Weight), weight: cell.Weight})
		}
		c.sets = append(c.sets, s.newClassSet(k, r, t, c.scales[slot], where))
	}
	if len(c.sets) == 0 {
		return nil
	}
	bytes := 0
	for i := range c.sets {
		bytes += (len(c.sets[i].limits.stretches) + 2) * Groups * 24 * (1 + len(c.sets[i].means))
	}
	c.copies = make([][]*accumulators, max(1, min(s.o.Workers, maxCopies, int(s.o.Budget/8)/bytes)))
	for i := range c.copies {
		for j := range c.sets {
			c.copies[i] = append(c.copies[i], newAccumulators(&c.sets[j], len(c.sets[j].limits.stretches)+1))
		}
	}
	return c
}

func (s *Study) newClassSet(k int, r *result, t *Target, own scale, where func(int, edge) []stretch) classSet {
	set := classSet{result: k, scale: r.scale, own: own}
	var stretches []stretch
	for _, e := range r.edges {
		stretches = append(stretches, where(k, e)...)
	}
	wants := t.Wants[s.held[k%len(s.held)]]
	set.limits = newClasser(stretches)
	if wants&Classes != 0 {
		set.means = s.o.Means
		for _, m := range s.o.Means {
			set.others = append(set.others, newScale(s.extremes(t, m)))
		}
	}
	if wants&Tail != 0 {
		for i := range s.o.Tails {
			e := s.o.firstTail() + 3*i
			tail := upper{edge: e}
			at := where(k, r.edges[e])
			tail.first, _ = set.limits.find(at[0].low)
			tail.last, _ = set.limits.find(at[len(at)-1].low)
			set.tails = append(set.tails, tail)
		}
	}
	return set
}

// known is where an edge lies whose value is known.
func known(_ int, e edge) []stretch { return []stretch{{key(e.value), key(e.value)}} }

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

// chunk is how many rows of a cell are summed at a time.
const chunk = 512

// classSpace is what a worker notes of a chunk of rows.
type classSpace struct {
	groups [chunk]uint8
	keys   [chunk]uint64
	counts [chunk]uint64
}

// add sums the rows of a block. groups are the jackknife groups of rows, or nil:
// then they follow from the units.
func (c *classSets) add(worker int, spans []Span, values [][]float64, held []int, unit []int64, groups []uint8, weights []float64) {
	w := &c.spaces[worker]
	copy_ := c.copies[worker%len(c.copies)]
	for _, sp := range spans {
		for at := sp.From; at < sp.To; at += chunk {
			to := min(at+chunk, sp.To)
			for k := range w.groups[:to-at] {
				if groups != nil {
					w.groups[k] = groups[at+k]
				} else {
					w.groups[k] = uint8(unit[at+k] & (Groups - 1))
				}
			}
			for slot, v := range held {
				uses := c.uses[sp.Cell*c.slots+slot]
				if len(uses) == 0 {
					continue
				}
				x := values[v][at:to]
				for k, v := range x {
					w.keys[k] = key(v)
					w.counts[k] = c.scales[slot].count(v)
				}
				for _, u := range uses {
					a := copy_[u.set]
					a.mu.Lock()
					c.sets[u.set].add(a, w, u, x, at, values, weights)
					a.mu.Unlock()
				}
			}
		}
	}
}

// add sums a chunk of rows, the first of which is row at of the block.
func (set *classSet) add(a *accumulators, w *classSpace, u use, x []float64, at int, values [][]float64, weights []float64) {
	unit, one := u.unit, set.scale == 0 && len(set.means) == 0
	tail := math.MaxInt // class above which rows may be in a tail
	for _, t := range set.tails {
		tail = min(tail, t.last)
	}
	weighed := set.scale > 0
	for k, v := range x {
		class, open := int(set.limits.look(w.keys[k])), false
		if class >= noClass {
			if class == noClass {
				continue
			}
			class, open = set.limits.find(w.keys[k])
		}
		if weights != nil {
			if !(weights[at+k] > 0) {
				continue
			}
			unit = units(float64(weights[at+k]*u.weight), set.scale)
		}
		group := int(w.groups[k])
		if class > tail {
			for i, t := range set.tails {
				if class > t.last {
					a.tail(i, v, unit, group)
				}
			}
		}
		switch {
		case open:
			a.keep(set, openRow{x: v, unit: unit, stretch: uint16(class), group: uint8(group)}, at+k, values)
		case one:
			a.own[class*Groups+group].addOne(w.counts[k])
		default:
			if weighed {
				a.rows[class]++
			}
			a.own[class*Groups+group].add(unit, w.counts[k])
			for i, m := range set.means {
				if y := values[m][at+k]; y == y {
					a.means[i][class*Groups+group].add(unit, set.others[i].count(y))
				}
			}
		}
	}
}

// keep notes a row whose class is not known yet.
func (a *accumulators) keep(set *classSet, o openRow, row int, values [][]float64) {
	a.open = append(a.open, o)
	for _, m := range set.means {
		a.other = append(a.other, values[m][row])
	}
}

// tail counts a row of an upper tail. Its values are above 0, or there is no tail.
func (a *accumulators) tail(i int, x float64, unit uint64, group int) {
	if x > 0 {
		a.logs[i][group].add(unit, logScale.count(math.Log(x)))
	}
}

// settle makes partial sums of what was summed, thresholds being known.
func (c *classSets) settle(results []result) error {
	for j := range c.sets {
		var sums []*accumulators
		for i := range c.copies {
			sums = append(sums, c.copies[i][j])
		}
		r := &results[c.sets[j].result]
		c.sets[j].settle(r, sums)
		units := uint64(0)
		for _, a := range sums {
			for i := range a.own {
				units += a.own[i].units
			}
			for i := range a.open {
				units += a.open[i].unit
			}
		}
		if units != uint64(r.total) {
			return ErrPassesDiffer
		}
	}
	return nil
}
