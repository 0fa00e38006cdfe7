package income

import (
	"errors"
	"fmt"
	"math"
)

// Tauchen discretises by the method of
//
//	G. Tauchen, "Finite state Markov-chain approximations to univariate and
//	vector autoregressions", Economics Letters 20 (1986) 177–181.
//	doi:10.1016/0165-1765(86)90168-0
//
// Nodes lie evenly on ±Span stationary standard deviations. The chance to move
// from z_i to z_j is that of the cell around z_j under N(ρ·z_i, σ²), cells meeting
// half-way and the outer ones open.
//
// Where nodes lie far apart against σ, so at high persistence, the chain spreads
// too far and hardly moves: nine nodes over three deviations overstate the
// standard deviation by 10 % at ρ = 0.90 and by 28 % at ρ = 0.99. See [Remarks].
type Tauchen struct {
	Points int     // nodes, 2 to 1000
	Span   float64 // half-width of the grid, in stationary standard deviations, > 0
}

// Name returns "tauchen".
func (Tauchen) Name() string { return "tauchen" }

// Discretise implements Discretiser. A chain that falls apart, nodes meeting
// less than once in 10¹⁰⁰ years, is refused as a *FieldError: rounding would decide
// what happens in the long run. The cost is O(Points²).
func (g Tauchen) Discretise(p AR1) (*Chain, error) {
	if err := validate(p, g.Points, g.Span); err != nil {
		return nil, err
	}
	if p.InnovationSD == 0 {
		return Degenerate(), nil
	}
	n := g.Points
	c := &Chain{Nodes: evenly(n, g.Span*p.StationarySD()), Transition: make([]float64, n*n)}
	if err := c.distinct(p); err != nil {
		return nil, err
	}
	half := c.Nodes[n-1] / float64(n-1)
	for i := range n {
		mean := p.Autocorrelation * c.Nodes[i]
		row := c.Row(i)
		below := math.Inf(-1)
		for j := range n {
			above := math.Inf(1)
			if j < n-1 {
				above = (c.Nodes[j] + half - mean) / p.InnovationSD
			}
			row[j] = normalBetween(below, above)
			below = above
		}
	}
	if class, _ := c.recurrent(moveAtLeast); len(class) < n {
		return nil, &FieldError{"Points", n, fmt.Sprintf("more points (or a smaller span): %g standard deviations at autocorrelation %g leave nodes so far apart that some never meet", g.Span, p.Autocorrelation)}
	}
	return c, nil
}

// moveAtLeast is the smallest chance, a year, of a move that counts when
// Discretise asks whether every node leads to every other.
const moveAtLeast = 1e-100

// validate checks what both methods need.
func validate(p AR1, points int, span float64) error {
	var f faults
	if points < 2 || points > 1000 {
		f.add("Points", points, "from 2 to 1000")
	}
	if !(span > 0) || math.IsInf(span, 1) {
		f.add("Span", span, "positive and finite")
	}
	return errors.Join(p.Validate(), errors.Join(f...))
}

// distinct reports a spread so large or small that nodes are no distinct numbers.
func (c *Chain) distinct(p AR1) error {
	for i, z := range c.Nodes {
		if math.IsInf(z, 0) || i > 0 && z <= c.Nodes[i-1] {
			return &FieldError{"InnovationSD", p.InnovationSD, "such that the nodes are distinct finite numbers"}
		}
	}
	return nil
}
