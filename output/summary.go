package output

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"sync"

	"cistern/output/distribution"
)

// Everyone is the name of the row that takes all groups together.
const Everyone = "all"

// confidence of every interval.
const confidence = 0.95

// groupsJackknife is the number of jackknife groups: household id modulo it.
// A power of two; with 64 a standard error is itself known to about 9 %.
const groupsJackknife = distribution.Groups

// Dimension is what a summary tells apart.
type Dimension int

// The dimensions of a summary.
const (
	ByAge Dimension = iota
	ByGroup
)

// String returns "age" or "group".
func (d Dimension) String() string {
	switch d {
	case ByAge:
		return "age"
	case ByGroup:
		return "group"
	}
	return fmt.Sprintf("Dimension(%d)", int(d))
}

// Band is a range of ages, both ends included.
type Band struct{ First, Last int }

// String returns "25-34".
func (b Band) String() string { return fmt.Sprintf("%d-%d", b.First, b.Last) }

// DefaultBands cuts the ages first … last into bands of ten years, the last one
// shorter where they do not fit.
func DefaultBands(first, last int) []Band {
	var bands []Band
	for a := first; a <= last; a += 10 {
		bands = append(bands, Band{a, min(a+9, last)})
	}
	return bands
}

// SummaryOptions says what a [Summary] is about. All ages and groups of the
// panel must be declared; the zero value is rejected.
type SummaryOptions struct {
	FirstAge, LastAge int
	Groups            []string    // names of the groups, in the order of Span.Group; "all" is taken
	Households        int64       // households of the panel, for the choice of method only
	Percentiles       []float64   // in percent, each above 0 and below 100
	Lorenz            []float64   // poorest shares, in percent, above 0 and below 100
	TopShares         []float64   // richest shares, in percent, above 0 and below 100
	Shortfalls        []float64   // worst shares, in percent, above 0 and at most 100
	Tail              float64     // upper share whose tail index is wanted, in percent, below 100; 0: none
	Runway            []float64   // months, above 0: share of households whose assets pay for less
	Falls             []float64   // in percent, above 0: share of households whose consumption falls by more
	Growth            float64     // of births, a year, above −1: a household counts (1+Growth)^−(age − FirstAge) where ages are taken together
	By                []Dimension // what the table tells apart beside all ages together; none: everybody
	Bands             []Band      // age bands of [Summary.Bands]; nil for none
	Workers           int         // goroutines that call Add, at least 1
	MemoryBudget      int64       // bytes for values held at a time; 0 = DefaultMemoryBudget
}

// DefaultMemoryBudget is 256 MiB: enough to hold all values of about 100,000
// households over 76 ages.
const DefaultMemoryBudget = distribution.DefaultBudget

// Validate reports every fault of the options at once.
func (o SummaryOptions) Validate() error {
	var errs []error
	bad := func(format string, a ...any) { errs = append(errs, fmt.Errorf("output: summary: "+format, a...)) }
	if o.FirstAge < 0 || o.LastAge < o.FirstAge || o.LastAge > 1000 {
		bad("ages %d to %d, want an ascending range from 0 on", o.FirstAge, o.LastAge)
	}
	if len(o.Groups) == 0 {
		bad("no groups, want at least one name")
	}
	if slices.Contains(o.Groups, Everyone) {
		bad("a group is called %q, which stands for all groups together", Everyone)
	}
	if o.Households < 1 || o.Households >= math.MaxUint32 {
		bad("households is %d, want 1 to %d", o.Households, uint32(math.MaxUint32-1))
	}
	for _, l := range []struct {
		name   string
		levels []float64
		most   string
	}{{"percentile", o.Percentiles, "below 100"}, {"lorenz", o.Lorenz, "below 100"}, {"top share", o.TopShares, "below 100"}, {"shortfall", o.Shortfalls, "at most 100"}} {
		for i, p := range l.levels {
			if !(p > 0 && (p < 100 || p == 100 && l.most == "at most 100")) {
				bad("%s %v, want above 0 and %s", l.name, p, l.most)
			} else if slices.Contains(l.levels[:i], p) {
				bad("%s %v stands twice", l.name, p)
			}
		}
	}
	for _, l := range []struct {
		name   string
		levels []float64
	}{{"runway", o.Runway}, {"fall", o.Falls}} {
		for i, x := range l.levels {
			if !(x > 0) || math.IsInf(x, 1) {
				bad("%s %v, want above 0", l.name, x)
			} else if slices.Contains(l.levels[:i], x) {
				bad("%s %v stands twice", l.name, x)
			}
		}
	}
	if !(o.Tail >= 0 && o.Tail < 100) {
		bad("tail of %v percent, want 0 (none) or more, below 100", o.Tail)
	}
	if !(o.Growth > -1 && o.Growth < 1) {
		bad("growth of %v, want above -1 and below 1", o.Growth)
	}
	for i, d := range o.By {
		if (d != ByAge && d != ByGroup) || slices.Contains(o.By[:i], d) {
			bad("by %v is unknown or stands twice, want age and group at most once each", d)
		}
	}
	for _, b := range o.Bands {
		if b.First > b.Last || b.First < o.FirstAge || b.Last > o.LastAge {
			bad("age band %v, want a range within %d to %d", b, o.FirstAge, o.LastAge)
		}
	}
	if o.Workers < 1 {
		bad("workers is %d, want at least 1", o.Workers)
	}
	if o.MemoryBudget < 0 {
		bad("memory budget of %d bytes, want 0 (default) or more", o.MemoryBudget)
	}
	return errors.Join(errs...)
}

