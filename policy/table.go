package policy

import (
	"math"
	"slices"
)

// Table is a rule in one year, laid out for evaluating it at many states: every
// curve cut into pieces, each a cubic in the distance from the piece's lower edge,
// and a guide that leads from the bits of cash-on-hand to the right piece in one
// step or two. The stretch at the limit and the lines beyond the grid are pieces
// like the others. It gives the same numbers as [Curve.At] to rounding, and is
// immutable and safe for concurrent use.
//
// Edges stand apart from the cubics, so that a search stays within few cache lines
// and a cubic in half of one: a panel reads the table of every age anew for every
// block of households, and how long that takes depends on the table's size.
type Table struct {
	edges []float64    // where pieces begin; node after node, each ending with NaN, which stops any search
	cubic [][4]float64 // the piece's coefficients; at a node's last edge unused
	guide []int32      // [node][bucket] first piece of the node that can hold a point of the bucket
	top   []float64    // [node] where extrapolation begins

	// with an entitlement every node has a curve for each entitlement node
	grid   *EntitlementGrid
	axes   [MaxPillars]*axisGuide
	stride int       // curves a node; 0 where all nodes have the same ones
	kink   []float64 // [curve] where its limit stops binding
	bound  []float64 // [curve] its lowest assets

	buckets int     // a node
	shift   uint    // of the bits of the scaled cash-on-hand
	low     float64 // cash-on-hand where the first bucket begins
	scale   float64 // 1/money
}

// Table returns year t of the rule as a table.
func (r *Rule) Table(t int) *Table {
	curves := r.Curves[t]
	tb := &Table{low: math.Inf(1)}
	if g := r.accruing(t); g != nil {
		curves = tb.accrue(g, curves)
	}
	high, nodes, edges, gap := math.Inf(-1), 0, 0, 0.0
	for j := range curves {
		cash := curves[j].Cash
		n := len(cash)
		tb.low, high = math.Min(tb.low, cash[0]), math.Max(high, cash[n-1])
		nodes = max(nodes, n)
		edges += n + 2
		gap = math.Max(gap, cash[min(n-1, max(1, n/8))]-cash[0])
		tb.top = append(tb.top, cash[n-1])
		tb.kink, tb.bound = append(tb.kink, cash[0]), append(tb.bound, curves[j].Bound)
	}
	if tb.scale = 1 / gap; gap == 0 { // curves of a single node
		tb.scale = 1
	}
	octaves := math.Log2(1+(high-tb.low)*tb.scale) + 1
	bits := uint(3)
	for float64(int(1)<<bits)*octaves < 1.5*float64(nodes) && bits < 12 {
		bits++
	}
	tb.shift = 52 - bits
	tb.buckets = tb.bucket(high) + 2
	tb.guide = make([]int32, len(curves)*tb.buckets)
	tb.edges, tb.cubic = make([]float64, 0, edges), make([][4]float64, 0, edges)
	for j := range curves {
		first := len(tb.edges)
		tb.addPieces(&curves[j])
		tb.fillGuide(tb.guide[j*tb.buckets:(j+1)*tb.buckets], first)
	}
	return tb
}

// bucket returns the bucket of cash-on-hand m: the exponent and the first bits of
// the mantissa of 1 + (m − low)·scale, from 0.
func (tb *Table) bucket(m float64) int {
	x := max((m-tb.low)*tb.scale+1, 1)
	return int(math.Float64bits(x)>>tb.shift) - 1023<<(52-tb.shift)
}

// addPieces appends the pieces of a curve.
func (tb *Table) addPieces(c *Curve) {
	add := func(edge, c0, c1, c2, c3 float64) {
		tb.edges, tb.cubic = append(tb.edges, edge), append(tb.cubic, [4]float64{c0, c1, c2, c3})
	}
	n := len(c.Cash)
	if math.IsInf(c.Bound, -1) {
		add(c.Cash[0], c.Consumption[0], c.Left[0], 0, 0) // from below, too
	} else {
		add(c.Bound, 0, 1, 0, 0)
	}
	for i := range n - 1 {
		c1, c2, c3 := c.cubic(i)
		add(c.Cash[i], c.Consumption[i], c1, c2, c3)
	}
	add(c.Cash[n-1], c.Consumption[n-1], c.Right[n-1], 0, 0)
	add(math.NaN(), 0, 0, 0, 0)
}

