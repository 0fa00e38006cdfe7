package output

import (
	"slices"
	"sync"

	"cistern/output/stats"
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

// maxCopies bounds the memory of the first pass: workers share copies of the
// histograms beyond that many.
const maxCopies = 8

type binPage [1 << subBits]struct{ n, offset uint64 }

// binSet counts one variable in one cell.
type binSet struct {
	index *[1 << pageBits]uint16 // place of a page plus 1; 0: none
	pages []binPage
}

func (b *binSet) add(column []float64) {
	if b.index == nil {
		b.index = new([1 << pageBits]uint16)
	}
	for _, x := range column {
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
	set [variables]binSet
}

// histograms are the counts of the first pass, in one or more copies.
type histograms struct{ copies [][]cellBins }

func newHistograms(cells, workers int) *histograms {
	h := &histograms{copies: make([][]cellBins, min(workers, maxCopies))}
	for i := range h.copies {
		h.copies[i] = make([]cellBins, cells)
	}
	return h
}

func (h *histograms) add(worker int, r *SummaryRows, cellOf func(Span) int) {
	cells := h.copies[worker%len(h.copies)]
	for _, sp := range r.Spans {
		if sp.From == sp.To {
			continue
		}
		c := &cells[cellOf(sp)]
		c.mu.Lock()
		c.set[income].add(r.Income[sp.From:sp.To])
		c.set[consumption].add(r.Consumption[sp.From:sp.To])
		c.set[assets].add(r.Assets[sp.From:sp.To])
		c.mu.Unlock()
	}
}

// bin is a counted bin: the leading binBits of its keys, its rows, and the sum
// of their offsets.
type bin struct{ prefix, n, offset uint64 }

// merge returns the bins of every cell and variable, ascending.
func (h *histograms) merge(cells int) [][variables][]bin {
	merged := make([][variables][]bin, cells)
	for c := range merged {
		for v := range variables {
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
				bins = append(bins, bin{uint64(page<<subBits | sub), c.n, c.offset})
			}
		}
	}
	return bins
}

// addUp sorts bins and joins those of the same prefix.
func addUp(bins []bin) []bin {
	slices.SortFunc(bins, func(a, b bin) int {
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
		} else {
			out = append(out, b)
		}
	}
	return slices.Clip(out)
}

// sum returns the sum of the values of a bin, the lowest value and the width.
func (b bin) sum() (sum, low, width float64) {
	low = fromKey(b.prefix << binShift)
	width = fromKey((b.prefix+1)<<binShift-1) - low
	n := float64(b.n)
	return n*low + width*((float64(b.offset)+n/2)/(1<<offsetBits)), low, width
}

// giniOfBins returns the Gini coefficient, factor n/(n−1) included, of binned
// values whose sum is known in every bin, and a bound on its error.
//
// In Σ (2·rank − n − 1)·x a bin of m values with b below it contributes
// (2b + m − n)·sum plus the spread within, Σ_(k≤m) (2k − m − 1)·x_(k). The
// spread is at least 0 and at most m²·f(1−f)·width, f the place of the bin's
// mean in it (half of the values at either end); two thirds of that are taken,
// right for an even spread. The bound is the sum of those two thirds.
func giniOfBins(bins []bin) (gini, bound float64) {
	var n, total float64
	for _, b := range bins {
		sum, _, _ := b.sum()
		n += float64(b.n)
		total += sum
	}
	var below, between, within float64
	for _, b := range bins {
		sum, low, width := b.sum()
		m := float64(b.n)
		between += float64((2*below + m - n) * sum)
		if width > 0 {
			f := max(0, min(1, (sum/m-low)/width))
			within += m * m * f * (1 - f) * width * 2 / 3
		}
		below += m
	}
	if n < 2 || !(total > 0) {
		return giniOf(n, total, 0), 0
	}
	return (between + within) / ((n - 1) * total), within / ((n - 1) * total)
}

// setGini puts the coefficient of binned values in place of the sample's.
func (r *valueResult) setGini(bins []bin) {
	value, bound := giniOfBins(bins)
	half := (r.gini.Upper - r.gini.Lower) / 2
	r.gini = stats.Estimate{Value: value, StandardError: r.gini.StandardError, Lower: value - half, Upper: value + half}
	r.giniBound = bound
}
