package contrast

import (
	"math"
	"slices"

	"cistern/output/stats"
)

// The variables whose percentiles are compared: as usual and under the event.
var compared = [...]struct {
	name         string
	usual, event int
}{{"assets", assetsUsual, assetsEvent}, {"consumption", consumptionUsual, consumptionEvent}, {"runway_months", runwayUsual, runwayEvent}}

// joint counts how the households of one target lie about a percentile of either
// world: sums of squared weights of those at or below the one, the other and both.
type joint struct{ rows, usual, event, both float64 }

func (j *joint) fold(o joint) {
	j.rows += o.rows
	j.usual += o.usual
	j.event += o.event
	j.both += o.both
}

// correlation returns that of the two indicators less p, to be at or below
// percentile p.
func (j *joint) correlation(p float64) float64 {
	about := func(a, b, both float64) float64 { return both - p*(a+b) + p*p*j.rows }
	if j.usual == j.both && j.event == j.both {
		return 1 // the same households: no rounding
	}
	k := about(j.usual, j.event, j.both) / math.Sqrt(about(j.usual, j.usual, j.usual)*about(j.event, j.event, j.event))
	return math.Max(-1, math.Min(1, k))
}

// gap returns the difference of two percentiles of the same households.
func gap(usual, event stats.Estimate, correlation float64) stats.Estimate {
	e := stats.Estimate{Value: event.Value - usual.Value, StandardError: math.NaN(), Lower: math.NaN(), Upper: math.NaN()}
	a, b := usual.StandardError, event.StandardError
	d := a - b
	e.StandardError = math.Sqrt(d*d + 2*(1-correlation)*a*b)
	if !math.IsNaN(e.StandardError) {
		e.Lower, e.Upper = e.Value-normal*e.StandardError, e.Value+normal*e.StandardError
	}
	return e
}

// pairs are the counts of one block.
type pairs struct{ years [][]joint }

func (c *Contrast) take() *pairs {
	c.mu.Lock()
	defer c.mu.Unlock()
	if n := len(c.spare); n > 0 {
		p := c.spare[n-1]
		c.spare = c.spare[:n-1]
		return p
	}
	return &pairs{}
}

func (c *Contrast) fold(p *pairs) {
	for i, year := range p.years {
		for k := range year {
			c.joint[i][k].fold(year[k])
		}
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	c.spare = append(c.spare, p)
}

// count counts the pairs of a block that a splitter has split.
func (p *pairs) count(c *Contrast, s *splitter) {
	for len(p.years) < c.to-c.from {
		p.years = append(p.years, nil)
	}
	p.years = p.years[:c.to-c.from]
	for i := range p.years {
		p.years[i] = slices.Grow(p.years[i][:0], c.pairsAYear())[:c.pairsAYear()]
		clear(p.years[i])
		y := &s.years[c.from+i]
		for _, cell := range y.cells {
			for n, t := range c.targets {
				if t.has(cell.group, cell.band) {
					size := len(compared) * len(c.percentiles)
					c.results[c.from+i][n].pair(p.years[i][n*size:(n+1)*size], y, cell)
				}
			}
		}
	}
}

// pair counts the rows of a cell about each percentile.
func (f *figures) pair(dst []joint, y *yearRows, cell cellSpan) {
	weight := y.weight[cell.from:cell.to]
	at := 0
	for n, v := range compared {
		usual, event := y.values[v.usual][cell.from:cell.to], y.values[v.event][cell.from:cell.to]
		for k := range f.quantiles[0][n] {
			a, b := f.quantiles[0][n][k].Value, f.quantiles[1][n][k].Value
			j := &dst[at]
			for i, w := range weight {
				x, z := usual[i], event[i]
				if x != x || z != z {
					continue
				}
				w *= w
				j.rows += w
				if x <= a {
					j.usual += w
					if z <= b {
						j.both += w
					}
				}
				if z <= b {
					j.event += w
				}
			}
			at++
		}
	}
}
