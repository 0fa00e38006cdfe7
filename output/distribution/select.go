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
		pool.narrow(w, r.bits, r.digit)
	}
	r.bits += r.digit
	return r.prepare(), nil
}

// gather hands the collected keys to their nodes and checks that every interval
// had the rows that the pass before had promised.
func (r *refinement) gather() error {
	found := make([]uint64, len(r.nodes))
	for i := range r.held {
		r.held[i].each(func(k kept) { found[k.node]++ })
	}
	for _, id := range r.places {
		for _, n := range r.nodes[id].counts {
			found[id] += uint64(n)
		}
		if !r.inside[id].settled {
			for _, t := range r.inside[id].ties {
				found[id] += t.rows
			}
		}
		if found[id] != r.inside[id].expected {
			return ErrPassesDiffer
		}
		if r.nodes[id].collect {
			r.inside[id].keys = make([]uint64, 0, found[id])
		}
	}
	for i := range r.held {
		r.held[i].each(func(k kept) {
			in := &r.inside[k.node]
			in.keys = append(in.keys, k.key)
		})
		r.held[i] = pile{}
	}
	return nil
}

// intervalPool is an interval of a target: its cells taken together, weights in
// units.
type intervalPool struct {
	prefix  uint64
	collect bool
	keys    []weighed // where collected, with ties; ascending, as are
	ties    []weighed // where counted
	counts  []uint64  // by digit, where counted, without ties
	single  bool      // all keys beside ties are one value
	value   uint64
}

// weighed is a key with the weight in units of the rows that have it.
type weighed struct{ key, units uint64 }

func (r *refinement) pool(w *wanted, unit func(weight float64) uint64) intervalPool {
	p := intervalPool{prefix: w.prefix}
	for _, c := range r.targets[w.target].Cells {
		id := r.places[place{int32(c.Index), int32(w.slot), w.prefix}]
		if id == 0 {
			continue
		}
		u := unit(c.Weight)
		nd, in := &r.nodes[id], &r.inside[id]
		p.collect = nd.collect
		for _, t := range in.ties {
			if t.rows > 0 {
				p.ties = append(p.ties, weighed{t.key, t.rows * u})
			}
		}
		for _, k := range in.keys {
			p.keys = append(p.keys, weighed{k, u})
		}
		if p.counts == nil && !nd.collect {
			p.counts = make([]uint64, len(nd.counts))
			p.single = true
		}
		for i, n := range nd.counts {
			p.counts[i] += uint64(n) * u
		}
		if nd.seen {
			if p.value == 0 {
				p.value = nd.first
			}
			p.single = p.single && !nd.mixed && nd.first == p.value
		}
	}
	byKey := func(a, b weighed) int { return cmp.Compare(a.key, b.key) }
	slices.SortFunc(p.ties, byKey)
	if p.collect {
		p.keys = append(p.keys, p.ties...)
		slices.SortFunc(p.keys, byKey)
	}
	return p
}

// narrow finds the wanted rank in its interval, or the shorter interval that
// holds it.
func (p *intervalPool) narrow(w *wanted, bits, digit int) {
	if p.collect {
		w.pick(p.keys)
		return
	}
	total := uint64(0)
	for _, n := range p.counts {
		total += n
	}
	if p.single {
		at, _ := slices.BinarySearchFunc(p.ties, p.value, func(a weighed, k uint64) int { return cmp.Compare(a.key, k) })
		w.pick(slices.Insert(slices.Clone(p.ties), at, weighed{p.value, total}))
		return
	}
	ties := p.ties
	for d, n := range p.counts {
		last := (p.prefix<<digit|uint64(d)+1)<<(64-bits-digit) - 1
		inside, units := 0, n
		for inside < len(ties) && ties[inside].key <= last {
			units += ties[inside].units
			inside++
		}
		if int64(units) >= w.rest || d == len(p.counts)-1 {
			if n == 0 {
				w.pick(ties[:inside])
				return
			}
			w.prefix = p.prefix<<digit | uint64(d)
			return
		}
		w.rest -= int64(units)
		ties = ties[inside:]
	}
}

// pick takes the key at which the weight reaches the rank.
func (w *wanted) pick(keys []weighed) {
	i := 0
	for below := int64(0); i < len(keys)-1 && below+int64(keys[i].units) < w.rest; i++ {
		below += int64(keys[i].units)
	}
	w.done, w.value = true, keys[i].key
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
