package distribution

import (
	"math"
	"slices"
)

// Bytes that a held value takes, those that a row takes beside, and those that a
// value takes while it is sorted.
const (
	valueBytes   = 8
	rowBytes     = 1
	weightBytes  = 8
	sortingBytes = 2*(8+4) + 8 + 1
)

// store holds the values of rows by block, in the order of blocks.
type store struct{ blocks []*block }

// block holds the values of one block.
type block struct {
	spans   []Span
	values  [][]float64 // [place in Study.stored][row]; the held variables come first, by slot
	tags    []uint8     // [row] jackknife group
	weights []float64   // [row]; nil where all weigh the same
}

func (s *Study) newBlock(r *Rows) *block {
	b := &block{tags: make([]uint8, r.N), values: make([][]float64, len(s.stored))}
	for i, v := range s.stored {
		b.values[i] = append(make([]float64, 0, r.N), r.Values[v][:r.N]...)
	}
	for k, u := range r.Unit[:r.N] {
		b.tags[k] = uint8(u & (Groups - 1))
	}
	if s.o.Weighted {
		b.weights = append(make([]float64, 0, r.N), r.Weight[:r.N]...)
	}
	for _, sp := range r.Spans {
		if sp.From < sp.To {
			b.spans = append(b.spans, sp)
		}
	}
	return b
}

// hash scatters units: those of a sample must not go with what distinguishes units
// in the order of their numbers. Source: S. Vigna's finaliser of SplitMix64.
func hash(unit int64) uint64 {
	z := uint64(unit) + 0x9e3779b97f4a7c15
	z = (z ^ z>>30) * 0xbf58476d1ce4e5b9
	z = (z ^ z>>27) * 0x94d049bb133111eb
	return z ^ z>>31
}

// newSample holds the rows of some units, with all that they have.
func (s *Study) newSample(r *Rows) *block {
	var rows []int32
	b := &block{values: make([][]float64, len(s.stored))}
	for _, sp := range r.Spans {
		from := len(rows)
		for k, u := range r.Unit[sp.From:sp.To] {
			if hash(u) < s.chance {
				rows = append(rows, int32(sp.From+k))
			}
		}
		if len(rows) > from {
			b.spans = append(b.spans, Span{sp.Cell, from, len(rows)})
		}
	}
	if len(rows) == 0 {
		return nil
	}
	b.tags = make([]uint8, len(rows))
	for i, k := range rows {
		b.tags[i] = uint8(r.Unit[k] & (Groups - 1))
	}
	for i, v := range s.stored {
		b.values[i] = make([]float64, len(rows))
		for j, k := range rows {
			b.values[i][j] = r.Values[v][k]
		}
	}
	return b
}

// piece is a run of rows of one cell in the store.
type piece struct {
	b        *block
	from, to int
}

// index lists the pieces of every cell, in the order of blocks.
func (st *store) index(cells int) [][]piece {
	index := make([][]piece, cells)
	for _, b := range st.blocks {
		for _, sp := range b.spans {
			index[sp.Cell] = append(index[sp.Cell], piece{b, sp.From, sp.To})
		}
	}
	return index
}

// sample is the values of one variable in one target, sorted: all of them, or
// those of a sample of units.
type sample struct {
	keys  []uint64
	tags  []uint8  // [row] jackknife group
	units []uint64 // [row] weight in whole units; nil where every row is one

	plain [Groups]sizes
	whole sizes
}

// sizes are a number of rows and their weight in units.
type sizes struct{ rows, mass float64 }

// sampler makes samples; its slices are reused.
type sampler struct {
	raw sorter
	sample
	weights []float64 // [row] before sorting, where rows have weights
}

// load takes the values of a held variable in the cells of a target and sorts
// them. scale turns weights into units: the whole target weighs about 2^61. It is
// 0 where every row is one unit.
func (so *sampler) load(index [][]piece, t *Target, slot int, scale float64) {
	rows, n := false, 0
	for _, c := range t.Cells {
		for _, p := range index[c.Index] {
			n += p.to - p.from
		}
	}
	so.raw.keys, so.raw.marks, so.weights = slices.Grow(so.raw.keys[:0], n), slices.Grow(so.raw.marks[:0], n), so.weights[:0]
	for i, c := range t.Cells {
		for _, p := range index[c.Index] {
			for k, x := range p.b.values[slot][p.from:p.to] {
				if x != x || p.b.weights != nil && !(p.b.weights[p.from+k] > 0) {
					continue
				}
				so.raw.keys = append(so.raw.keys, key(x))
				if p.b.weights == nil {
					so.raw.marks = append(so.raw.marks, uint32(i)<<8|uint32(p.b.tags[p.from+k]))
					continue
				}
				rows = true
				so.raw.marks = append(so.raw.marks, uint32(len(so.weights)))
				so.weights = append(so.weights, p.b.weights[p.from+k]*t.Cells[i].Weight)
				so.raw.rowTags = append(so.raw.rowTags[:len(so.weights)-1], p.b.tags[p.from+k])
			}
		}
	}
	so.raw.sort()
	so.settle(t, scale, rows)
}

// settle turns the marks of the sorted rows into groups and weights.
func (so *sampler) settle(t *Target, scale float64, rows bool) {
	n := len(so.raw.keys)
	s := &so.sample
	s.keys = so.raw.keys
	s.tags = resize(s.tags, n)
	s.units = nil
	s.plain, s.whole = [Groups]sizes{}, sizes{}
	var ofCell []uint64
	if scale > 0 {
		so.raw.spareUnits = resize(so.raw.spareUnits, n)
		s.units = so.raw.spareUnits
		for _, c := range t.Cells {
			ofCell = append(ofCell, units(c.Weight, scale))
		}
	}
	for k, m := range so.raw.marks {
		unit := uint64(1)
		switch {
		case rows:
			s.tags[k] = so.raw.rowTags[m]
			unit = units(so.weights[m], scale)
		default:
			s.tags[k] = uint8(m)
			if ofCell != nil {
				unit = ofCell[m>>8]
			}
		}
		if s.units != nil {
			s.units[k] = unit
		}
		g := &s.plain[s.tags[k]]
		g.rows++
		g.mass += float64(unit)
	}
	for g := range s.plain {
		s.whole.rows += s.plain[g].rows
		s.whole.mass += s.plain[g].mass
	}
}

// units is a weight as a whole number.
func units(weight, scale float64) uint64 { return uint64(math.Round(weight * scale)) }

// unit is the weight of row k.
func (s *sample) unit(k int) float64 {
	if s.units == nil {
		return 1
	}
	return float64(s.units[k])
}

func resize[E any](x []E, n int) []E {
	if cap(x) < n {
		return make([]E, n, n+n/4)
	}
	return x[:n]
}
