package distribution

import (
	"math"
	"slices"
)

// planEdges sets the thresholds whose partial sums a result needs: in the order of
// Options those of Lorenz ordinates, of top shares, of S80/S20, of shortfalls, of
// tails (each with the two by its side) and of classes. All are planned where any is
// wanted.
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
		if add(1 - p/100); r.scale == 0 { // the rounded number of rows, not the least that makes the share
			r.edges[len(r.edges)-1].rank = max(1, r.total-int64(math.Round(p/100*float64(r.total))))
		}
		near := r.besides(p / 100)
		add(1 - p/100 - near)
		add(1 - p/100 + near)
	}
	for i := 1; i < o.Classes; i++ {
		add(float64(i) / float64(o.Classes))
	}
}

// besides is how far the thresholds lie, in shares of the rows, from which the
// density at that of the upper tail p is taken: two standard errors of the share
// above it, or a half of it if that is less.
func (r *result) besides(p float64) float64 {
	return min(p/2, (1-p)/2, 2*math.Sqrt(p*(1-p)/float64(r.rows)))
}

// firstTail and firstClass are places in the order of planEdges.
func (o *Options) firstTail() int {
	return len(o.Lorenz) + len(o.TopShares) + 2 + len(o.Shortfalls)
}
func (o *Options) firstClass() int { return o.firstTail() + 3*len(o.Tails) }

// partial are the sums of one variable in one target between its thresholds.
// Class j holds the values above limits[j−1] and at most limits[j]; the last class
// those above all.
type partial struct {
	limits []float64         // ascending, each once
	of     []int             // [edge] place of its value among limits
	own    classSums         // of the variable itself
	means  []classSums       // [place in Options.Means] of another, over the same rows
	logs   [][Groups]float64 // [tail] Σ w·log x of the rows above its threshold
	rows   []int64           // [class]
}

// classSums are Σ w and Σ w·x of a class and of all classes below.
type classSums []struct {
	of  [Groups]heap
	all heap
}

// heap is a number of rows by their weight, and what they have together.
type heap struct{ mass, sum float64 }

func (h heap) less(other heap) heap { return heap{h.mass - other.mass, h.sum - other.sum} }

// upTo returns the sums up to a class, without a jackknife group; −1: with all.
func (c classSums) upTo(class, without int) heap {
	if class < 0 {
		return heap{}
	}
	if without < 0 {
		return c[class].all
	}
	return c[class].all.less(c[class].of[without])
}

// whole returns the sums of all classes, without a jackknife group.
func (c classSums) whole(without int) heap { return c.upTo(len(c)-1, without) }

// masses are the sizes of the jackknife groups, from the classes above one up to
// another.
func (c classSums) masses(above, to int) []float64 {
	m := make([]float64, Groups)
	for g := range m {
		m[g] = c[to].of[g].mass
		if above >= 0 {
			m[g] -= c[above].of[g].mass
		}
	}
	return m
}

// settle makes the sums of the classes between the thresholds found out of those
// that a pass has formed, and of the rows that it left open.
func (set *classSet) settle(r *result, sums []*accumulators) {
	p := &partial{}
	for _, e := range r.edges {
		p.limits = append(p.limits, e.value)
	}
	slices.Sort(p.limits)
	p.limits = slices.Compact(p.limits)
	for _, e := range r.edges {
		at, _ := slices.BinarySearch(p.limits, e.value)
		p.of = append(p.of, at)
	}
	final := newAccumulators(set, len(p.limits)+1)
	for _, a := range sums {
		final.join(set, p.limits, r.edges, a)
	}
	p.own = final.own.sums(set.own)
	for i := range final.means {
		p.means = append(p.means, final.means[i].sums(set.others[i]))
	}
	for i := range final.logs {
		var logs [Groups]float64
		for g := range Groups {
			logs[g] = final.logs[i][g].sum(logScale)
		}
		p.logs = append(p.logs, logs)
	}
	p.rows = final.rows
	r.partial = p
}

// join adds what a pass has summed in classes of its own to the classes between
// limits. No limit lies between a class of the pass and the stretch above it.
func (a *accumulators) join(set *classSet, limits []float64, edges []edge, from *accumulators) {
	classOf := func(x float64) int { at, _ := slices.BinarySearch(limits, x); return at }
	stretches := set.limits.stretches
	for class, s := range stretches {
		a.take(set, classOf(fromKey(s.low)), from, class)
	}
	a.take(set, len(limits), from, len(stretches))
	for t, tail := range set.tails {
		for g := range Groups {
			a.logs[t][g].join(&from.logs[t][g])
		}
		for class := tail.first + 1; class <= tail.last; class++ { // a tie has a class of its own
			x := fromKey(stretches[class].low)
			for g := range Groups {
				if units := from.own[class*Groups+g].units; units > 0 && x > edges[tail.edge].value {
					a.tail(t, x, units, g)
				}
			}
		}
	}
	for i := range from.open {
		o := &from.open[i]
		class := classOf(o.x)
		a.put(set, o, from.other[i*len(set.means):][:len(set.means)], class)
		for t, tail := range set.tails {
			if at := int(o.stretch); at >= tail.first && at <= tail.last && o.x > edges[tail.edge].value {
				a.tail(t, o.x, o.unit, int(o.group))
			}
		}
	}
}

// take adds a class of other accumulators to one of a.
func (a *accumulators) take(set *classSet, class int, from *accumulators, other int) {
	a.rows[class] += from.rows[other]
	for g := range Groups {
		if set.scale == 0 {
			a.rows[class] += int64(from.own[other*Groups+g].units)
		}
		a.own[class*Groups+g].join(&from.own[other*Groups+g])
		for i := range a.means {
			a.means[i][class*Groups+g].join(&from.means[i][other*Groups+g])
		}
	}
}

// put adds an open row to its class.
func (a *accumulators) put(set *classSet, o *openRow, others []float64, class int) {
	at := class*Groups + int(o.group)
	a.rows[class]++
	a.own[at].add(o.unit, set.own.count(o.x))
	for i, y := range others {
		if y == y {
			a.means[i][at].add(o.unit, set.others[i].count(y))
		}
	}
}

// totals are totals by class and group, flat.
type totals []total

func (t totals) sums(s scale) classSums {
	c := make(classSums, len(t)/Groups)
	var upTo [Groups]total
	for class := range c {
		for g := range Groups {
			upTo[g].join(&t[class*Groups+g])
			h := heap{float64(upTo[g].units), upTo[g].sum(s)}
			c[class].of[g] = h
			c[class].all.mass += h.mass
			c[class].all.sum += h.sum
		}
	}
	return c
}
