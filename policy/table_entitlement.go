package policy

import "math"

// accrue makes tb the table of a rule with an entitlement and returns the curves
// that it keeps: one set if they are the same at every persistent node.
func (tb *Table) accrue(g *EntitlementGrid, curves []Curve) []Curve {
	tb.grid, tb.stride = g, g.Len()
	for p, axis := range g.Axes {
		tb.axes[p] = newAxisGuide(axis, g.cells[p])
	}
	for i := range curves {
		if &curves[i].Cash[0] != &curves[i%tb.stride].Cash[0] {
			return curves
		}
	}
	curves, tb.stride = curves[:tb.stride], 0
	return curves
}

// axisGuide leads from an entitlement to its cell on an axis.
type axisGuide struct {
	low, scale float64
	terms      int                 // of the longest sum
	cell       [guideBuckets]int32 // first cell that can hold a point of the bucket
}

const guideBuckets = 256

func newAxisGuide(axis []float64, cells []stencil) *axisGuide {
	g := &axisGuide{terms: 1}
	for i := range cells {
		g.terms = max(g.terms, cells[i].n)
	}
	last := len(axis) - 1
	if last < 1 {
		return g
	}
	g.low, g.scale = axis[0], (guideBuckets-1)/(axis[last]-axis[0])
	k := 0
	for b := range g.cell {
		edge := (float64(b) - 1e-6) / g.scale
		for k < last-1 && axis[k+1]-g.low <= edge {
			k++
		}
		g.cell[b] = int32(k)
	}
	return g
}

// chunk is how many states are evaluated between entitlement nodes at a time, step by
// step, so that the processor works on many of them at once.
const chunk = 256

// accruing is the states of a chunk: the terms of each one's sum over curves.
type accruing struct {
	first  [MaxPillars][chunk]int32 // first entitlement node of a pillar's sum
	share  [MaxPillars][4][chunk]float64
	curve  [16][chunk]int32
	weight [16][chunk]float64
	kink   [chunk]float64 // where the limit stops binding
	bound  [chunk]float64
	n      int // terms
}

// evaluateAccrued is Evaluate between entitlement nodes.
func (tb *Table) evaluateAccrued(node []uint8, cash, consumption, propensity []float64, entitlement [][]float64) {
	var s accruing
	var all [MaxPillars][]float64
	copy(all[:], entitlement)
	for from := 0; from < len(cash); from += chunk {
		to := min(from+chunk, len(cash))
		tb.locateTerms(node, all, from, to, &s)
		c, d := consumption[from:to], propensity
		clear(c)
		if d != nil {
			d = propensity[from:to]
			clear(d)
		}
		for k := range s.n {
			tb.addTerm(&s, k, cash[from:to], c, d)
		}
		tb.holdToLimit(&s, cash[from:to], c, d)
	}
}

// locateTerms sets the terms of the states from … to−1.
func (tb *Table) locateTerms(node []uint8, entitlement [MaxPillars][]float64, from, to int, s *accruing) {
	nodes := firstNode[:to-from]
	if node != nil {
		nodes = node[from:to]
	}
	for p, g := range tb.axes {
		if g.terms > 1 {
			tb.weigh(p, entitlement[p][from:to], s)
		}
	}
	tb.combine(nodes, s)
	tb.findKinks(s, to-from)
}

// combine makes the terms of the pillars those of their products.
func (tb *Table) combine(node []uint8, s *accruing) {
	s.n = 0
	for a := range tb.axes[0].terms {
		for b := range tb.axes[1].terms {
			curve, weight := s.curve[s.n][:len(node)], s.weight[s.n][:len(node)]
			s.n++
			rows, stride := max(1, len(tb.grid.Axes[1])), tb.stride
			first := s.first[0][:len(node)]
			switch {
			case tb.axes[1].terms > 1 && tb.axes[0].terms > 1:
				for i, j := range node {
					curve[i] = int32(int(j)*stride + (int(first[i])+a)*rows + int(s.first[1][i]) + b)
					weight[i] = s.share[0][a][i] * s.share[1][b][i]
				}
			case tb.axes[1].terms > 1:
				for i, j := range node {
					curve[i], weight[i] = int32(int(j)*stride+int(s.first[1][i])+b), s.share[1][b][i]
				}
			case tb.axes[0].terms > 1:
				share := s.share[0][a][:len(node)]
				for i, j := range node {
					curve[i], weight[i] = int32(int(j)*stride+(int(first[i])+a)*rows), share[i]
				}
			default:
				for i, j := range node {
					curve[i], weight[i] = int32(int(j)*stride), 1
				}
			}
		}
	}
}

