package output

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"sync"

	"cistern/output/stats"
)

// Everyone is the name of the row that takes all groups together.
const Everyone = "all"

// confidence of every interval of a summary.
const confidence = 0.95

// groupsJackknife is the number of jackknife groups: household id modulo it.
// A power of two; with 64 a standard error is itself known to about 9 %.
const groupsJackknife = 64

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
	By                []Dimension // what the table tells apart; none: one row set for everybody at all ages
	Bands             []Band      // age bands of [Summary.Bands]; nil for none
	Workers           int         // goroutines that call Add, at least 1
	MemoryBudget      int64       // bytes for values held at a time; 0 = DefaultMemoryBudget
}

// DefaultMemoryBudget is 256 MiB: enough to hold all values of about 100,000
// households over 76 ages.
const DefaultMemoryBudget = 256 << 20

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
	for i, p := range o.Percentiles {
		if !(p > 0 && p < 100) {
			bad("percentile %v, want above 0 and below 100", p)
		} else if slices.Contains(o.Percentiles[:i], p) {
			bad("percentile %v stands twice", p)
		}
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

// SummaryRows are the rows of one block of households, all their years alive,
// as for [Rows]: spans of constant age and group adjoin from 0 to N, and every
// column has N entries or more. Add keeps no reference.
type SummaryRows struct {
	First     int64 // id of the first household of the block
	N         int
	Spans     []Span
	Household []int64

	Income, Consumption, Assets []float64 // money
	Propensity                  []float64 // marginal propensity to consume; nil: left out
	AtLimit                     []bool    // borrowing limit binds; nil: left out
	TwinAssets                  []float64 // money, assets of the certain twin; nil: left out
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
// Every quantile is exact, whatever the number of passes; so are means, errors
// and shares. Results are the same bits for any number of workers and any order
// in which blocks are finished: sums of floats are formed within a block and
// folded in block order, all else is counted in integers.
//
// Several passes: the first counts values by sign, exponent and six bits of the
// mantissa, by age, group and variable. Each later pass looks only into the
// bins that hold a wanted order statistic, and either counts them by further
// bits or, when few values are left, collects them (radix selection). Three
// passes are usual, seven the most. Then the Gini coefficient follows from the
// counts and sums of the bins, with a bound on its error in the table's notes;
// its standard error, and the effect of pooling on the intervals of percentiles,
// from the first households of the panel, as many as a quarter of the budget holds.
type Summary struct {
	o       SummaryOptions
	cells   int // (age − FirstAge)·len(Groups) + group
	targets []target
	pass    int
	done    bool
	fault   error
	mu      sync.Mutex // guards spare, seen, fault

	seen    columns       // which optional columns every block had
	moments []cellSums    // by cell; written by commits only
	spare   []*blockSums  // partial sums to reuse
	store   store         // values of all or of the first households, until the first pass ends
	sampled int64         // households whose blocks were held
	hist    *histograms   // pass 1 where values do not fit; nil otherwise
	refine  *refinement   // later passes
	next    int64         // id from which the next commit must start
	results []valueResult // [target·variables + variable]
}

// columns says which optional columns are there.
type columns struct{ propensity, atLimit, twin, known bool }

// NewSummary prepares a summary. Whether the values are held in memory or need
// several passes follows from the options: households, ages and budget.
func NewSummary(o SummaryOptions) (*Summary, error) {
	if err := o.Validate(); err != nil {
		return nil, err
	}
	if o.MemoryBudget == 0 {
		o.MemoryBudget = DefaultMemoryBudget
	}
	o.Percentiles = slices.Sorted(slices.Values(o.Percentiles))
	s := &Summary{o: o, pass: 1}
	s.cells = (o.LastAge - o.FirstAge + 1) * len(o.Groups)
	s.targets = newTargets(o)
	s.moments = make([]cellSums, s.cells)
	s.results = make([]valueResult, len(s.targets)*variables)
	if s.valuesFit() {
		s.store.end = math.MaxInt64
	} else {
		years := int64(o.LastAge - o.FirstAge + 1)
		s.store.end = max(1, o.MemoryBudget/4/(years*storedBytes))
		s.hist = newHistograms(s.cells, o.Workers)
	}
	return s, nil
}

// sorters is how many pools of values are sorted at a time: fixed, so that the
// choice of method does not depend on the number of workers.
const sorters = 4

// valuesFit reports whether all values can be held, together with what sorting
// the largest pools of them takes.
func (s *Summary) valuesFit() bool {
	years := int64(s.o.LastAge - s.o.FirstAge + 1)
	widest := int64(1)
	for _, t := range s.targets {
		widest = max(widest, int64(t.last-t.first+1))
	}
	row := storedBytes*years + sortingBytes*widest*sorters
	return s.o.Households <= s.o.MemoryBudget/row
}

// Passes returns the number of passes begun so far.
func (s *Summary) Passes() int { return s.pass }

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
	if s.pass > 1 {
		return nil, s.fail(s.refine.add(worker, rows, s.cellOf))
	}
	sums := s.take()
	s.sum(sums, rows)
	var held *block
	if rows.First < s.store.end {
		held = newBlock(rows, s.cellOf)
	}
	if s.hist != nil {
		s.hist.add(worker, rows, s.cellOf)
	}
	first, past := rows.First, rows.First+1
	return func() error { return s.commit(first, past, sums, held) }, nil
}

// commit folds the sums of a block into those of the summary.
func (s *Summary) commit(first, past int64, sums *blockSums, held *block) error {
	if err := s.failed(); err != nil {
		return err
	}
	if first < s.next {
		return s.fail(fmt.Errorf("output: summary: block of household %d committed after that of household %d", first, s.next-1))
	}
	s.next = past
	for i := range sums.used {
		part := &sums.cells[i]
		if !part.finite() {
			age, group := s.ageGroup(part.cell)
			return s.fail(fmt.Errorf("output: summary: a value is not finite: group %s, age %d, block of household %d", s.o.Groups[group], age, first))
		}
		s.moments[part.cell].fold(part)
	}
	if held != nil {
		s.store.blocks = append(s.store.blocks, held)
		s.sampled += held.households
	}
	s.give(sums)
	return nil
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
	switch {
	case s.pass > 1:
		more, err = s.refine.end()
	case s.hist == nil:
		s.analyseStore(true)
	default:
		s.analyseStore(false)
		more, err = s.beginRefinement()
	}
	if err != nil {
		return false, s.fail(err)
	}
	s.store = store{}
	if more {
		s.pass++
		return true, nil
	}
	if s.refine != nil {
		s.refine.finish(s.results, s.rows)
		s.refine = nil
	}
	s.done = true
	return false, nil
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

// cellOf numbers the cell of a span.
func (s *Summary) cellOf(sp Span) int {
	return (int(sp.Age)-s.o.FirstAge)*len(s.o.Groups) + sp.Group
}

func (s *Summary) ageGroup(cell int) (age, group int) {
	return s.o.FirstAge + cell/len(s.o.Groups), cell % len(s.o.Groups)
}

// quantileType is the definition of every percentile of a summary.
const quantileType = stats.Type7
