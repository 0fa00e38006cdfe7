package contrast

import (
	"fmt"
	"math"
	"slices"
	"sync"

	"cistern/output/distribution"
	"cistern/output/stats"
)

// Contrast takes the rows of a population that lives twice and describes them. It
// asks for the same rows several times:
//
//	for more := true; more; {
//		// on any worker, any block: commit, err := c.Add(worker, rows)
//		// in ascending order of blocks, one at a time: err := commit()
//		more, err = c.EndPass()
//	}
//	table := c.Table()
//
// The calendar years are described as many at a time as fit the budget, each lot in
// one pass for the distributions and one for how the two worlds hang together. The
// result has the same bits for any number of workers.
type Contrast struct {
	o           Options
	percentiles []float64 // those asked for and the median
	targets     []target
	splitters   []*splitter // [worker]

	from, to int                   // the lot: years counted from the first
	studies  []*distribution.Study // [year−from]; nil: finished
	pairing  bool                  // the pass counts pairs
	joint    [][]joint             // [year−from][target·percentiles·compared] counted so far
	passes   int

	mu    sync.Mutex
	spare []*pairs

	fates   [trails][]*fates // [target]
	results []yearResults    // [year from the first]
}

// target is a group, or −1 for all, and a band of ages, or −1 for all.
type target struct{ group, band int }

// yearResults are the figures of one year: [target].
type yearResults []figures

// New prepares a contrast. Faults of the options are reported at once.
func New(o Options) (*Contrast, error) {
	if err := o.Validate(); err != nil {
		return nil, err
	}
	c := &Contrast{o: o, percentiles: o.Percentiles, results: make([]yearResults, o.LastYear-o.FirstYear+1)}
	if !slices.Contains(c.percentiles, 50) {
		c.percentiles = append(slices.Clone(o.Percentiles), 50)
	}
	var groups []int
	if len(o.Groups) > 1 {
		for g := range o.Groups {
			groups = append(groups, g)
		}
	}
	for _, g := range append(groups, -1) {
		for b := range o.Bands {
			c.targets = append(c.targets, target{g, b})
		}
		c.targets = append(c.targets, target{g, -1})
	}
	for range o.Workers {
		c.splitters = append(c.splitters, newSplitter(&c.o))
	}
	for k := range c.fates {
		for range c.targets {
			c.fates[k] = append(c.fates[k], newFates(o.LastYear))
		}
	}
	return c, c.begin(0)
}

// cell numbers a group and a band, or the lack of one.
func (c *Contrast) cell(group, band int) int { return group*(len(c.o.Bands)+1) + band }

// has reports whether the target takes in a group and band.
func (t target) has(group, band int) bool {
	return (t.group < 0 || t.group == group) && (t.band < 0 || t.band == band)
}

// begin prepares the lot of years that begins at from.
func (c *Contrast) begin(from int) error {
	c.from, c.to = from, min(from+c.o.batch(), len(c.results))
	c.studies, c.joint, c.pairing = nil, nil, false
	for range c.to - c.from {
		s, err := distribution.NewStudy(c.studyOptions())
		if err != nil {
			return fmt.Errorf("contrast: %w", err)
		}
		c.studies = append(c.studies, s)
	}
	return nil
}

// Passes returns the number of passes begun so far.
func (c *Contrast) Passes() int { return c.passes + 1 }

// Add takes the rows of a block on goroutine worker, 0 … Workers−1. Several workers
// may call it at once. Commits must be called one at a time in ascending order of
// blocks.
func (c *Contrast) Add(worker int, r *Rows) (commit func() error, err error) {
	s := c.splitters[worker]
	s.split(r, c.from, c.to)
	if c.pairing {
		p := c.take()
		p.count(c, s)
		return func() error { c.fold(p); return nil }, nil
	}
	var commits []func() error
	for i, study := range c.studies {
		if study == nil {
			continue
		}
		one, err := study.Add(worker, c.rowsOf(&s.years[c.from+i], r.First))
		if err != nil {
			return nil, err
		}
		if one != nil {
			commits = append(commits, one)
		}
	}
	var ends [trails][]*fates
	if c.passes == 0 {
		ends = c.ends(s, r)
	}
	return func() error {
		for _, commit := range commits {
			if err := commit(); err != nil {
				return err
			}
		}
		for k := range ends {
			for i, f := range ends[k] {
				if f != nil {
					c.fates[k][i].fold(f)
				}
			}
		}
		return nil
	}, nil
}

// rowsOf are a year's rows for its study.
func (c *Contrast) rowsOf(y *yearRows, first int64) *distribution.Rows {
	rows := &distribution.Rows{First: first, N: len(y.unit), Unit: y.unit, Values: y.values}
	if c.o.Weighted {
		rows.Weight = y.weight
	}
	for _, s := range y.cells {
		rows.Spans = append(rows.Spans, distribution.Span{Cell: c.cell(s.group, s.band), From: s.from, To: s.to})
	}
	return rows
}

// ends counts how the trails of a block's households end.
func (c *Contrast) ends(s *splitter, r *Rows) (ends [trails][]*fates) {
	for k := range ends {
		ends[k] = make([]*fates, len(c.targets))
	}
	for i := range s.past {
		p := &s.past[i]
		if !p.there {
			continue
		}
		for n, t := range c.targets {
			if !t.has(p.group, p.band) {
				continue
			}
			for k := range ends {
				if ends[k][n] == nil {
					ends[k][n] = newFates(c.o.LastYear)
				}
				ends[k][n].add(r.First+int64(i), p.weight, &p.trails[k])
			}
		}
	}
	return ends
}

// EndPass ends a pass over the rows and reports whether another is needed. When it
// is not, [Contrast.Table] is ready.
func (c *Contrast) EndPass() (more bool, err error) {
	c.passes++
	if !c.pairing {
		for i, s := range c.studies {
			if s == nil {
				continue
			}
			again, err := s.EndPass()
			if err != nil {
				return false, err
			}
			if more = more || again; !again {
				c.results[c.from+i] = c.figures(s)
				c.studies[i] = nil
			}
		}
		if more {
			return true, nil
		}
		c.pairing = true
		for range c.to - c.from {
			c.joint = append(c.joint, make([]joint, c.pairsAYear()))
		}
		return true, nil
	}
	for i := range c.to - c.from {
		c.settle(c.results[c.from+i], c.joint[i])
	}
	if c.to < len(c.results) {
		return true, c.begin(c.to)
	}
	return false, nil
}

// pairsAYear is how many pairs of percentiles a year has.
func (c *Contrast) pairsAYear() int { return len(c.targets) * len(compared) * len(c.percentiles) }

// settle sets the differences of percentiles.
func (c *Contrast) settle(list yearResults, joint []joint) {
	at := 0
	for i := range list {
		f := &list[i]
		for n := range compared {
			for k, p := range c.percentiles {
				f.gaps[n] = append(f.gaps[n], gap(f.quantiles[0][n][k], f.quantiles[1][n][k], joint[at].correlation(p/100)))
				at++
			}
		}
	}
}

// recoveryOf returns, of a target, when a figure is back: of gets what it usually
// is and the difference in a year.
func (c *Contrast) recoveryOf(of func(f yearResults) (usual, gap stats.Estimate)) stats.Estimate {
	var usual, gaps []stats.Estimate
	for _, year := range c.results[-c.o.FirstYear:] {
		u, g := of(year)
		if math.IsNaN(g.Value) {
			return nothing
		}
		usual, gaps = append(usual, u), append(gaps, g)
	}
	return back(usual, gaps, c.o.Within)
}