// weigh sets first nodes and weights of pillar p; shorter sums than the longest get
// weights of 0.
func (tb *Table) weigh(p int, x []float64, s *accruing) {
	g, axis, cells := tb.axes[p], tb.grid.Axes[p], tb.grid.cells[p]
	last := len(axis) - 1
	first, w := s.first[p][:len(x)], &s.share[p]
	w0, w1, w2, w3 := w[0][:len(x)], w[1][:len(x)], w[2][:len(x)], w[3][:len(x)]
	for i, e := range x {
		e = min(max(e, axis[0]), axis[last])
		k := int(g.cell[int((e-g.low)*g.scale)&(guideBuckets-1)])
		for k < last-1 && e >= axis[k+1] {
			k++
		}
		q := &cells[k]
		switch {
		case g.terms == 2:
			y := (e - axis[k]) * q.inverse[1]
			first[i], w0[i], w1[i] = int32(k), 1-y, y
			continue
		case q.n < 4:
			var u, v [4]float64
			f, n := tb.grid.weigh(p, e, &u)
			base := min(f, last+1-g.terms)
			copy(v[f-base:], u[:n])
			first[i], w0[i], w1[i], w2[i], w3[i] = int32(base), v[0], v[1], v[2], v[3]
			continue
		}
		nodes := axis[q.first : q.first+4]
		a, b, c, d := e-nodes[0], e-nodes[1], e-nodes[2], e-nodes[3]
		ab, cd := a*b, c*d
		first[i] = int32(q.first)
		w0[i], w1[i], w2[i], w3[i] = b*cd*q.inverse[0], a*cd*q.inverse[1], ab*d*q.inverse[2], ab*c*q.inverse[3]
	}
}

// findKinks sums where limits stop binding, and the bounds.
func (tb *Table) findKinks(s *accruing, n int) {
	kink, bound := s.kink[:n], s.bound[:n]
	clear(kink)
	clear(bound)
	for t := range s.n {
		curve, weight := s.curve[t][:n], s.weight[t][:n]
		for i, k := range curve {
			kink[i] += weight[i] * tb.kink[k]
			bound[i] += weight[i] * tb.bound[k]
		}
	}
}

// addTerm adds term t of every state's sum.
func (tb *Table) addTerm(s *accruing, t int, cash, consumption, propensity []float64) {
	var piece [chunk]int32
	var dist [chunk]float64
	edges, guide := tb.edges, tb.guide
	low, scale, shift := tb.low, tb.scale, tb.shift&63
	buckets, last, zero := tb.buckets, tb.buckets-1, 1023<<(52-shift)
	curve, weight, kink := s.curve[t][:len(cash)], s.weight[t][:len(cash)], s.kink[:len(cash)]
	for i, m := range cash {
		if tb.grid.aligned {
			m += tb.kink[curve[i]] - kink[i]
		}
		x := max((m-low)*scale+1, 1)
		b := min(int(math.Float64bits(x)>>shift)-zero, last)
		k := int(guide[int(curve[i])*buckets+b])
		k += step(m >= edges[k+1])
		for m >= edges[k+1] {
			k++
		}
		piece[i&(chunk-1)], dist[i&(chunk-1)] = int32(k), m-edges[k]
	}
	consumption = consumption[:len(cash)]
	for i, w := range weight {
		q, u := &tb.cubic[piece[i&(chunk-1)]], dist[i&(chunk-1)]
		consumption[i] += w * (q[0] + u*(q[1]+u*(q[2]+u*q[3])))
	}
	if propensity == nil {
		return
	}
	propensity = propensity[:len(cash)]
	for i, w := range weight {
		q, u := &tb.cubic[piece[i&(chunk-1)]], dist[i&(chunk-1)]
		propensity[i] += w * (q[1] + u*(2*q[2]+3*u*q[3]))
	}
}

// Lowest sets the lowest assets, in money, that households may hold at the end of the
// year at states as in Evaluate; −Inf without limit.
func (tb *Table) Lowest(node []uint8, lowest []float64, entitlement ...[]float64) {
	if tb.grid == nil {
		for i := range lowest {
			j := 0
			if node != nil {
				j = int(node[i])
			}
			lowest[i] = tb.bound[j]
		}
		return
	}
	var s accruing
	var all [MaxPillars][]float64
	copy(all[:], entitlement)
	for from := 0; from < len(lowest); from += chunk {
		to := min(from+chunk, len(lowest))
		tb.locateTerms(node, all, from, to, &s)
		copy(lowest[from:to], s.bound[:])
	}
}

// holdToLimit sees to it that at the limit and where the sum would go beyond it
// everything is consumed that the limit allows.
func (tb *Table) holdToLimit(s *accruing, cash, consumption, propensity []float64) {
	for i, m := range cash {
		most := m - s.bound[i]
		if (consumption[i] > most || tb.grid.aligned && m < s.kink[i]) && most <= math.MaxFloat64 {
			consumption[i] = most
			if propensity != nil {
				propensity[i] = 1
			}
		}
	}
}
