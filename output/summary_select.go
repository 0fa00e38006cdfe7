package output

import (
	"errors"
	"slices"
)

// errPassesDiffer says that a later pass was given other rows than the first.
var errPassesDiffer = errors.New("output: summary: the blocks of a later pass differ from those of the first")

// end takes what the pass found, narrows every wanted rank, and prepares the
// next pass; more is false when all are found.
func (r *refinement) end() (more bool, err error) {
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
		if last == nil || last.target != w.target || last.variable != w.variable || pool.prefix != w.prefix {
			pool = r.pool(w)
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
			return errPassesDiffer
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

// intervalPool is an interval of a target: its cells taken together.
type intervalPool struct {
	prefix uint64
	keys   []uint64 // sorted, where collected
	counts []uint64 // by digit, where counted
	single bool     // all keys are one value
	value  uint64
}

func (r *refinement) pool(w *wanted) intervalPool {
	p := intervalPool{prefix: w.prefix}
	for _, c := range r.targets[w.target].cells {
		id := r.places[place{int32(c), int32(w.variable), w.prefix}]
		if id == 0 {
			continue
		}
		nd := &r.nodes[id]
		if nd.collect {
			p.keys = append(p.keys, r.inside[id].keys...)
			continue
		}
		if p.counts == nil {
			p.counts = make([]uint64, len(nd.counts))
			p.single, p.value = true, nd.first
		}
		p.single = p.single && !nd.mixed && nd.first == p.value
		for i, n := range nd.counts {
			p.counts[i] += uint64(n)
		}
	}
	slices.Sort(p.keys)
	return p
}

// narrow finds the wanted rank in its interval, or the shorter interval that
// holds it.
func (p *intervalPool) narrow(w *wanted, digit int) {
	switch {
	case p.keys != nil:
		w.done, w.value = true, p.keys[w.rest-1]
	case p.single:
		w.done, w.value = true, p.value
	default:
		d := 0
		for ; int64(p.counts[d]) < w.rest; d++ {
			w.rest -= int64(p.counts[d])
		}
		w.prefix = w.prefix<<digit | uint64(d)
	}
}

// finish puts the order statistics into the results.
func (r *refinement) finish(results []valueResult, rows func(target int) int64) {
	for lo := 0; lo < len(r.wanted); {
		hi := lo
		at := map[int64]float64{}
		k := r.wanted[lo].target*variables + r.wanted[lo].variable
		for ; hi < len(r.wanted) && r.wanted[hi].target*variables+r.wanted[hi].variable == k; hi++ {
			at[r.wanted[hi].rank] = fromKey(r.wanted[hi].value)
		}
		n := rows(k / variables)
		for i := range results[k].quantiles {
			results[k].quantiles[i].set(n, func(rank int64) float64 { return at[rank] })
		}
		lo = hi
	}
}