// fillGuide sets the guide of the node whose pieces begin at first: where a search
// in each bucket starts. Everything below the bucket's lower end, less a margin
// for rounding, is behind.
func (tb *Table) fillGuide(guide []int32, first int) {
	at := first
	for b := range guide {
		if b > 0 {
			x := math.Float64frombits(uint64(b+1023<<(52-tb.shift)) << tb.shift)
			end := (x-1)/tb.scale + tb.low
			for tb.edges[at+1] <= end-1e-9*(math.Abs(end)+1/tb.scale) {
				at++
			}
		}
		guide[b] = int32(at)
	}
}

// Top returns the cash-on-hand above which the rule at a node is extrapolated,
// whatever the entitlement.
func (tb *Table) Top(node int) float64 {
	if tb.grid == nil {
		return tb.top[node]
	}
	n := tb.grid.Len()
	return slices.Min(tb.top[node*tb.stride : node*tb.stride+n])
}

// Evaluate sets consumption and the marginal propensity to consume at every state
// (node[i], cash[i]). A nil node means node 0 throughout; a nil propensity is not
// computed. With an entitlement there must be one column for each pillar, this
// year's credit included. The slices must be as long as cash.
func (tb *Table) Evaluate(node []uint8, cash, consumption, propensity []float64, entitlement ...[]float64) {
	if tb.grid != nil {
		tb.evaluateAccrued(node, cash, consumption, propensity, entitlement)
		return
	}
	var piece [len(firstNode)]int32
	for from := 0; from < len(cash); from += len(piece) {
		to := min(from+len(piece), len(cash))
		nodes := firstNode[:to-from]
		if node != nil {
			nodes = node[from:to]
		}
		tb.locate(nodes, cash[from:to], piece[:to-from])
		if propensity == nil {
			tb.consume(piece[:to-from], cash[from:to], consumption[from:to])
		} else {
			tb.both(piece[:to-from], cash[from:to], consumption[from:to], propensity[from:to])
		}
	}
}

// Warm reads the table through if it is about to be evaluated at enough states for
// that to pay: a table that has left the processor's caches comes back faster in
// one stream than by every state's own misses (a third of the time of a panel's
// year, measured). The sum it returns has no meaning but to keep the reads.
func (tb *Table) Warm(states int) (sum float64) {
	const statesAPiece = 1.0 / 8 // fewer touch too little of the table
	if float64(states) < statesAPiece*float64(len(tb.edges)) {
		return 0
	}
	for k := 0; k < len(tb.edges); k += 8 { // a cache line holds eight edges or two cubics
		sum += tb.edges[k]
	}
	for k := 0; k < len(tb.cubic); k += 2 {
		sum += tb.cubic[k][0]
	}
	return sum
}

// firstNode is node 0 for as many states as are evaluated at a time.
var firstNode [256]uint8

// locate finds the piece of every state: in its bucket's first piece or, one
// branch-free step on, the next; further steps are rare.
func (tb *Table) locate(node []uint8, cash []float64, piece []int32) {
	node, piece = node[:len(cash)], piece[:len(cash)]
	edges, guide := tb.edges, tb.guide
	low, scale, shift := tb.low, tb.scale, tb.shift&63
	buckets, last := tb.buckets, tb.buckets-1
	zero := 1023 << (52 - shift)
	for i, m := range cash {
		x := max((m-low)*scale+1, 1)
		b := min(int(math.Float64bits(x)>>shift)-zero, last)
		k := int(guide[int(node[i])*buckets+b])
		k += step(m >= edges[k+1])
		for m >= edges[k+1] {
			k++
		}
		piece[i] = int32(k)
	}
}

func (tb *Table) consume(piece []int32, cash, consumption []float64) {
	cash, consumption = cash[:len(piece)], consumption[:len(piece)]
	edges, cubic := tb.edges, tb.cubic
	for i, k := range piece {
		u := cash[i] - edges[k]
		q := &cubic[k]
		consumption[i] = q[0] + u*(q[1]+u*(q[2]+u*q[3]))
	}
}

// both is consume with the propensity.
func (tb *Table) both(piece []int32, cash, consumption, propensity []float64) {
	cash, consumption, propensity = cash[:len(piece)], consumption[:len(piece)], propensity[:len(piece)]
	edges, cubic := tb.edges, tb.cubic
	for i, k := range piece {
		u := cash[i] - edges[k]
		q := &cubic[k]
		consumption[i] = q[0] + u*(q[1]+u*(q[2]+u*q[3]))
		propensity[i] = q[1] + u*(2*q[2]+3*u*q[3])
	}
}

func step(b bool) int {
	if b {
		return 1
	}
	return 0
}
