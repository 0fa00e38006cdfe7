package distribution

import (
	"fmt"
	"math"
	"sync"
)

// Study describes targets over the rows it is given. It needs one pass over the
// rows, or, where their values exceed the memory budget, several over the same:
//
//	for more := true; more; {
//		// on any worker, any block: commit, err := s.Add(worker, rows)
//		// in ascending order of blocks, one at a time: err := commit()
//		more, err = s.EndPass()
//	}
//	result := s.Target(0)
//
// A panel that does not fit takes three passes as a rule, more where memory is short.
type Study struct {
	o      Options
	held   []int // variables whose distribution some target wants
	slot   []int // [variable] place in held, −1: none
	spread []int // variables of which every row has a value and weighs 1, with their standard deviation
	level  []int // the same without
	gappy  []int // all others
	stored []int // variables that the store keeps: held ones, and Means
	phase  phase
	passes int
	fault  error
	mu     sync.Mutex // guards spare and fault

	moments []cellSums   // by cell; written by commits only
	spare   []*blockSums // partial sums to reuse
	chance  uint64       // units whose hash is lower are in the store
	store   store        // values of all rows or of a sample, until they are analysed
	sampled int64        // rows in the store
	hist    *histograms  // first pass where values do not fit; nil otherwise
	refine  *refinement  // later passes
	sets    *classSets   // last pass: partial sums
	next    int64        // place from which the next commit must start
	results []result     // [target·len(held) + slot]
}

// phase is what a pass does.
type phase int

const (
	measuring phase = iota // moments, and values or their histograms
	refining               // order statistics
	summing                // partial sums between them
	done
)

// NewStudy prepares a study. Whether the values are held in memory or need several
// passes follows from the options: rows, variables and budget. Weighted rows that
// do not fit are an error.
func NewStudy(o Options) (*Study, error) {
	if err := o.Validate(); err != nil {
		return nil, err
	}
	if o.Budget == 0 {
		o.Budget = DefaultBudget
	}
	s := &Study{o: o, passes: 1, slot: make([]int, len(o.Variables)), moments: make([]cellSums, o.Cells)}
	for v, variable := range o.Variables {
		s.slot[v] = -1
		if variable.Held {
			s.slot[v] = len(s.held)
			s.held = append(s.held, v)
		}
		switch {
		case o.Weighted || variable.Optional:
			s.gappy = append(s.gappy, v)
		case variable.MeanOnly:
			s.level = append(s.level, v)
		default:
			s.spread = append(s.spread, v)
		}
	}
	s.stored = append(s.stored, s.held...)
	for _, m := range o.Means {
		if s.slot[m] < 0 {
			s.stored = append(s.stored, m)
		}
	}
	s.results = make([]result, len(o.Targets)*len(s.held))
	row := s.bytesPerRow()
	switch {
	case float64(o.Rows)*row <= float64(o.Budget):
		s.chance = math.MaxUint64
	case o.Weighted:
		return nil, &MemoryError{Need: int64(float64(o.Rows) * row), Budget: o.Budget}
	default:
		room := float64(o.Budget) / 4 / float64(valueBytes*len(s.stored)+rowBytes)
		s.chance = uint64(min(0.999, room/float64(o.Rows)) * (1 << 63) * 2)
		s.hist = newHistograms(o.Cells, len(s.held), o.Workers, o.Budget)
	}
	return s, nil
}

// A MemoryError says that weighted rows need more memory than they may take.
type MemoryError struct{ Need, Budget int64 }

func (e *MemoryError) Error() string {
	return fmt.Sprintf("distribution: weighted rows are held in memory: they need about %d MiB, and may take %d", e.Need>>20+1, e.Budget>>20)
}

// bytesPerRow is what a row takes that is held and sorted.
func (s *Study) bytesPerRow() float64 {
	widest := 0
	for _, t := range s.o.Targets {
		widest = max(widest, len(t.Cells))
	}
	b := float64(valueBytes*len(s.stored) + rowBytes)
	if s.o.Weighted {
		b += weightBytes + sortingBytes // the weights are sorted too
	}
	share := float64(widest) / float64(s.o.Cells)
	return b + sortingBytes*(share+min(share, smallShare)*(sorters-1))
}

// Passes returns the number of passes begun so far.
func (s *Study) Passes() int { return s.passes }

// Sampled returns how many rows the errors of Gini coefficients and the design
// effects come from, where several passes were made; otherwise 0.
func (s *Study) Sampled() int64 {
	if s.passes == 1 {
		return 0
	}
	return s.sampled
}

