package income

import (
	"errors"
	"math"
)

// Tauchen discretises by the method of Tauchen (1986, Economics Letters 20):
// evenly spaced nodes on ±Span stationary standard deviations, and the chance to
// move from z_i to z_j is that of the cell around z_j under N(ρ·z_i, σ²), cells
// meeting half-way and the outer ones open. At high persistence the chain's
// variance is far too high and it hardly moves: see Remarks.
type Tauchen struct {
	Points int     // nodes, 2 to 1000
	Span   float64 // half-width of the grid, in stationary standard deviations, > 0
}

// Name returns "tauchen".
func (Tauchen) Name() string { return "tauchen" }

// Discretise implements Discretiser.
func (g Tauchen) Discretise(p AR1) (*Chain, error) {
	if err := validate(p, g.Points, g.Span); err != nil {
		return nil, err
	}
	if p.InnovationSD == 0 {
		return Degenerate(), nil
	}
	n := g.Points
	c := &Chain{Nodes: evenly(n, g.Span*p.StationarySD()), Transition: make([]float64, n*n)}
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
	return c, nil
}

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
