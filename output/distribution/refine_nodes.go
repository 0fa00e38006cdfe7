package distribution

import (
	"cmp"
	"slices"
	"sync"
)

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
	ties        bool // some keys are counted, or known, by themselves
}

// contents is what a node must hold and holds.
type contents struct {
	expected uint64   // rows known to be there, without those of settled ties
	keys     []uint64 // collected
	ties     []tie    // ascending
	settled  bool     // the ties were counted in an earlier pass: their rows are passed over
}

// tie is a key that many rows share. It is counted by itself, so that an interval
// need not shrink to the one key before few other rows are left in it. Which keys
// are tried follows from the sample, whether there are any decides on speed alone.
type tie struct{ key, rows uint64 }

func (c *contents) tie(k uint64) (place int, is bool) {
	return slices.BinarySearchFunc(c.ties, k, func(t tie, k uint64) int { return cmp.Compare(t.key, k) })
}

// tiesOf returns the ties of a place: fresh ones where its rows will be counted for
// the first time, those counted by the node above it later.
func (r *refinement) tiesOf(p place, parent int32, first bool) (ties []tie) {
	low, high := p.prefix<<(64-r.bits), (p.prefix+1)<<(64-r.bits)-1
	if first {
		at, _ := slices.BinarySearch(r.ties[p.slot], low)
		for ; at < len(r.ties[p.slot]) && r.ties[p.slot][at] <= high; at++ {
			ties = append(ties, tie{key: r.ties[p.slot][at]})
		}
		return ties
	}
	for _, t := range r.inside[parent].ties {
		if t.key >= low && t.key <= high && t.rows > 0 {
			ties = append(ties, t)
		}
	}
	return ties
}

// finder leads from a key to the first node of a cell and variable. Its lock
// guards all nodes below.
type finder struct {
	mu    sync.Mutex
	index *[1 << pageBits]uint16
	pages [][1 << subBits]int32
}

// place makes a node for every interval of a cell and hangs it where add will
// find it.
func (r *refinement) place(fresh map[place]uint64, collect map[place]bool, left int64) {
	order := make([]place, 0, len(fresh))
	counting := int64(0)
	for p, n := range fresh {
		order = append(order, p)
		if n > 0 && !collect[place{-1, p.slot, p.prefix}] {
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
		nd := node{collect: collect[place{-1, p.slot, p.prefix}], shift: uint8(64 - r.bits - r.digit)}
		in := contents{expected: fresh[p], settled: parents != nil}
		parent := int32(0)
		if parents != nil {
			parent = parents[place{p.cell, p.slot, p.prefix >> parentDigit}]
		}
		if parent != 0 || parents == nil && !nd.collect {
			in.ties = r.tiesOf(p, parent, parents == nil)
			nd.ties = len(in.ties) > 0
		}
		if in.expected == 0 && !(in.settled && nd.ties) {
			continue
		}
		id := int32(len(r.nodes))
		if !nd.collect {
			nd.counts = make([]uint32, 1<<r.digit)
		}
		r.nodes = append(r.nodes, nd)
		r.inside = append(r.inside, in)
		r.places[p] = id
		switch {
		case in.expected == 0: // nothing to look for
		case parents == nil:
			r.finders[int(p.cell)*r.slots+int(p.slot)].hang(p.prefix, id)
		default:
			up := &r.nodes[parent]
			if up.children == nil {
				up.children = make([]int32, 1<<parentDigit)
			}
			up.children[p.prefix&(1<<parentDigit-1)] = id
		}
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
