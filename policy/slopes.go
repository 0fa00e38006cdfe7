package policy

import "math"

// slopes completes a cubic rule on the assets of g: the slope at every node from
// above and, at kinks, from below. v and d are the expectation and its slope sum,
// row the chance of each next node, the first of which is from.
func (s *Solver) slopes(c *Curve, g *ground, v, d []float64, from int, row []float64) {
	n := len(v)
	right := s.arena.take(n)
	if s.kind == powerKind {
		powerSlopes(right, c.Consumption, v, d, s.returns, s.shift)
	} else {
		for i := range right {
			k := s.assetSlope(c.Consumption[i], v[i], d[i])
			right[i] = k / (1 + k)
		}
	}
	left := right
	if !math.IsInf(c.Bound, -1) || len(g.kinks) > 0 {
		left = s.arena.take(n)
		copy(left, right)
		s.leftSlopes(c, g, left, v, d, from, row)
	}
	c.Left, c.Right = left, right
	if math.IsInf(c.Bound, -1) {
		return
	}
	left[0] = 1
	if c.Consumption[0] <= s.h.Utility.Infimum() { // the rule starts at the floor: no slope there, a line to the next node
		k := (c.Consumption[1] - c.Consumption[0]) / (c.Cash[1] - c.Cash[0])
		left[0], right[0], left[1] = k, k, k
	}
}

// powerSlopes is the loop over assetSlope for power utility, with one division.
func powerSlopes(dst, consumption, v, d []float64, returns, shift float64) {
	consumption, v, d = consumption[:len(dst)], v[:len(dst)], d[:len(dst)]
	for i := range dst {
		k := returns * d[i] * (consumption[i] - shift)
		dst[i] = k / (v[i] + k)
	}
}

// leftSlopes corrects the slopes from below at the assets from which a kink of
// next year's rule is met exactly.
func (s *Solver) leftSlopes(c *Curve, g *ground, left, v, d []float64, from int, row []float64) {
	extra := s.work.extra[:len(v)]
	clear(extra)
	for i := range g.kinks {
		k := &g.kinks[i]
		if k.index > 0 {
			extra[k.index] += row[int(k.node)-from] * k.delta
		}
	}
	for i, e := range extra {
		if e != 0 {
			k := s.assetSlope(c.Consumption[i], v[i], d[i]+s.euler.live*e)
			left[i] = k / (1 + k)
		}
	}
}

// secants completes the linear rule of a state.
func (s *Solver) secants(state int, c *Curve) {
	n := len(c.Cash)
	k := s.arena.take(n + 1) // slope below each node, and above the last
	c.Left, c.Right = k[:n], k[1:]
	if s.lined() {
		s.sound = s.next.setLines(state, c, k, s.tolerance(), s.shift) && s.sound
		return
	}
	k[0] = 1
	for i := 1; i < n; i++ {
		k[i] = (c.Consumption[i] - c.Consumption[i-1]) / (c.Cash[i] - c.Cash[i-1])
	}
	k[n] = k[n-1]
	if math.IsInf(c.Bound, -1) {
		k[0] = k[1]
	}
}
