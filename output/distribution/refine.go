package distribution

import (
	"cmp"
	"math/bits"
	"slices"
	"sync"
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
	finders []finder // [cell·slots + slot]
	held    [][]kept // by worker

	keepRows, countBytes int64     // budgets of a pass
	bins                 [][][]bin // [cell][slot]
}

// wanted is one order statistic: the value of a held variable in a target at which
// the weight in units, cumulated, reaches rank.
type wanted struct {
	target, slot int
	rank         int64
	prefix       uint64
	rest         int64 // rank within the interval, from 1
	done         bool
	value        uint64 // key, once done
}

// place is an interval of one cell.
type place struct {
	cell, slot int32
	prefix     uint64
}

// node is an interval of one cell: to be counted or collected in this pass, or
// the way to shorter intervals. It fills one cache line.
type node struct {
	counts      []uint32 // by digit, where counted
	children    []int32  // nodes by digit, 0 none; nil: leads nowhere
	first       uint64   // key of the first row counted
	shift       uint8    // of the digit that is counted or leads on
	collect     bool
	seen, mixed bool // rows were counted; they have different keys
}

// contents is what a node must hold and holds.
type contents struct {
	expected uint64   // rows known to be there
	keys     []uint64 // collected
}

// finder leads from a key to the first node of a cell and variable. Its lock
// guards all nodes below.
type finder struct {
	mu    sync.Mutex
	index *[1 << pageBits]uint16
	pages [][1 << subBits]int32
}

// keptBytes is what a collected key takes at most: with its node, in a slice
// that has grown, and once more by itself while it is sorted.
const keptBytes = 48

// kept is a collected key.
type kept struct {
	node int32
	key  uint64
}

// beginRefinement ends the first pass: Gini coefficients from the bins, and the
// bins of all wanted ranks for the next pass.
func (s *Study) beginRefinement() (more bool, err error) {
	slots := len(s.held)
	r := &refinement{
		targets: s.o.Targets, slots: slots, bits: binBits, finders: make([]finder, s.o.Cells*slots), nodes: make([]node, 1), inside: make([]contents, 1),
		held: make([][]kept, s.o.Workers), bins: s.hist.merge(s.o.Cells, slots),
		keepRows: s.o.Budget / 4 / keptBytes, countBytes: s.o.Budget / 10,
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
	return r.prepare(), nil
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
		r.wanted = append(r.wanted, wanted{target: k / r.slots, slot: k % r.slots, rank: rank, prefix: bins[i].prefix, rest: rank - below})
	}
}

