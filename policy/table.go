package policy

import "math"

// Table is a rule in one year, laid out for evaluating it at many states: for
// every persistent node the pieces of its curve as records of one cache line, and
// a guide that leads from the bits of cash-on-hand to the right record in one or
// two steps. It gives the same numbers as [Curve.At] to rounding, and is immutable
// and safe for concurrent use.
type Table struct {
	records []record
	guide   []uint16 // [node][bucket] first record of the node that can hold a point of the bucket
	first   []int32  // [node] the node's first record
	buckets int      // a node
	shift   uint     // of the bits of the scaled cash-on-hand
	low     float64  // cash-on-hand where the first bucket begins
	scale   float64  // 1/money
	top     []float64
}

// record is one piece of a curve, padded to 64 bytes: below high, consumption is
// the cubic in m − origin.
type record struct {
	high, origin, c0, c1, c2, c3 float64
	_                            [2]float64
}

// Table returns year t of the rule as a table.
func (r *Rule) Table(t int) *Table {
	curves := r.Curves[t]
	tb := &Table{low: math.Inf(1), top: make([]float64, len(curves))}
	high, nodes, gap := 0.0, 0, 0.0
	for j := range curves {
		cash := curves[j].Cash
		n := len(cash)
		tb.low = math.Min(tb.low, cash[0])
		high = math.Max(high, cash[n-1])
		nodes = max(nodes, n)
		gap = math.Max(gap, cash[max(1, n/8)]-cash[0])
		tb.top[j] = cash[n-1]
	}
	tb.scale = 1 / gap
	octaves := math.Log2(1+(high-tb.low)*tb.scale) + 1
	bits := uint(3)
	for float64(int(1)<<bits)*octaves < 1.5*float64(nodes) && bits < 12 {
		bits++
	}
	tb.shift = 52 - bits
	tb.buckets = tb.bucket(high) + 2
	tb.guide = make([]uint16, len(curves)*tb.buckets)
	for j := range curves {
		tb.add(j, &curves[j])
	}
	return tb
}

// bucket returns the bucket of cash-on-hand m: the exponent and the first bits of
// the mantissa of 1 + (m − low)·scale, from 0.
func (tb *Table) bucket(m float64) int {
	x := (m-tb.low)*tb.scale + 1
	if !(x > 1) {
		x = 1
	}
	return int(math.Float64bits(x)>>tb.shift) - 1023<<(52-tb.shift)
}

// add appends the records of node j and fills its part of the guide.
func (tb *Table) add(j int, c *Curve) {
	tb.first = append(tb.first, int32(len(tb.records)))
	first := len(tb.records)
	n := len(c.Cash)
	if math.IsInf(c.Bound, -1) {
		tb.records = append(tb.records, record{high: c.Cash[0], origin: c.Cash[0], c0: c.Consumption[0], c1: c.Left[0]})
	} else {
		tb.records = append(tb.records, record{high: c.Cash[0], origin: c.Bound, c1: 1})
	}
	for i := range n - 1 {
		c1, c2, c3 := c.cubic(i)
		tb.records = append(tb.records, record{high: c.Cash[i+1], origin: c.Cash[i], c0: c.Consumption[i], c1: c1, c2: c2, c3: c3})
	}
	tb.records = append(tb.records, record{high: math.Inf(1), origin: c.Cash[n-1], c0: c.Consumption[n-1], c1: c.Right[n-1]})
	guide := tb.guide[j*tb.buckets : (j+1)*tb.buckets]
	at := first
	for b := range guide {
		if b > 0 { // everything below the bucket's lower end is behind
			x := math.Float64frombits(uint64(b+1023<<(52-tb.shift)) << tb.shift)
			edge := (x-1)/tb.scale + tb.low
			for tb.records[at].high <= edge-1e-9*(math.Abs(edge)+1/tb.scale) {
				at++
			}
		}
		guide[b] = uint16(at - first)
	}
}

// Top returns the cash-on-hand above which the rule at a node is extrapolated.
func (tb *Table) Top(node int) float64 { return tb.top[node] }

// Evaluate sets consumption and the marginal propensity to consume at every state
// (node[i], cash[i]). A nil node means node 0 throughout; a nil propensity is not
// computed. The slices must be as long as cash.
func (tb *Table) Evaluate(node []uint8, cash, consumption, propensity []float64) {
	if propensity == nil && node != nil {
		tb.consume(node, cash, consumption)
		return
	}
	consumption = consumption[:len(cash)]
	for i, m := range cash {
		j := 0
		if node != nil {
			j = int(node[i])
		}
		q := tb.find(j, m)
		u := m - q.origin
		e2 := q.c2 + u*q.c3
		e1 := q.c1 + u*e2
		consumption[i] = q.c0 + u*e1
		if propensity != nil {
			propensity[i] = e1 + u*(e2+u*q.c3)
		}
	}
}

// find returns the record of node j that holds m.
func (tb *Table) find(j int, m float64) *record {
	b := min(tb.bucket(m), tb.buckets-1)
	k := int(tb.first[j]) + int(tb.guide[j*tb.buckets+b])
	for m >= tb.records[k].high {
		k++
	}
	return &tb.records[k]
}

// consume is Evaluate without propensities, the search by hand: a point is found
// in its bucket's first record or, one branch-free step on, the next; further
// steps are rare.
func (tb *Table) consume(node []uint8, cash, consumption []float64) {
	node, consumption = node[:len(cash)], consumption[:len(cash)]
	records, guide, first := tb.records, tb.guide, tb.first
	low, scale, shift, last := tb.low, tb.scale, tb.shift&63, tb.buckets-1
	buckets := tb.buckets
	zero := 1023 << (52 - shift)
	for i, m := range cash {
		x := (m-low)*scale + 1
		if !(x > 1) {
			x = 1
		}
		b := min(int(math.Float64bits(x)>>shift)-zero, last)
		j := int(node[i])
		k := int(first[j]) + int(guide[j*buckets+b])
		k += step(m >= records[k].high)
		q := &records[k]
		for m >= q.high {
			k++
			q = &records[k]
		}
		u := m - q.origin
		consumption[i] = q.c0 + u*(q.c1+u*(q.c2+u*q.c3))
	}
}

func step(b bool) int {
	if b {
		return 1
	}
	return 0
}
