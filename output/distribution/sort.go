package distribution

import (
	"math"
	"slices"
)

// key maps a float to an integer of the same order; fromKey undoes it.
// Negative zero sorts just below zero.
func key(x float64) uint64 {
	b := math.Float64bits(x)
	return b ^ (uint64(int64(b)>>63) | 1<<63)
}

// fromKey returns the float of a key, zero for negative zero.
func fromKey(k uint64) float64 {
	x := math.Float64frombits(k ^ (uint64(^int64(k)>>63) | 1<<63))
	if x == 0 {
		return 0
	}
	return x
}

// sorter sorts values together with a mark of their row. Its slices are reused.
type sorter struct {
	keys, spareKeys   []uint64
	marks, spareMarks []uint32
	rowTags           []uint8
	spareUnits        []uint64
}

const digitBits = 11

// sort is a stable radix sort from the last digit to the first, six digits of
// eleven bits; digits that all keys share cost nothing.
func (so *sorter) sort() {
	const digits = (64 + digitBits - 1) / digitBits
	var counts [digits][1 << digitBits]uint32
	for _, k := range so.keys {
		for d := range digits {
			counts[d][k>>(d*digitBits)&(1<<digitBits-1)]++
		}
	}
	n := len(so.keys)
	so.spareKeys = slices.Grow(so.spareKeys[:0], n)[:n]
	so.spareMarks = slices.Grow(so.spareMarks[:0], n)[:n]
	for d := range digits {
		shift := d * digitBits
		count := &counts[d]
		if n == 0 || int(count[so.keys[0]>>shift&(1<<digitBits-1)]) == n {
			continue
		}
		var at uint32
		for i, c := range count {
			count[i] = at
			at += c
		}
		marks := so.marks[:n]
		for i, k := range so.keys {
			to := &count[k>>shift&(1<<digitBits-1)]
			so.spareKeys[*to] = k
			so.spareMarks[*to] = marks[i]
			*to++
		}
		so.keys, so.spareKeys = so.spareKeys, so.keys
		so.marks, so.spareMarks = so.spareMarks, so.marks
	}
}
