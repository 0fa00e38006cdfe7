package distribution

import (
	"slices"
	"sync"
)

// The first pass counts a value in the bin of the leading bits of its key:
// sign and exponent choose a page, the next bits a bin of it. Within a bin the
// key is linear in the value, so the sum of the values follows from the sum of
// the bits behind, of which 32 are kept: whole numbers, added in any order.
const (
	pageBits   = 12
	subBits    = 6
	binBits    = pageBits + subBits
	binShift   = 64 - binBits
	offsetBits = 32
)

// maxCopies is the most copies of histograms or partial sums that workers have
// between them; memory may allow fewer.
const maxCopies = 8

// setBytes is about what a set of bins takes whose values lie within a factor of a
// million.
const setBytes = 8<<10 + 20<<subBits*16

type binPage [1 << subBits]struct{ n, offset uint64 }

// binSet counts one variable in one cell.
type binSet struct {
	index *[1 << pageBits]uint16 // place of a page plus 1; 0: none
	pages []binPage
}

func (b *binSet) add(column []float64, optional bool) {
	if b.index == nil {
		b.index = new([1 << pageBits]uint16)
	}
	for _, x := range column {
		if optional && x != x {
			continue // no value
		}
		k := key(x)
		p := b.index[k>>(64-pageBits)]
		if p == 0 {
			b.pages = append(b.pages, binPage{})
			p = uint16(len(b.pages))
			b.index[k>>(64-pageBits)] = p
		}
		bin := &b.pages[p-1][k>>binShift&(1<<subBits-1)]
		bin.n++
		bin.offset += k >> (binShift - offsetBits) & (1<<offsetBits - 1)
	}
}

// cellBins counts one cell; the lock is for workers that share a copy.
type cellBins struct {
	mu  sync.Mutex
	set []binSet // [slot]
}

// histograms are the counts of the first pass, in one or more copies.
type histograms struct{ copies [][]cellBins }

func newHistograms(cells, slots, workers int, budget int64) *histograms {
	h := &histograms{copies: make([][]cellBins, max(1, min(workers, maxCopies, int(budget/4)/(cells*slots*setBytes+1))))}
	for i := range h.copies {
		h.copies[i] = make([]cellBins, cells)
		for c := range h.copies[i] {
			h.copies[i][c].set = make([]binSet, slots)
		}
	}
	return h
}

// add counts the held variables of a block.
func (h *histograms) add(worker int, r *Rows, held []int, variables []Variable) {
	cells := h.copies[worker%len(h.copies)]
	for _, sp := range r.Spans {
		if sp.From == sp.To {
			continue
		}
		c := &cells[sp.Cell]
		c.mu.Lock()
		for i, v := range held {
			c.set[i].add(r.Values[v][sp.From:sp.To], variables[v].Optional)
		}
		c.mu.Unlock()
	}
}

// bin is a counted bin: the leading binBits of its keys, its rows, the sum of
// their offsets, and the same weighed.
type bin struct {
	prefix, n, offset uint64
	units             uint64  // weight in units
	mass, shift       float64 // the same as a float; Σ weight·offset
}

// weigh gives every row of the bins a weight in units.
func weigh(dst, bins []bin, unit uint64) []bin {
	for _, b := range bins {
		b.units = b.n * unit
		b.mass = float64(b.units)
		b.shift = float64(float64(unit) * float64(b.offset))
		dst = append(dst, b)
	}
	return dst
}

// merge returns the bins of every cell and slot, ascending.
func (h *histograms) merge(cells, slots int) [][][]bin {
	merged := make([][][]bin, cells)
	for c := range merged {
		merged[c] = make([][]bin, slots)
		for v := range slots {
			var bins []bin
			for i := range h.copies {
				bins = h.copies[i][c].set[v].collect(bins)
			}
			merged[c][v] = addUp(bins)
		}
	}
	return merged
}

// collect appends the bins that are not empty.
func (b *binSet) collect(bins []bin) []bin {
	if b.index == nil {
		return bins
	}
	for page, p := range b.index {
		if p == 0 {
			continue
		}
		for sub, c := range b.pages[p-1] {
			if c.n > 0 {
				bins = append(bins, bin{prefix: uint64(page<<subBits | sub), n: c.n, offset: c.offset})
			}
		}
	}
	return bins
}

// addUp sorts bins and joins those of the same prefix, in their order.
func addUp(bins []bin) []bin {
	slices.SortStableFunc(bins, func(a, b bin) int {
		if a.prefix < b.prefix {
			return -1
		} else if a.prefix > b.prefix {
			return 1
		}
		return 0
	})
	out := bins[:0]
	for _, b := range bins {
		if n := len(out); n > 0 && out[n-1].prefix == b.prefix {
			out[n-1].n += b.n
			out[n-1].offset += b.offset
			out[n-1].units += b.units
			out[n-1].mass += b.mass
			out[n-1].shift += b.shift
		} else {
			out = append(out, b)
		}
	}
	return slices.Clip(out)
}

// binEnds returns the lowest and highest value of the bin of a prefix.
func binEnds(prefix uint64) (low, high float64) {
	return fromKey(prefix << binShift), fromKey((prefix+1)<<binShift - 1)
}

// sum returns the weighted sum of the values of a bin, the lowest value and the
// width.
func (b bin) sum() (sum, low, width float64) {
	low, high := binEnds(b.prefix)
	if max(-low, high) < 0x1p-1000 { // the bin of zero
		return 0, 0, 0
	}
	width = high - low
	return b.mass*low + width*((b.shift+b.mass/2)/(1<<offsetBits)), low, width
}
