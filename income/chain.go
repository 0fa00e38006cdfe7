package income

import (
	"errors"
	"fmt"
	"math"
)

// Chain is a finite Markov chain for the persistent part.
type Chain struct {
	Nodes      []float64 // z, ascending, n entries
	Transition []float64 // n×n, row-major: row = this year, column = next year; rows sum to 1
}

// rowTolerance is how far a row of a chain may be from summing to 1.
const rowTolerance = 1e-12

// Validate reports every fault of a chain at once, each as a *FieldError: no
// nodes, nodes that are not finite and ascending, a matrix of another size,
// entries that are no probabilities, rows that miss 1 by more than 1e-12.
func (c *Chain) Validate() error {
	var f faults
	n := c.Len()
	if n == 0 {
		f.add("Nodes", "empty", "at least one node")
	}
	for i, z := range c.Nodes {
		switch {
		case math.IsNaN(z) || math.IsInf(z, 0):
			f.add(fmt.Sprintf("Nodes[%d]", i), z, "a finite number")
		case i > 0 && z <= c.Nodes[i-1]:
			f.add(fmt.Sprintf("Nodes[%d]", i), z, "above the node before it")
		}
	}
	if len(c.Transition) != n*n {
		f.add("Transition", fmt.Sprintf("%d entries", len(c.Transition)), fmt.Sprintf("%d, a row of %d for each node", n*n, n))
		return errors.Join(f...)
	}
	for i := range n {
		if sum := total(c.Row(i)); !(math.Abs(sum-1) <= rowTolerance) {
			f.add(fmt.Sprintf("Transition row %d", i), sum, "probabilities that sum to 1")
		}
	}
	return errors.Join(f...)
}

// total returns the sum of p, NaN if an entry is negative or NaN.
func total(p []float64) float64 {
	sum := 0.0
	for _, q := range p {
		if !(q >= 0) {
			return math.NaN()
		}
		sum += q
	}
	return sum
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

// Project puts N(0, sd²) on the nodes: each gets the normal probability of its
// cell, cells meeting half-way between nodes. With sd 0 the node nearest to 0 has
// all (two equally near share). It panics if sd is negative or NaN.
//
// The variance on the nodes is about sd² + h²/12, h the distance between nodes,
// as long as sd is above h/2; far below that everything falls on the middle
// nodes. [ProjectionRemarks] says when this matters.
func (c *Chain) Project(sd float64) []float64 {
	if !(sd >= 0) {
		panic("income: a standard deviation cannot be negative")
	}
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
	// max: Erfc is monotone only up to rounding.
	return max(0, math.Erfc(-b/math.Sqrt2)-math.Erfc(-a/math.Sqrt2)) / 2
}
