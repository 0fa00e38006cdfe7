package distribution

import (
	"cmp"
	"math/bits"
	"slices"
)

// refinement finds order statistics that lie in known bins, pass by pass. A
// wanted rank belongs to an interval, all keys that begin with a prefix; a pass
// either counts the interval's rows by the next bits, which shortens the
// interval, or collects them, which ends the search. Intervals of few rows are
// collected as far as memory allows.
type refinement struct {
	targets []Target
	slots   int
	wanted  []wanted   // ordered by target, slot and rank
	bits    int        // of the prefixes in this pass
	digit   int        // further bits counted in this pass
	nodes   []node     // of all passes; 0 is unused
	inside  []contents // of the same nodes
	places  map[place]int32
	finders []finder   // [cell·slots + slot]
	ties    [][]uint64 // [slot] keys that many rows of the sample share, ascending
	held    []pile     // by worker
	last    bool       // this pass collects all that is left

	openBytes             int64     // what a row takes beside whose class is left open
	keepBytes, countBytes int64     // budgets of a pass
	bins                  [][][]bin // [cell][slot]
}

// wanted is one order statistic: the value of a held variable in a target at which
// the weight in units, cumulated, reaches rank.
type wanted struct {
	target, slot int
	rank         int64
	edge         bool // it is a threshold of partial sums
	prefix       uint64
	rest         int64 // rank within the interval, from 1
	done         bool
	value        uint64 // key, once done
}

// beginRefinement ends the first pass: Gini coefficients from the bins, and the
// bins of all wanted ranks for the next pass.
func (s *Study) beginRefinement() (more bool) {
	slots := len(s.held)
	r := &refinement{
		targets: s.o.Targets, slots: slots, bits: binBits, finders: make([]finder, s.o.Cells*slots), nodes: make([]node, 1), inside: make([]contents, 1),
		ties: s.ties(), held: make([]pile, s.o.Workers), bins: s.hist.merge(s.o.Cells, slots),
		openBytes: int64(openBytes + valueBytes*len(s.o.Means)), keepBytes: s.o.Budget / 2, countBytes: s.o.Budget / 5,
	}
	s.hist = nil
	s.refine = r
	for k := range s.results {
		t, slot := &s.o.Targets[k/slots], k%slots
		result := &s.results[k]
		if t.Wants[s.held[slot]] == 0 || result.rows == 0 {
			continue
		}
		var bins []bin
		for _, c := range t.Cells {
			bins = weigh(bins, r.bins[c.Index][slot], result.unit(c.Weight))
		}
		if len(t.Cells) > 1 {
			bins = addUp(bins)
		}
		result.low, _ = binEnds(bins[0].prefix)
		_, result.high = binEnds(bins[len(bins)-1].prefix)
		if t.Wants[s.held[slot]]&Gini != 0 {
			result.setGini(bins)
		}
		r.want(k, bins, result)
	}
	return r.prepare()
}

// want enters the ranks that a result is made of.
func (r *refinement) want(k int, bins []bin, result *result) {
	var below int64
	i := 0
	for _, rank := range result.ranks() {
		for i < len(bins)-1 && below+int64(bins[i].units) < rank {
			below += int64(bins[i].units)
			i++
		}
		edge := slices.ContainsFunc(result.edges, func(e edge) bool { return e.rank == rank })
		r.wanted = append(r.wanted, wanted{target: k / r.slots, slot: k % r.slots, rank: rank, edge: edge, prefix: bins[i].prefix, rest: rank - below})
	}
}

// prepare makes the nodes of the next pass and reports whether there are any.
func (r *refinement) prepare() bool {
	fresh := map[place]uint64{}  // rows of every interval of a cell
	rows := map[place]interval{} // the same over cells, cell −1
	for i := range r.wanted {
		w := &r.wanted[i]
		if w.done {
			continue
		}
		if r.bits == 64 {
			w.done, w.value = true, w.prefix
			continue
		}
		again := i > 0 && r.wanted[i-1].edge && r.wanted[i-1].target == w.target && r.wanted[i-1].slot == w.slot && r.wanted[i-1].prefix == w.prefix
		for _, c := range r.targets[w.target].Cells {
			p := place{int32(c.Index), int32(w.slot), w.prefix}
			n, known := fresh[p]
			if !known {
				n = r.rowsAt(p)
				fresh[p] = n
			}
			p.cell = -1
			in := rows[p]
			if !known {
				in.rows += int64(n)
			}
			if w.edge && !again {
				in.open += int64(n)
			}
			rows[p] = in
		}
	}
	for i := range r.nodes {
		r.nodes[i].counts, r.inside[i].keys, r.nodes[i].collect = nil, nil, false
	}
	r.bins = nil
	collect, left := r.choose(rows)
	r.place(fresh, collect, left)
	r.last = left == 0
	return len(r.places) > 0
}

