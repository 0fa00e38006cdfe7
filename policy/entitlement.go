package policy

import (
	"math"
	"sort"
)

// EntitlementGrid is the entitlements at which the rule of one year is kept, the
// products of the nodes of each pillar, and how it is read between them.
//
// Between nodes the rule at entitlement e is a sum over a few of its nodes e_k,
//
//	c(e, m) = Σ_k w_k(e) · c_k(m + m̄_k − m̄(e)),   m̄(e) = Σ_k w_k(e)·m̄_k,
//
// w the weights of polynomial interpolation (Σw = 1) and m̄_k the cash-on-hand at
// which the borrowing limit stops binding: rules are compared at the same distance
// from that kink, which keeps it sharp and in its place. The sum is exact wherever
// the rules are straight lines whose levels depend on e through the polynomial.
// Under the Linear method m̄ is left out and the weights are those of the two
// neighbours. Entitlements beyond the grid count as its ends.
type EntitlementGrid struct {
	Axes    [MaxPillars][]float64 // nodes, ascending; a single node where nothing varies
	cells   [MaxPillars][]stencil
	aligned bool // rules are compared at the same distance from the kink of the limit
}

// stencil holds the nodes that interpolate between two neighbours, and the inverse
// of each one's product of distances to the others (Lagrange's form).
type stencil struct {
	first, n int
	inverse  [4]float64
}

// newEntitlementGrid returns a grid on the given axes. Where smooth, four nodes are
// used if there are as many, but two in the window of a single bend, and none from
// beyond it.
func newEntitlementGrid(axes [MaxPillars][]float64, bends [MaxPillars][]window, smooth, aligned bool) EntitlementGrid {
	g := EntitlementGrid{Axes: axes, aligned: aligned}
	for p, x := range axes {
		for i := range len(x) - 1 {
			s := stencil{first: i, n: 2}
			if from, to, ok := smoothRange(x, i, bends[p]); smooth && ok {
				s.n = min(4, to-from+1)
				s.first = min(max(i-1, from), to+1-s.n)
			}
			for a := range s.n {
				product := 1.0
				for b := range s.n {
					if b != a {
						product *= x[s.first+a] - x[s.first+b]
					}
				}
				s.inverse[a] = 1 / product
			}
			g.cells[p] = append(g.cells[p], s)
		}
	}
	return g
}

// smoothRange returns the first and the last of the nodes x around cell i between
// which no window of a single bend lies, or false if the cell is in one.
func smoothRange(x []float64, i int, bends []window) (from, to int, ok bool) {
	to = len(x) - 1
	for _, w := range bends {
		switch {
		case w.several:
		case w.high <= x[i]:
			for x[from] < w.high {
				from++
			}
		case w.low >= x[i+1]:
			for x[to] > w.low {
				to--
			}
		default:
			return 0, 0, false
		}
	}
	return from, to, true
}

// Len returns the number of nodes.
func (g *EntitlementGrid) Len() int {
	n := 1
	for _, x := range g.Axes {
		n *= max(1, len(x))
	}
	return n
}

// Node returns the entitlement at node k, the last pillar running fastest.
func (g *EntitlementGrid) Node(k int) (e Entitlement) {
	for p := MaxPillars - 1; p >= 0; p-- {
		if n := len(g.Axes[p]); n > 0 {
			e[p] = g.Axes[p][k%n]
			k /= n
		}
	}
	return e
}

// A blend is the weights of a sum over entitlement nodes.
type blend struct {
	n      int
	node   [16]int
	weight [16]float64
}

// blend sets b to the sum that gives the rule at e.
func (g *EntitlementGrid) blend(e Entitlement, b *blend) {
	var w [MaxPillars][4]float64
	first, n := g.weigh(0, e[0], &w[0])
	rows := len(g.Axes[1])
	if rows < 2 {
		b.n = 0
		b.add(first, w[0][:n], 1)
		return
	}
	second, m := g.weigh(1, e[1], &w[1])
	b.n = 0
	for i, x := range w[0][:n] {
		if x != 0 {
			b.add((first+i)*rows+second, w[1][:m], x)
		}
	}
}

// add adds the nodes from first on with the given weights times scale; weights of 0
// are left out.
func (b *blend) add(first int, weights []float64, scale float64) {
	for i, x := range weights {
		if x != 0 {
			b.node[b.n&15], b.weight[b.n&15] = first+i, scale*x
			b.n++
		}
	}
}

// weigh sets w to the weights of pillar p's nodes first, first+1, … at x.
func (g *EntitlementGrid) weigh(p int, x float64, w *[4]float64) (first, n int) {
	axis := g.Axes[p]
	last := len(axis) - 1
	switch {
	case last < 1 || !(x > axis[0]):
		w[0] = 1
		return 0, 1
	case x >= axis[last]:
		w[0] = 1
		return last, 1
	}
	s := &g.cells[p][sort.Search(last, func(i int) bool { return axis[i] > x })-1]
	if s.n == 2 {
		w[1] = (x - axis[s.first]) * s.inverse[1]
		w[0] = 1 - w[1]
		return s.first, 2
	}
	for a := range s.n {
		w[a] = s.inverse[a]
		for b := range s.n {
			if b != a {
				w[a] *= x - axis[s.first+b]
			}
		}
	}
	return s.first, s.n
}

// read returns consumption and the propensity to consume of the sum b over curves,
// one for each entitlement node, at cash-on-hand m.
func (g *EntitlementGrid) read(curves []Curve, b *blend, m float64) (consumption, propensity float64) {
	if b.n == 1 {
		return curves[b.node[0]].At(m)
	}
	kink, bound := 0.0, 0.0
	for i := range b.n {
		c := &curves[b.node[i]]
		kink += b.weight[i] * c.Cash[0]
		bound += b.weight[i] * c.Bound
	}
	limited := !math.IsInf(bound, -1) && !math.IsNaN(bound)
	if g.aligned && limited && m < kink {
		return m - bound, 1
	}
	for i := range b.n {
		c := &curves[b.node[i]]
		x, d := c.At(m + g.shift(c.Cash[0], kink))
		consumption += b.weight[i] * x
		propensity += b.weight[i] * d
	}
	if limited && consumption > m-bound {
		return m - bound, 1
	}
	return consumption, propensity
}
