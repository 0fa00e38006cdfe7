package sim

import (
	"context"
	"fmt"
	"math"
	"runtime/debug"
	"sync"
	"sync/atomic"
)

// Options says how to simulate. The zero value simulates everybody on one
// worker.
type Options struct {
	Workers int     // goroutines, at least 1; 0 counts as 1
	Columns Columns // optional columns to fill
	From    int64   // first household id; a multiple of Unit
	To      int64   // one past the last id; 0: all
	Event   *Event  // what households meet; nil: nothing

	// Only, if set, picks households: the others are left out, and who is picked lives
	// as without it. It must be safe for concurrent use.
	Only func(id int64) bool

	// OnProgress, if set, is called after every block, one call at a time, with the
	// number of households done and to do.
	OnProgress func(done, total int64)
}

// Work handles a block on the goroutine of a worker (0 … Workers−1). The function
// it returns, if not nil, is called in ascending order of blocks, one at a time.
type Work func(worker int, b *Block) (commit func() error, err error)

// Count says how much was simulated.
type Count struct {
	Households     int64
	HouseholdYears int64
	AboveTop       int64 // household-years above the top of their rule's grid
}

func (c *Count) add(d Count) {
	c.Households += d.Households
	c.HouseholdYears += d.HouseholdYears
	c.AboveTop += d.AboveTop
}

// Result counts what was simulated, in all and by group. After an error it covers
// the blocks that were committed.
type Result struct {
	Count
	Groups      []Count // [group]
	HighestCash float64 // money; 0 if nobody was simulated
}

// Simulate draws the households of p and hands them to work block by block. The
// rows do not depend on the number of workers. Memory does not grow with the
// number of households: each worker keeps one block.
//
// It returns an error if p is invalid, if a household comes to a state that its
// utility does not allow (*StateError), if work or a commit fails or panics, or,
// wrapping context.Cause(ctx), within a block of the end of ctx. An error counts
// in its block's turn: whatever the number of workers, the blocks before it are
// committed and those after it are not.
func Simulate(ctx context.Context, p *Population, o Options, work Work) (Result, error) {
	if err := p.Validate(); err != nil {
		return Result{}, err
	}
	if o.To == 0 {
		o.To = p.Households
	}
	if o.From < 0 || o.From%Unit != 0 || o.To < o.From || o.To > p.Households {
		return Result{}, fmt.Errorf("sim: households %d to %d: want a range within 0 to %d that begins at a multiple of %d", o.From, o.To, p.Households, Unit)
	}
	if o.Event != nil {
		if err := o.Event.validate(p, o.Columns); err != nil {
			return Result{}, err
		}
	}
	r := newRunner(ctx, p, o, work)
	var wg sync.WaitGroup
	blocks := (o.To - o.From + Unit - 1) / Unit
	for w := range int(min(int64(max(1, o.Workers)), blocks)) {
		wg.Add(1)
		go func() {
			defer wg.Done()
			r.worker(w)
		}()
	}
	wg.Wait()
	if r.err == nil && ctx.Err() != nil && r.committed < o.To {
		r.err = fmt.Errorf("sim: stopped after %d of %d households: %w", r.committed-o.From, o.To-o.From, context.Cause(ctx))
	}
	return r.result, r.err
}

// runner shares blocks out and commits them in order.
type runner struct {
	ctx  context.Context
	p    *Population
	o    Options
	work Work
	plan *plan

	next   atomic.Int64 // first id not yet taken
	failed atomic.Bool  // no further blocks are begun

	mu        sync.Mutex // guards what follows; held while a block is committed
	turn      *sync.Cond // a block was committed, or the run has failed
	committed int64      // first id not yet committed
	err       error
	result    Result
}

func newRunner(ctx context.Context, p *Population, o Options, work Work) *runner {
	r := &runner{ctx: ctx, p: p, o: o, work: work, plan: newPlan(p, o.Columns, o.Event), committed: o.From,
		result: Result{Groups: make([]Count, len(p.Groups))}}
	r.next.Store(o.From)
	r.turn = sync.NewCond(&r.mu)
	return r
}

// worker simulates blocks until there is none left.
func (r *runner) worker(w int) {
	c := newCrew(r.plan, r.o.Columns, r.o.Only)
	for {
		first, ok := r.take()
		if !ok || !r.block(w, c, first) {
			return
		}
	}
}

// block simulates and commits the block that begins at household first. It
// reports whether the run goes on. A panic in it, or the end of its goroutine,
// ends the run, not the program.
func (r *runner) block(w int, c *crew, first int64) (ok bool) {
	finished := false
	defer func() {
		if e := recover(); e != nil {
			r.fail(first, fmt.Errorf("sim: households from %d: panic: %v\n%s", first, e, debug.Stack()))
		} else if !finished {
			r.fail(first, fmt.Errorf("sim: households from %d: the work on them ended its goroutine", first))
		}
	}()
	err := c.block(first, int(min(Unit, r.o.To-first)))
	var commit func() error
	if err == nil {
		commit, err = r.work(w, &c.out)
	}
	if err != nil {
		r.fail(first, err)
	} else {
		ok = r.commit(first, c, commit)
	}
	finished = true
	return ok
}

// take hands out the next block.
func (r *runner) take() (first int64, ok bool) {
	if r.failed.Load() || r.ctx.Err() != nil {
		return 0, false
	}
	first = r.next.Add(Unit) - Unit
	return first, first < r.o.To
}

// await waits until it is the turn of the block that begins at first, or the run
// has failed before it: it reports which. Waiting bounds the memory: a worker
// cannot run ahead. mu is held.
func (r *runner) await(first int64) bool {
	for r.committed < first && r.err == nil {
		r.turn.Wait()
	}
	return r.err == nil
}

// commit commits a block in its turn. It reports whether the run goes on.
func (r *runner) commit(first int64, c *crew, commit func() error) bool {
	r.mu.Lock()
	defer r.mu.Unlock()
	if !r.await(first) {
		return false
	}
	if commit != nil {
		if err := commit(); err != nil {
			r.setError(err)
			return false
		}
	}
	r.committed = first + Unit
	if lived := !math.IsInf(c.highestCash, -1); lived && (r.result.Households == 0 || c.highestCash > r.result.HighestCash) {
		r.result.HighestCash = c.highestCash
	}
	for g, n := range c.counts {
		r.result.Groups[g].add(n)
		r.result.add(n)
	}
	r.turn.Broadcast()
	if r.o.OnProgress != nil {
		r.o.OnProgress(min(r.committed, r.o.To)-r.o.From, r.o.To-r.o.From)
	}
	return true
}

// fail ends the run with err in the turn of the block that begins at first.
func (r *runner) fail(first int64, err error) {
	r.mu.Lock()
	defer r.mu.Unlock()
	r.failed.Store(true) // no further blocks are begun
	if r.await(first) {
		r.setError(err)
	}
}

// setError notes the first error and wakes whoever waits; mu is held.
func (r *runner) setError(err error) {
	r.err = err
	r.failed.Store(true)
	r.turn.Broadcast()
}
