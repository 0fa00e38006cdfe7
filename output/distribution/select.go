package distribution

import (
	"cmp"
	"errors"
	"slices"
)

// ErrPassesDiffer says that a later pass was given other rows than the first.
var ErrPassesDiffer = errors.New("distribution: the blocks of a later pass differ from those of the first")

// end takes what the pass found, narrows every wanted rank, and prepares the
// next pass; more is false when all are found.
func (r *refinement) end(results []result) (more bool, err error) {
	if err := r.gather(); err != nil {
		return false, err
	}
	var last *wanted
	var pool intervalPool
	for i := range r.wanted {
		w := &r.wanted[i]
		if w.done {
			continue
		}
		if last == nil || last.target != w.target || last.slot != w.slot || pool.prefix != w.prefix {
			pool = r.pool(w, results[w.target*r.slots+w.slot].unit)
		}
		last = w
		pool.narrow(w, r.digit)
	}
	r.bits += r.digit
	return r.prepare(), nil
}

// gather hands the collected keys to their nodes and checks that every interval
// had the rows that the pass before had promised.
func (r *refinement) gather() error {
	found := make([]uint64, len(r.nodes))
	for _, held := range r.held {
		for _, k := range held {
			found[k.node]++
		}
	}
	for _, id := range r.places {
		for _, n := range r.nodes[id].counts {
			found[id] += uint64(n)
		}
		if found[id] != r.inside[id].expected {
			return ErrPassesDiffer
		}
		if r.nodes[id].collect {
			r.inside[id].keys = make([]uint64, 0, found[id])
		}
	}
	for worker, held := range r.held {
		for _, k := range held {
			in := &r.inside[k.node]
			in.keys = append(in.keys, k.key)
		}
		r.held[worker] = held[:0]
	}
	return nil
}

// intervalPool is an interval of a target: its cells taken together, weights in
// units.
type intervalPool struct {
	prefix uint64
	keys   []weighed // sorted, where collected
	counts []uint64  // by digit, where counted
	single bool      // all keys are one value
	value  uint64
}

// weighed is a collected key with its weight in units.
type weighed struct{ key, units uint64 }

func (r *refinement) pool(w *wanted, unit func(weight float64) uint64) intervalPool {
	p := intervalPool{prefix: w.prefix}
	for _, c := range r.targets[w.target].Cells {
		id := r.places[place{int32(c.Index), int32(w.slot), w.prefix}]
		if id == 0 {
			continue
		}
		u := unit(c.Weight)
		nd := &r.nodes[id]
		if nd.collect {
			for _, k := range r.inside[id].keys {
				p.keys = append(p.keys, weighed{k, u})
			}
			continue
		}
		if p.counts == nil {
			p.counts = make([]uint64, len(nd.counts))
			p.single, p.value = true, nd.first
		}
		p.single = p.single && !nd.mixed && nd.first == p.value
		for i, n := range nd.counts {
			p.counts[i] += uint64(n) * u
		}
	}
	slices.SortStableFunc(p.keys, func(a, b weighed) int { return cmp.Compare(a.key, b.key) })
	return p
}

// narrow finds the wanted rank in its interval, or the shorter interval that
// holds it.
func (p *intervalPool) narrow(w *wanted, digit int) {
	switch {
	case p.keys != nil:
		i := 0
		for below := int64(0); i < len(p.keys)-1 && below+int64(p.keys[i].units) < w.rest; i++ {
			below += int64(p.keys[i].units)
		}
		w.done, w.value = true, p.keys[i].key
	case p.single:
		w.done, w.value = true, p.value
	default:
		d := 0
		for ; d < len(p.counts)-1 && int64(p.counts[d]) < w.rest; d++ {
			w.rest -= int64(p.counts[d])
		}
		w.prefix = w.prefix<<digit | uint64(d)
	}
}

// finish puts the order statistics into the results.
func (r *refinement) finish(results []result) {
	for lo := 0; lo < len(r.wanted); {
		hi := lo
		at := map[int64]float64{}
		k := r.wanted[lo].target*r.slots + r.wanted[lo].slot
		for ; hi < len(r.wanted) && r.wanted[hi].target*r.slots+r.wanted[hi].slot == k; hi++ {
			at[r.wanted[hi].rank] = fromKey(r.wanted[hi].value)
		}
		results[k].set(at)
		lo = hi
	}
}
