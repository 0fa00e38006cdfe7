package mobility

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"cistern/output"
	"cistern/output/distribution"
)

// Parts is the number of jackknife groups: household id modulo it.
const Parts = distribution.Groups

// DefaultHeld is 131,072 households: 3 MiB.
const DefaultHeld = 1 << 17

// budget is the memory for assets while limits are looked for.
const budget = 32 << 20

// Options says which ages and classes a [Study] compares.
type Options struct {
	FromAge, ToAge int      // FromAge < ToAge
	Quantiles      int      // classes, 2 to 100
	Groups         []string // names of the groups, in the order of output.Span.Group
	Households     int64    // of the panel, ids 0 … Households−1
	Workers        int      // goroutines that call Add, at least 1
	Held           int64    // a panel of at most so many households is held in one pass; 0: DefaultHeld
}

// Validate reports every fault of the options at once.
func (o Options) Validate() error {
	var errs []error
	bad := func(format string, a ...any) { errs = append(errs, fmt.Errorf("mobility: "+format, a...)) }
	if o.FromAge < 0 || o.ToAge <= o.FromAge {
		bad("from age %d to %d, want ascending ages", o.FromAge, o.ToAge)
	}
	if o.Quantiles < 2 || o.Quantiles > 100 {
		bad("%d quantiles, want 2 to 100", o.Quantiles)
	}
	if len(o.Groups) == 0 || o.Households < 1 || o.Workers < 1 || o.Held < 0 {
		bad("%d groups, %d households, %d workers, %d held: want at least 1 group, household and worker, and not less than 0 held",
			len(o.Groups), o.Households, o.Workers, o.Held)
	}
	return errors.Join(errs...)
}

// Rows are the rows of one block of households, all their years alive.
type Rows struct {
	First     int64 // id of the first household of the block
	N         int
	Spans     []output.Span // stretches of one age and group
	Household []int64
	Assets    []float64 // money, at the end of the year
}

// Study reduces the rows of a panel to mobility matrices, in one pass over its
// blocks or in several over the same:
//
//	for more := true; more; {
//		// on any worker, any block: commit, err := s.Add(worker, rows)
//		// in ascending block order, one at a time: err := commit()
//		more, err = s.EndPass()
//	}
//
// Results are the same bits for any number of workers.
type Study struct {
	o      Options
	levels []float64           // of the limits and of the windows about them, in percent
	limits *distribution.Study // nil once they are found
	held   []pair              // everybody, where they are few; written by commits only
	phase  phase
	passes int
	places [][]float64 // [worker] assets at the first age, by place in the block
	edges  []edges     // [target], once found
	counts [][]counts  // [worker][target]
	matrix []Matrix    // [target], when done
}

// phase is what a pass does.
type phase int

const (
	limiting phase = iota // limits of classes
	counting              // households between them
	done
)

// pair is a household alive at both ages.
type pair struct {
	assets [2]float64 // at the first age and at the second
	group  int32
	part   int32
}

// NewStudy prepares a study.
func NewStudy(o Options) (*Study, error) {
	if err := o.Validate(); err != nil {
		return nil, err
	}
	if o.Held == 0 {
		o.Held = DefaultHeld
	}
	s := &Study{o: o, passes: 1, places: make([][]float64, o.Workers)}
	for i := 1; i < o.Quantiles; i++ {
		for _, shift := range []float64{-window, 0, window} {
			s.levels = append(s.levels, (float64(i)+shift)*100/float64(o.Quantiles))
		}
	}
	wants := []distribution.Set{distribution.Percentiles, distribution.Percentiles}
	d := distribution.Options{Variables: []distribution.Variable{{Name: "assets at the first age", Held: true}, {Name: "assets at the second age", Held: true}},
		Cells: len(o.Groups), Percentiles: s.levels, Rows: o.Households, Workers: o.Workers, Budget: budget}
	everybody := distribution.Target{Wants: wants, Independent: true}
	for g := range o.Groups {
		cell := distribution.Cell{Index: g, Weight: 1}
		d.Targets = append(d.Targets, distribution.Target{Cells: []distribution.Cell{cell}, Wants: wants, Independent: true})
		everybody.Cells = append(everybody.Cells, cell)
	}
	d.Targets = append(d.Targets, everybody)
	var err error
	s.limits, err = distribution.NewStudy(d)
	return s, err
}

