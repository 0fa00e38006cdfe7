package policy

import "math"

// accrue makes tb the table of a rule with an entitlement and returns the curves
// that it keeps: one set if they are the same at every persistent node.
func (tb *Table) accrue(g *EntitlementGrid, curves []Curve) []Curve {
	tb.grid, tb.stride = g, g.Len()
	for i := range curves {
		if &curves[i].Cash[0] != &curves[i%tb.stride].Cash[0] {
			return curves
		}
	}
	curves, tb.stride = curves[:tb.stride], 0
	return curves
}

// evaluateAccrued is Evaluate between entitlement nodes, state by state: the sum of
// EntitlementGrid, each of its rules found by the guide.
func (tb *Table) evaluateAccrued(node []uint8, cash, consumption, propensity []float64, entitlement [][]float64) {
	var b blend
	var e Entitlement
	for i, m := range cash {
		first := 0
		if node != nil {
			first = int(node[i]) * tb.stride
		}
		for p, column := range entitlement {
			e[p] = column[i]
		}
		tb.grid.blend(e, &b)
		kink, bound := 0.0, 0.0
		for k, at := range b.node[:b.n] {
			kink += b.weight[k] * tb.kink[first+at]
			bound += b.weight[k] * tb.bound[first+at]
		}
		c, d := 0.0, 0.0
		for k, at := range b.node[:b.n] {
			x := m
			if tb.grid.aligned && b.n > 1 {
				x += tb.kink[first+at] - kink
			}
			piece := tb.find(first+at, x)
			u := x - tb.edges[piece]
			q := &tb.cubic[piece]
			c += b.weight[k] * (q[0] + u*(q[1]+u*(q[2]+u*q[3])))
			d += b.weight[k] * (q[1] + u*(2*q[2]+3*u*q[3]))
		}
		if most := m - bound; (c > most || tb.grid.aligned && m < kink) && most <= math.MaxFloat64 {
			c, d = most, 1
		}
		consumption[i] = c
		if propensity != nil {
			propensity[i] = d
		}
	}
}

// find returns the piece of a curve that cash-on-hand m lies in.
func (tb *Table) find(curve int, m float64) int {
	x := max((m-tb.low)*tb.scale+1, 1)
	b := min(int(math.Float64bits(x)>>(tb.shift&63))-1023<<(52-tb.shift), tb.buckets-1)
	k := int(tb.guide[curve*tb.buckets+b])
	for m >= tb.edges[k+1] {
		k++
	}
	return k
}