// interval is an interval over all cells: its rows, and how many of them partial
// sums must leave open, once for every target with a threshold there.
type interval struct{ rows, open int64 }

// bytes is what it takes to collect the interval.
func (r *refinement) bytes(in interval) int64 { return in.rows*keptBytes + in.open*r.openBytes }

// where returns the range of keys in which a threshold of a result lies, cut at
// ties.
func (r *refinement) where(k int, e edge) []stretch {
	i, found := slices.BinarySearchFunc(r.wanted, wanted{target: k / r.slots, slot: k % r.slots, rank: e.rank}, func(a, b wanted) int {
		return cmp.Or(cmp.Compare(a.target, b.target), cmp.Compare(a.slot, b.slot), cmp.Compare(a.rank, b.rank))
	})
	if !found {
		panic("distribution: a threshold was not looked for")
	}
	w := &r.wanted[i]
	if w.done {
		return known(k, edge{value: fromKey(w.value)})
	}
	low, high := w.prefix<<(64-r.bits), (w.prefix+1)<<(64-r.bits)-1
	var list []stretch
	for _, t := range r.settled(w) {
		if low < t {
			list = append(list, stretch{low, t - 1})
		}
		list = append(list, stretch{t, t})
		if low = t + 1; t == high {
			return list
		}
	}
	return append(list, stretch{low, high})
}

// settled lists the keys in the interval of a wanted rank whose rows are known in
// all cells.
func (r *refinement) settled(w *wanted) (keys []uint64) {
	for _, c := range r.targets[w.target].Cells {
		if id := r.places[place{int32(c.Index), int32(w.slot), w.prefix}]; id != 0 && r.inside[id].settled {
			for _, t := range r.inside[id].ties {
				keys = append(keys, t.key)
			}
		}
	}
	slices.Sort(keys)
	return slices.Compact(keys)
}

// rowsAt returns how many rows of a cell the last pass found in an interval.
func (r *refinement) rowsAt(p place) uint64 {
	if r.bins != nil {
		bins := r.bins[p.cell][p.slot]
		i, found := slices.BinarySearchFunc(bins, p.prefix, func(b bin, prefix uint64) int { return cmp.Compare(b.prefix, prefix) })
		if !found {
			return 0
		}
		return bins[i].n
	}
	parent := r.places[place{p.cell, p.slot, p.prefix >> r.digit}]
	if parent == 0 {
		return 0
	}
	return uint64(r.nodes[parent].counts[p.prefix&(1<<r.digit-1)])
}

// choose returns the intervals to collect, the cheapest first, and the number of
// rows in the others.
func (r *refinement) choose(rows map[place]interval) (collect map[place]bool, left int64) {
	order := make([]place, 0, len(rows))
	for p := range rows {
		order = append(order, p)
	}
	slices.SortFunc(order, func(a, b place) int {
		return cmp.Or(cmp.Compare(r.bytes(rows[a]), r.bytes(rows[b])), cmp.Compare(a.slot, b.slot), cmp.Compare(a.prefix, b.prefix))
	})
	collect = map[place]bool{}
	room := r.keepBytes
	for _, p := range order {
		if room -= r.bytes(rows[p]); room >= 0 {
			collect[p] = true
		} else {
			left += rows[p].rows
		}
	}
	return collect, left
}

// chooseDigit returns how many bits to count: as many as should leave few
// enough rows to collect in the next pass (some four digits of an interval are
// wanted), as far as the memory for counting nodes goes, and at least 4.
func (r *refinement) chooseDigit(counting, rows int64) int {
	if counting == 0 {
		return min(4, 64-r.bits)
	}
	need := bits.Len64(uint64(4*rows/max(1, r.keepBytes/keptBytes/2))) + 1
	room := bits.Len64(uint64(r.countBytes/4/counting)) - 1
	return min(max(4, min(need, room)), 64-r.bits)
}
