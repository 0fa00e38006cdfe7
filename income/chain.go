package income

import (
	"math"
	"slices"
)

// Chain is a finite Markov chain for the persistent part.
type Chain struct {
	Nodes      []float64 // z, ascending, n entries
	Transition []float64 // n×n, row-major: row = this year, column = next year; rows sum to 1
}

// A Discretiser replaces an AR(1) process by a chain. It reports an invalid
// process or options as *FieldError, all faults at once. Without innovations it
// returns [Degenerate].
type Discretiser interface {
	Name() string
	Discretise(AR1) (*Chain, error)
}

// Degenerate returns the chain with the single node 0: no persistent risk.
func Degenerate() *Chain { return &Chain{Nodes: []float64{0}, Transition: []float64{1}} }

// Len returns the number of nodes.
func (c *Chain) Len() int { return len(c.Nodes) }

// Row returns the distribution of next year's node from node i. The caller must
// not change it.
func (c *Chain) Row(i int) []float64 { return c.Transition[i*len(c.Nodes) : (i+1)*len(c.Nodes)] }

// Step sets dst to the distribution one year after p, dst = p·Transition. dst
// must not be p.
func (c *Chain) Step(dst, p []float64) {
	clear(dst)
	for i, q := range p {
		for j, x := range c.Row(i) {
			dst[j] += q * x
		}
	}
}

// Stationary returns the distribution that a year leaves unchanged, by the
// elimination of Grassmann, Taksar and Heyman (1985, Operations Research 33),
// which subtracts nothing and so keeps its digits at any persistence. Nodes that
// the rest of the chain cannot reach have probability 0.
func (c *Chain) Stationary() []float64 {
	n := c.Len()
	a := slices.Clone(c.Transition)
	p := make([]float64, n)
	for k := n - 1; k > 0; k-- {
		out := 0.0
		for j := range k {
			out += a[k*n+j]
		}
		if out == 0 {
			continue
		}
		for i := range k {
			a[i*n+k] /= out
			for j := range k {
				a[i*n+j] += a[i*n+k] * a[k*n+j]
			}
		}
	}
	p[0] = 1
	sum := 1.0
	for k := 1; k < n; k++ {
		for i := range k {
			p[k] += p[i] * a[i*n+k]
		}
		sum += p[k]
	}
	for k := range p {
		p[k] /= sum
	}
	return p
}

// Project puts N(0, sd²) on the nodes: each gets the normal probability of its
// cell, cells meeting half-way between nodes. With sd 0 the node nearest to 0 has
// all (two equally near share).
func (c *Chain) Project(sd float64) []float64 {
	n := c.Len()
	p := make([]float64, n)
	if sd == 0 {
		return c.nearest(p)
	}
	below := math.Inf(-1)
	for j := range p {
		above := math.Inf(1)
		if j < n-1 {
			above = (c.Nodes[j] + c.Nodes[j+1]) / 2 / sd
		}
		p[j] = normalBetween(below, above)
		below = above
	}
	return p
}

func (c *Chain) nearest(p []float64) []float64 {
	best := math.Inf(1)
	for _, z := range c.Nodes {
		best = math.Min(best, math.Abs(z))
	}
	count := 0.0
	for j, z := range c.Nodes {
		if math.Abs(z) <= best*(1+1e-12) {
			p[j] = 1
			count++
		}
	}
	for j := range p {
		p[j] /= count
	}
	return p
}

// ByAge returns the distribution in each of a number of years, [year][node], the
// first of which is initial.
func (c *Chain) ByAge(initial []float64, years int) [][]float64 {
	d := make([][]float64, years)
	for t := range d {
		d[t] = make([]float64, c.Len())
		if t == 0 {
			copy(d[t], initial)
		} else {
			c.Step(d[t], d[t-1])
		}
	}
	return d
}

// normalBetween returns Φ(b) − Φ(a) for a ≤ b, from whichever tail keeps the
// digits.
func normalBetween(a, b float64) float64 {
	if a > 0 {
		a, b = -b, -a
	}
	return (math.Erfc(-b/math.Sqrt2) - math.Erfc(-a/math.Sqrt2)) / 2
}