// prepare makes the nodes of the next pass and reports whether there are any.
func (r *refinement) prepare() bool {
	fresh := map[place]uint64{} // rows of every interval of a cell
	rows := map[place]uint64{}  // the same over cells, cell −1
	for i := range r.wanted {
		w := &r.wanted[i]
		if w.done {
			continue
		}
		if r.bits == 64 {
			w.done, w.value = true, w.prefix
			continue
		}
		for _, c := range r.targets[w.target].Cells {
			p := place{int32(c.Index), int32(w.slot), w.prefix}
			if _, known := fresh[p]; known {
				continue
			}
			n := r.rowsAt(p)
			fresh[p] = n
			p.cell = -1
			rows[p] += n
		}
	}
	for i := range r.nodes {
		r.nodes[i].counts, r.inside[i].keys, r.nodes[i].collect = nil, nil, false
	}
	r.bins = nil
	collect, left := r.choose(rows)
	r.place(fresh, collect, left)
	return len(r.places) > 0
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

// choose returns the intervals to collect, those of fewest rows first, and the
// number of rows in the others.
func (r *refinement) choose(rows map[place]uint64) (collect map[place]bool, left int64) {
	order := make([]place, 0, len(rows))
	for p := range rows {
		order = append(order, p)
	}
	slices.SortFunc(order, func(a, b place) int {
		return cmp.Or(cmp.Compare(rows[a], rows[b]), cmp.Compare(a.slot, b.slot), cmp.Compare(a.prefix, b.prefix))
	})
	collect = map[place]bool{}
	room := r.keepRows
	for _, p := range order {
		if room -= int64(rows[p]); room >= 0 {
			collect[p] = true
		} else {
			left += int64(rows[p])
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
	need := bits.Len64(uint64(4*rows/max(1, r.keepRows))) + 1
	room := bits.Len64(uint64(r.countBytes/4/counting)) - 1
	return min(max(4, min(need, room)), 64-r.bits)
}

// place makes a node for every interval of a cell and hangs it where add will
// find it.
func (r *refinement) place(fresh map[place]uint64, collect map[place]bool, left int64) {
	order := make([]place, 0, len(fresh))
	counting := int64(0)
	for p, n := range fresh {
		if n == 0 {
			continue
		}
		order = append(order, p)
		if !collect[place{-1, p.slot, p.prefix}] {
			counting++
		}
	}
	slices.SortFunc(order, func(a, b place) int {
		return cmp.Or(cmp.Compare(a.cell, b.cell), cmp.Compare(a.slot, b.slot), cmp.Compare(a.prefix, b.prefix))
	})
	parents, parentDigit := r.places, r.digit
	r.digit = r.chooseDigit(counting, left)
	r.places = make(map[place]int32, len(order))
	for _, p := range order {
		id := int32(len(r.nodes))
		nd := node{collect: collect[place{-1, p.slot, p.prefix}], shift: uint8(64 - r.bits - r.digit)}
		if !nd.collect {
			nd.counts = make([]uint32, 1<<r.digit)
		}
		r.nodes = append(r.nodes, nd)
		r.inside = append(r.inside, contents{expected: fresh[p]})
		r.places[p] = id
		if parents == nil {
			r.finders[int(p.cell)*r.slots+int(p.slot)].hang(p.prefix, id)
			continue
		}
		up := &r.nodes[parents[place{p.cell, p.slot, p.prefix >> parentDigit}]]
		if up.children == nil {
			up.children = make([]int32, 1<<parentDigit)
		}
		up.children[p.prefix&(1<<parentDigit-1)] = id
	}
}

func (f *finder) hang(prefix uint64, id int32) {
	if f.index == nil {
		f.index = new([1 << pageBits]uint16)
		f.pages = make([][1 << subBits]int32, 1) // a page without nodes for all others
	}
	page := prefix >> subBits
	if f.index[page] == 0 {
		f.index[page] = uint16(len(f.pages))
		f.pages = append(f.pages, [1 << subBits]int32{})
	}
	f.pages[f.index[page]][prefix&(1<<subBits-1)] = id
}

// add takes the rows of a block in a later pass.
func (r *refinement) add(worker int, rows *Rows, held []int) error {
	for _, sp := range rows.Spans {
		for slot, v := range held {
			r.scan(worker, &r.finders[sp.Cell*r.slots+slot], rows.Values[v][sp.From:sp.To])
		}
	}
	if int64(len(r.held[worker])) > r.keepRows {
		return ErrPassesDiffer
	}
	return nil
}

// scan takes a column of one cell: first what falls into a bin that matters, a
// few hundred rows at a time and without jumps, then down the nodes.
func (r *refinement) scan(worker int, f *finder, column []float64) {
	if f.index == nil {
		return
	}
	f.mu.Lock()
	defer f.mu.Unlock()
	var hits [512]kept
	for len(column) > 0 {
		part := column[:min(len(column), len(hits))]
		column = column[len(part):]
		n := 0
		for _, x := range part {
			k := key(x)
			id := f.pages[f.index[k>>(64-pageBits)]][k>>binShift&(1<<subBits-1)]
			hits[n&(len(hits)-1)] = kept{id, k}
			n += int(uint32(-id) >> 31) // 1 where id > 0
		}
		for _, h := range hits[:n] {
			r.descend(worker, h)
		}
	}
}

// descend counts or collects a row where its key ends.
func (r *refinement) descend(worker int, h kept) {
	for h.node != 0 {
		nd := &r.nodes[h.node]
		if nd.children == nil {
			if nd.counts != nil {
				nd.count(h.key)
			} else if nd.collect {
				r.held[worker] = append(r.held[worker], h)
			}
			return
		}
		h.node = nd.children[h.key>>nd.shift&uint64(len(nd.children)-1)]
	}
}

func (nd *node) count(k uint64) {
	nd.counts[k>>nd.shift&uint64(len(nd.counts)-1)]++
	if nd.mixed {
		return
	}
	if !nd.seen {
		nd.seen, nd.first = true, k
	}
	nd.mixed = nd.first != k
}
