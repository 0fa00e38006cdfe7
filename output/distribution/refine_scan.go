package distribution

// keptBytes is what a collected key takes: with its node, in a pile with room to
// grow, and once more by itself.
const keptBytes = 32

// kept is a collected key.
type kept struct {
	node int32
	key  uint64
}

// pile is a list of kept keys that grows without moving.
type pile struct {
	full [][]kept
	last []kept
	rows int64
}

func (p *pile) push(h kept) {
	if len(p.last) == cap(p.last) {
		if p.last != nil {
			p.full = append(p.full, p.last)
		}
		p.last = make([]kept, 0, 1<<12)
	}
	p.last = append(p.last, h)
	p.rows++
}

// each calls do with all keys in the order in which they came.
func (p *pile) each(do func(h kept)) {
	for _, part := range append(p.full, p.last) {
		for _, h := range part {
			do(h)
		}
	}
}

// add takes the rows of a block in a later pass.
func (r *refinement) add(worker int, rows *Rows, held []int) error {
	for _, sp := range rows.Spans {
		for slot, v := range held {
			r.scan(worker, &r.finders[sp.Cell*r.slots+slot], rows.Values[v][sp.From:sp.To])
		}
	}
	if r.held[worker].rows > r.keepBytes/keptBytes {
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
			if nd.ties {
				in := &r.inside[h.node]
				if at, is := in.tie(h.key); is {
					if !in.settled {
						in.ties[at].rows++
					}
					return
				}
			}
			if nd.counts != nil {
				nd.count(h.key)
			} else if nd.collect {
				r.held[worker].push(h)
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
