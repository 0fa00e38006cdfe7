package income

import (
	"fmt"
	"math"
)

// A remark is made where a moment misses by more than these.
const (
	remarkSD         = 0.02 // relative, standard deviation; and relative to 1−|ρ|, autocorrelation
	remarkInnovation = 0.05 // relative, standard deviation of the innovations
	remarkKurtosis   = 0.5  // the chain's tails against a normal law's 3
)

// Remarks says in words where a chain is a poor stand-in for its process and what
// would be closer; nothing where it is close.
func Remarks(p AR1, c *Chain) []string {
	if p.InnovationSD == 0 {
		return nil
	}
	if c.Len() < 2 {
		return []string{"the chain has a single node: persistent risk is left out"}
	}
	law := c.Stationary()
	m, truth := c.Moments(law), p.Moments()
	var out []string
	sd := m.SD/truth.SD - 1
	if math.Abs(sd) > remarkSD {
		out = append(out, fmt.Sprintf("standard deviation %.4g on the chain, %.4g in the process: %s", m.SD, truth.SD, offBy(sd)))
	}
	if d := m.Autocorrelation - truth.Autocorrelation; math.Abs(d) > remarkSD*(1-math.Abs(truth.Autocorrelation)) {
		out = append(out, fmt.Sprintf("autocorrelation %.6g on the chain, %.6g in the process: %s", m.Autocorrelation, truth.Autocorrelation, halfLives(m.Autocorrelation, truth.Autocorrelation)))
	}
	if chain := c.innovationSD(law, p); math.Abs(chain/p.InnovationSD-1) > remarkInnovation {
		out = append(out, fmt.Sprintf("innovations with standard deviation %.4g on the chain, %.4g in the process: %s", chain, p.InnovationSD, offBy(chain/p.InnovationSD-1)))
	}
	if len(out) > 0 {
		out = append(out, c.advice(sd, truth.SD))
	}
	if math.Abs(m.Kurtosis-3) > remarkKurtosis+1e-9 {
		out = append(out, fmt.Sprintf("kurtosis %.4g on the chain, 3 in the process: more points would bring its tails closer", m.Kurtosis))
	}
	return out
}

// innovationSD returns the root mean square of the chain's conditional standard
// deviations under a law.
func (c *Chain) innovationSD(law []float64, p AR1) float64 {
	variance := 0.0
	for i, k := range c.Conditionals(p) {
		variance += law[i] * k.SD * k.SD
	}
	return math.Sqrt(variance)
}

// advice says what would be closer to a process with standard deviation truth,
// which the chain's exceeds by the part sd.
func (c *Chain) advice(sd, truth float64) string {
	reach := c.Nodes[c.Len()-1] / truth
	if sd < -remarkSD && reach < 2.5 {
		return fmt.Sprintf("the nodes reach only %.3g standard deviations: a wider span, or method rouwenhorst, would be closer", reach)
	}
	return fmt.Sprintf("method rouwenhorst has all three exact with as few as %d points; otherwise use more points", c.Len())
}

func offBy(r float64) string {
	if r > 0 {
		return fmt.Sprintf("%.1f %% too high", 100*r)
	}
	return fmt.Sprintf("%.1f %% too low", -100*r)
}

// halfLives compares two autocorrelations by how long a shock takes to halve.
func halfLives(chain, process float64) string {
	if chain <= 0 || chain >= 1 || process <= 0 {
		return fmt.Sprintf("%+.2g", chain-process)
	}
	return fmt.Sprintf("a shock halves in %.3g years instead of %.3g", math.Ln2/-math.Log(chain), math.Ln2/-math.Log(process))
}

// Remarks says in words where the quadrature nodes are a poor stand-in for the
// shock; nothing where they are close.
func (s Transitory) Remarks() []string {
	if s.SD == 0 {
		return nil
	}
	if s.Nodes == 1 {
		return []string{"a single node: the solver leaves transitory risk out"}
	}
	if r := s.Moments().SD/s.SD - 1; math.Abs(r) > remarkSD {
		return []string{fmt.Sprintf("transitory standard deviation %.4g on %d nodes (%v), %.4g in the process: %s; use 7 nodes or more", s.Moments().SD, s.Nodes, s.Rule, s.SD, offBy(r))}
	}
	return nil
}

// ProjectionRemarks says in words where [Chain.Project] misses a law with
// standard deviation sd; nothing where it is close.
func (c *Chain) ProjectionRemarks(sd float64) []string {
	got := c.Moments(c.Project(sd)).SD
	if c.Len() < 2 || math.Abs(got-sd) <= remarkSD*sd {
		return nil
	}
	if sd == 0 {
		return []string{fmt.Sprintf("an even number of points has no node at 0: households start %.4g away from it", got)}
	}
	return []string{fmt.Sprintf("first-year standard deviation %.4g on the chain, %.4g asked for: %s; more points would bring it closer", got, sd, offBy(got/sd-1))}
}
