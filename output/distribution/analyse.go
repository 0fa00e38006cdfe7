package distribution

import (
	"cmp"
	"math"
	"slices"
	"sync"
	"sync/atomic"

	"cistern/output/stats"
)

// At most sorters samples are sorted at a time, and of those that hold more than
// smallShare of the rows one: fixed, so that the choice of method does not depend
// on the number of workers.
const (
	sorters    = 4
	smallShare = 0.125
)

// result is what is known of one held variable in one target.
type result struct {
	rows      int64   // with a value
	low, high float64 // ends of the bins of the extremes
	total     int64   // their weight in units
	scale     float64 // units per weight; 0: every row is one unit

	levels    []float64  // of the quantiles, in percent
	quantiles []quantile // by level
	gini      stats.Estimate
	giniBound float64 // on the error of gini.Value from binning; 0 where exact
	squares   float64 // Σ units²
	edges     []edge  // thresholds of partial sums, in the order of Options
	partial   *partial
	ties      []tie // keys that many rows of the sample share
}

// edge is the value at which the cumulated weight reaches rank, in units.
type edge struct {
	rank  int64
	value float64
}

// unit is the weight of a row in a cell of the given weight, in whole units.
func (r *result) unit(weight float64) uint64 {
	if r.scale == 0 {
		return 1
	}
	return units(weight, r.scale)
}

// size counts the rows of a result and sets the unit of its weights: the whole
// weighs about 2^61 units, more than a float tells apart.
func (s *Study) size(k int) {
	t, v := &s.o.Targets[k/len(s.held)], s.held[k%len(s.held)]
	r := &s.results[k]
	mass := 0.0
	for _, c := range t.Cells {
		m := &s.moments[c.Index]
		if n := m.valuesOf(v); n > 0 {
			r.rows += n
			for g := range Groups {
				mass += float64(c.Weight * m.massOf(v, g))
			}
		}
	}
	if r.rows == 0 {
		return
	}
	if s.o.Weighted || t.weighted() {
		r.scale = math.Ldexp(1, 61) / mass
	}
	if s.o.Weighted {
		return // units are counted when the rows are sorted
	}
	for _, c := range t.Cells {
		n, u := s.moments[c.Index].valuesOf(v), int64(r.unit(c.Weight))
		r.total += n * u
		r.squares += float64(n) * float64(u) * float64(u)
	}
}

// analyseStore describes what the store holds, result by result. If the store is
// whole, quantiles are final; otherwise it is a sample that yields the errors of
// Gini coefficients and the design effects, and the quantiles remain to be found.
func (s *Study) analyseStore(whole bool) {
	index := s.store.index(s.o.Cells)
	var next atomic.Int64
	var wg sync.WaitGroup
	var large struct {
		sync.Mutex
		sampler
	}
	for range min(s.o.Workers, sorters) {
		wg.Go(func() {
			var so sampler
			for {
				k := int(next.Add(1)) - 1
				if k >= len(s.results) {
					return
				}
				t := &s.o.Targets[k/len(s.held)]
				if float64(len(t.Cells)) > smallShare*float64(s.o.Cells) {
					large.Lock()
					s.analyse(&large.sampler, index, k, whole)
					large.Unlock()
					continue
				}
				s.analyse(&so, index, k, whole)
			}
		})
	}
	wg.Wait()
}

// analyse describes result k.
func (s *Study) analyse(so *sampler, index [][]piece, k int, whole bool) {
	r := &s.results[k]
	nan := math.NaN()
	r.gini = stats.Estimate{Value: nan, StandardError: nan, Lower: nan, Upper: nan}
	t, slot := &s.o.Targets[k/len(s.held)], k%len(s.held)
	wants := t.Wants[s.held[slot]]
	if wants == 0 || r.rows == 0 {
		return
	}
	so.load(index, t, slot, r.scale)
	if s.o.Weighted {
		for _, u := range so.units {
			r.total += int64(u)
		}
	}
	switch {
	case wants&Percentiles != 0:
		r.levels = s.o.Percentiles
	case wants&Median != 0:
		r.levels = []float64{50}
	}
	for _, p := range r.levels {
		effect := 1.0
		if !t.Independent {
			effect = so.designEffect(p / 100)
		}
		r.quantiles = append(r.quantiles, plan(r.rows, r.total, r.scale > 0, p/100, effect))
	}
	if wants&Gini != 0 {
		value, se, groups := so.gini()
		r.gini = stats.JackknifeInterval(value, se*math.Sqrt(so.whole.rows/float64(r.rows)), groups, confidence)
	}
	if wants&sums != 0 {
		r.planEdges(&s.o)
	}
	if !whole {
		r.ties = so.ties()
	}
	if whole {
		r.low, _ = binEnds(so.keys[0] >> binShift)
		_, r.high = binEnds(so.keys[len(so.keys)-1] >> binShift)
		at := map[int64]float64{}
		w := so.walk()
		for _, rank := range r.ranks() {
			at[rank] = w.at(rank)
		}
		r.set(at)
	}
}

// setGini puts the coefficient of binned values in place of the sample's.
func (r *result) setGini(bins []bin) {
	value, bound := giniOfBins(bins, float64(r.rows), r.squares)
	half := (r.gini.Upper - r.gini.Lower) / 2
	r.gini = stats.Estimate{Value: value, StandardError: r.gini.StandardError, Lower: value - half, Upper: value + half}
	r.giniBound = bound
}

// ranks lists all positions that the result needs, ascending, each once.
func (r *result) ranks() []int64 {
	var ranks []int64
	for i := range r.quantiles {
		ranks = append(ranks, r.quantiles[i].ranks(r.total)...)
	}
	for _, e := range r.edges {
		ranks = append(ranks, e.rank)
	}
	slices.Sort(ranks)
	return slices.Compact(ranks)
}

// set fills in the values found at the positions.
func (r *result) set(at map[int64]float64) {
	for i := range r.quantiles {
		r.quantiles[i].set(r.total, func(rank int64) float64 { return at[rank] })
	}
	for i := range r.edges {
		r.edges[i].value = at[r.edges[i].rank]
	}
}

// A key that at least leastTies rows of a sample share is a tie; mostTies of them
// are minded.
const (
	leastTies = 64
	mostTies  = 512
)

// ties lists the keys that many rows share.
func (s *sample) ties() (ties []tie) {
	for from := 0; from < len(s.keys); {
		to := from
		for to < len(s.keys) && s.keys[to] == s.keys[from] {
			to++
		}
		if to-from >= leastTies {
			ties = append(ties, tie{s.keys[from], uint64(to - from)})
		}
		from = to
	}
	return ties
}

// ties lists the ties of every slot, ascending.
func (s *Study) ties() [][]uint64 {
	lists := make([][]uint64, len(s.held))
	for slot := range lists {
		rows := map[uint64]uint64{}
		for k := slot; k < len(s.results); k += len(s.held) {
			for _, t := range s.results[k].ties {
				rows[t.key] = max(rows[t.key], t.rows)
			}
			s.results[k].ties = nil
		}
		var all []tie
		for k, n := range rows {
			all = append(all, tie{k, n})
		}
		slices.SortFunc(all, func(a, b tie) int { return cmp.Or(cmp.Compare(b.rows, a.rows), cmp.Compare(a.key, b.key)) })
		for _, t := range all[:min(len(all), mostTies)] {
			lists[slot] = append(lists[slot], t.key)
		}
		slices.Sort(lists[slot])
	}
	return lists
}