// Summary reduces the rows of a panel to a tidy table. It needs one pass over
// the blocks of the panel, or, where the values exceed the memory budget,
// several passes over the same blocks:
//
//	for more := true; more; {
//		// on any worker, any block: commit, err := s.Add(worker, rows)
//		// in ascending block order, one at a time: err := commit()
//		more, err = s.EndPass()
//	}
//	table := s.Table()
//
// The method is that of [distribution.Study]: a cell is an age and a group, a unit
// a household. Every quantile is exact, whatever the number of passes; so are
// means, shares of the total, tails and errors. Results are the same bits for any
// number of workers and any order in which blocks are finished.
//
// In several passes the Gini coefficient follows from counts and sums of bins,
// with a bound on its error in the table's notes; its standard error, and the
// effect of pooling on the intervals of percentiles, from a sample of households,
// as many as a quarter of the budget holds.
type Summary struct {
	o       SummaryOptions
	targets []target
	spaces  []workspace // by worker
	done    bool

	mu        sync.Mutex // guards what follows until the first block is there
	fault     error
	variables []summaryVariable   // that the blocks have
	study     *distribution.Study // of those
}

// NewSummary prepares a summary. Whether the values are held in memory or need
// several passes follows from the options (households, ages and budget) and from
// the columns of the first block.
func NewSummary(o SummaryOptions) (*Summary, error) {
	if err := o.Validate(); err != nil {
		return nil, err
	}
	for _, l := range []*[]float64{&o.Percentiles, &o.Lorenz, &o.Shortfalls, &o.Runway, &o.Falls} {
		*l = slices.Sorted(slices.Values(*l))
	}
	o.TopShares = slices.Clone(o.TopShares)
	s := &Summary{o: o, spaces: make([]workspace, o.Workers)}
	s.targets = newTargets(&s.o)
	return s, nil
}

// Passes returns the number of passes begun so far.
func (s *Summary) Passes() int {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.study == nil {
		return 1
	}
	return s.study.Passes()
}

// Add takes the rows of a block on goroutine worker, 0 … Workers−1. Several
// workers may call it at once. commit may be nil; if not, commits must be
// called one at a time in ascending order of blocks.
//
// A value that is not finite, or rows that do not fit the options, are errors
// and end the summary: every later call returns the first error.
func (s *Summary) Add(worker int, rows *SummaryRows) (commit func() error, err error) {
	if worker < 0 || worker >= s.o.Workers {
		panic(fmt.Sprintf("output: worker %d of %d", worker, s.o.Workers))
	}
	if s.done {
		panic("output: rows added to a finished summary")
	}
	if err := s.failed(); err != nil {
		return nil, err
	}
	if err := s.check(rows); err != nil {
		return nil, s.fail(err)
	}
	if rows.N == 0 {
		return nil, nil
	}
	fold, err := s.study.Add(worker, s.translate(&s.spaces[worker], rows))
	if err != nil {
		return nil, s.fail(s.explain(err))
	}
	if fold == nil {
		return nil, nil
	}
	return func() error {
		if err := fold(); err != nil {
			return s.fail(s.explain(err))
		}
		return nil
	}, nil
}

// explain says in the terms of the panel where a value is that is not finite.
func (s *Summary) explain(err error) error {
	var v *distribution.ValueError
	if errors.As(err, &v) {
		age, group := s.o.FirstAge+v.Cell/len(s.o.Groups), v.Cell%len(s.o.Groups)
		return fmt.Errorf("output: summary: a value of %s is not finite: group %s, age %d, block of household %d", v.Variable, s.o.Groups[group], age, v.Block)
	}
	return fmt.Errorf("output: summary: %w", err)
}

// EndPass ends a pass over the blocks and reports whether another is needed.
// When it is not, [Summary.Table] and [Summary.Bands] are ready.
func (s *Summary) EndPass() (more bool, err error) {
	if err := s.failed(); err != nil {
		return false, err
	}
	if s.done {
		return false, nil
	}
	if s.study == nil { // no blocks
		if err := s.settle(&SummaryRows{}, fmt.Errorf); err != nil {
			return false, s.fail(err)
		}
	}
	if more, err = s.study.EndPass(); err != nil {
		return false, s.fail(s.explain(err))
	}
	s.done = !more
	return more, nil
}

func (s *Summary) failed() error {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.fault
}

func (s *Summary) fail(err error) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.fault == nil {
		s.fault = err
	}
	return err
}