// Add takes the rows of a block on goroutine worker, 0 … Workers−1. Several
// workers may call it at once. commit may be nil; if not, commits must be called
// one at a time in ascending order of blocks.
//
// A value that is not finite, or rows that do not fit the options, are errors and
// end the study: every later call returns the first error.
func (s *Study) Add(worker int, rows *Rows) (commit func() error, err error) {
	if worker < 0 || worker >= s.o.Workers {
		panic(fmt.Sprintf("distribution: worker %d of %d", worker, s.o.Workers))
	}
	if s.phase == done {
		panic("distribution: rows added to a finished study")
	}
	if err := s.failed(); err != nil {
		return nil, err
	}
	if err := s.check(rows); err != nil {
		return nil, s.fail(err)
	}
	switch s.phase {
	case refining:
		if err := s.refine.add(worker, rows, s.held); err != nil {
			return nil, s.fail(err)
		}
		fallthrough
	case summing:
		if s.sets == nil {
			return nil, nil
		}
		s.sets.add(worker, rows.Spans, rows.Values, s.held, rows.Unit, nil, nil)
		return nil, nil
	}
	sums := s.take()
	s.sum(sums, rows)
	var kept *block
	if s.hist == nil {
		kept = s.newBlock(rows)
	} else {
		kept = s.newSample(rows)
	}
	if s.hist != nil {
		s.hist.add(worker, rows, s.held, s.o.Variables)
	}
	first := rows.First
	return func() error { return s.commit(first, sums, kept) }, nil
}

// commit folds the sums of a block into those of the study.
func (s *Study) commit(first int64, sums *blockSums, kept *block) error {
	if err := s.failed(); err != nil {
		return err
	}
	if first < s.next {
		return s.fail(fmt.Errorf("distribution: block %d committed after block %d", first, s.next-1))
	}
	s.next = first + 1
	for i := range sums.used {
		part := &sums.cells[i]
		if v, ok := part.finite(); !ok {
			return s.fail(&ValueError{Variable: s.o.Variables[v].Name, Cell: part.cell, Block: first})
		}
		to := &s.moments[part.cell]
		if to.vars == nil {
			to.reset(part.cell, s)
		}
		to.fold(part, 1)
	}
	if kept != nil {
		s.store.blocks = append(s.store.blocks, kept)
		s.sampled += int64(len(kept.tags))
	}
	s.give(sums)
	return nil
}

// A ValueError is a value that is not finite, or sums of values that are not.
type ValueError struct {
	Variable string
	Cell     int
	Block    int64
}

func (e *ValueError) Error() string {
	return fmt.Sprintf("distribution: a value of %s is not finite (cell %d, block %d)", e.Variable, e.Cell, e.Block)
}

// EndPass ends a pass over the rows and reports whether another is needed. When
// it is not, [Study.Target] is ready.
func (s *Study) EndPass() (more bool, err error) {
	if err := s.failed(); err != nil {
		return false, err
	}
	switch s.phase {
	case measuring:
		more, err = s.endMeasuring()
	case refining:
		if more, err = s.refine.end(s.results); err == nil {
			more, err = s.goOn(more)
		}
	case summing:
		err = s.sets.settle(s.results)
		s.sets = nil
	}
	if err != nil {
		return false, s.fail(err)
	}
	if more {
		s.passes++
		return true, nil
	}
	s.phase = done
	return false, nil
}

// endMeasuring analyses what is held, and prepares to look for the rest.
func (s *Study) endMeasuring() (more bool, err error) {
	for k := range s.results {
		s.size(k)
	}
	s.spare = nil
	whole := s.hist == nil
	s.analyseStore(whole)
	if whole {
		if s.sets = s.newClassSets(known); s.sets != nil {
			s.replay()
			err = s.sets.settle(s.results)
			s.sets = nil
		}
		s.store = store{}
		return false, err
	}
	s.store = store{}
	s.phase = refining
	return s.goOn(s.beginRefinement())
}

// goOn prepares the next pass after one that looked for order statistics. If that
// will collect all that are left, partial sums are formed in the same pass: only
// rows as near to a threshold as those collected have to wait for it to be known.
func (s *Study) goOn(more bool) (bool, error) {
	if more {
		if s.refine.last {
			s.sets = s.newClassSets(s.refine.where)
		}
		return true, nil
	}
	s.refine.finish(s.results)
	s.refine = nil
	if s.sets != nil {
		err := s.sets.settle(s.results)
		s.sets = nil
		return false, err
	}
	s.phase = summing
	s.sets = s.newClassSets(known)
	return s.sets != nil, nil
}

// replay sends the rows held through the partial sums.
func (s *Study) replay() {
	var wg sync.WaitGroup
	blocks := s.store.blocks
	for w := range s.o.Workers {
		wg.Go(func() {
			values := make([][]float64, len(s.o.Variables))
			for i := w; i < len(blocks); i += s.o.Workers {
				for k, v := range s.stored {
					values[v] = blocks[i].values[k]
				}
				s.sets.add(w, blocks[i].spans, values, s.held, nil, blocks[i].tags, blocks[i].weights)
			}
		})
	}
	wg.Wait()
}

func (s *Study) failed() error {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.fault
}

func (s *Study) fail(err error) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.fault == nil {
		s.fault = err
	}
	return err
}