// Passes returns the number of passes begun so far.
func (s *Study) Passes() int { return s.passes }

// Add takes the rows of a block on goroutine worker, 0 … Workers−1. Several workers
// may call it at once. commit may be nil; if not, commits must be called one at a
// time in ascending order of blocks.
func (s *Study) Add(worker int, r *Rows) (commit func() error, err error) {
	pairs := s.pair(worker, r)
	if s.phase == counting {
		s.count(worker, pairs)
		return nil, nil
	}
	find, err := s.limits.Add(worker, columns(r.First, pairs))
	if err != nil || s.o.Households > s.o.Held {
		return find, err
	}
	return func() error {
		s.held = append(s.held, pairs...)
		if find != nil {
			return find()
		}
		return nil
	}, nil
}

// pair finds the households of a block that are alive at both ages.
func (s *Study) pair(worker int, r *Rows) []pair {
	at := s.places[worker]
	for i := range at {
		at[i] = math.NaN()
	}
	n := 0
	for _, sp := range r.Spans {
		switch int(sp.Age) {
		case s.o.FromAge:
			for k := sp.From; k < sp.To; k++ {
				place := int(r.Household[k] - r.First)
				for place >= len(at) {
					at = append(at, math.NaN())
				}
				at[place] = r.Assets[k]
			}
		case s.o.ToAge:
			n += sp.To - sp.From
		}
	}
	s.places[worker] = at
	pairs := make([]pair, 0, n)
	for _, sp := range r.Spans {
		if int(sp.Age) != s.o.ToAge {
			continue
		}
		for k := sp.From; k < sp.To; k++ {
			if place := int(r.Household[k] - r.First); place < len(at) && at[place] == at[place] {
				pairs = append(pairs, pair{[2]float64{at[place], r.Assets[k]}, int32(sp.Group), int32(r.Household[k] % Parts)})
			}
		}
	}
	return pairs
}

// columns are pairs as rows of the study of limits; groups must adjoin.
func columns(first int64, pairs []pair) *distribution.Rows {
	slices.SortStableFunc(pairs, func(a, b pair) int { return int(a.group - b.group) })
	rows := &distribution.Rows{First: first, N: len(pairs), Values: make([][]float64, 2)}
	for i, p := range pairs {
		if i == 0 || p.group != pairs[i-1].group {
			rows.Spans = append(rows.Spans, distribution.Span{Cell: int(p.group), From: i})
		}
		rows.Spans[len(rows.Spans)-1].To = i + 1
		rows.Unit = append(rows.Unit, int64(p.part))
		rows.Values[0], rows.Values[1] = append(rows.Values[0], p.assets[0]), append(rows.Values[1], p.assets[1])
	}
	return rows
}

// EndPass ends a pass over the blocks and reports whether another is needed. When
// it is not, [Study.Matrices] is ready.
func (s *Study) EndPass() (more bool, err error) {
	switch s.phase {
	case done:
		return false, nil
	case counting:
		s.finish()
		return false, nil
	}
	if more, err = s.limits.EndPass(); err != nil {
		return false, err
	}
	if !more {
		s.beginCounting()
		if s.o.Households <= s.o.Held {
			s.count(0, s.held)
			s.finish()
			return false, nil
		}
	}
	s.passes++
	return true, nil
}

// targets are the groups and, last, everybody.
func (s *Study) targets() int { return len(s.o.Groups) + 1 }
