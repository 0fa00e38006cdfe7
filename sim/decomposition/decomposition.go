package decomposition

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"sync"
	"sync/atomic"

	"cistern/policy"
	"cistern/sim"
)

// Cause is a reason to hold wealth.
type Cause int

// The causes that can be removed.
const (
	IncomeRisk Cause = iota
	LongevityRisk
	BorrowingLimit
)

// String returns the name used in scenario files.
func (c Cause) String() string {
	switch c {
	case IncomeRisk:
		return "income_risk"
	case LongevityRisk:
		return "longevity_risk"
	case BorrowingLimit:
		return "borrowing_limit"
	}
	return fmt.Sprintf("Cause(%d)", int(c))
}

// Options says what to remove, and how to work.
type Options struct {
	Order      []Cause        // each at most once
	Households int64          // the first so many; 0: all
	Solver     policy.Options // for the problems without the causes
	Workers    int            // goroutines, at least 1; 0 counts as 1

	// OnProgress, if set, is called with what is under way, one call at a time.
	OnProgress func(stage string, done, total int64)
}

// Validate reports every fault at once.
func (o Options) Validate() error {
	var errs []error
	bad := func(format string, a ...any) {
		errs = append(errs, fmt.Errorf("decomposition: "+format, a...))
	}
	if len(o.Order) == 0 {
		bad("nothing to remove")
	}
	for i, c := range o.Order {
		if c < IncomeRisk || c > BorrowingLimit || slices.Contains(o.Order[:i], c) {
			bad("%v is no cause or stands twice", c)
		}
	}
	if o.Households < 0 {
		bad("%d households, want at least 1, or 0 for all", o.Households)
	}
	return errors.Join(errs...)
}

// Parts is the number of parts in which households are summed, by their id modulo
// it: sums without one part at a time give jackknife errors.
const Parts = 64

// Cell are the sums of one age and group.
type Cell struct {
	Alive  [Parts]float64   // household-years
	Assets [][Parts]float64 // [step] assets at the end of the year, money; step 0: with all causes
}

// Result is what households hold.
type Result struct {
	Cells  [][]Cell // [year from the first age][group]
	Groups []string
}

// Run removes one cause after the other. p holds the rules with all causes.
func Run(ctx context.Context, p *sim.Population, o Options) (*Result, error) {
	if err := errors.Join(o.Validate(), p.Validate()); err != nil {
		return nil, err
	}
	if o.Households == 0 || o.Households > p.Households {
		o.Households = p.Households
	}
	r := &run{ctx: ctx, p: p, o: o}
	r.result = &Result{Cells: make([][]Cell, p.Years())}
	for t := range r.result.Cells {
		r.result.Cells[t] = make([]Cell, len(p.Groups))
		for g := range p.Groups {
			r.result.Cells[t][g].Assets = make([][Parts]float64, len(o.Order)+1)
		}
	}
	for _, g := range p.Groups {
		r.result.Groups = append(r.result.Groups, g.Name)
	}
	for _, t := range p.Types {
		r.rules = append(r.rules, t.Rule)
		r.households = append(r.households, t.Rule.Household)
	}
	if err := r.live(0, "with all causes"); err != nil {
		return nil, err
	}
	for k, cause := range o.Order {
		if err := r.remove(k+1, cause); err != nil {
			return nil, err
		}
	}
	return r.result, nil
}

// run is a decomposition under way.
type run struct {
	ctx        context.Context
	p          *sim.Population
	o          Options
	result     *Result
	rules      []*policy.Rule     // [type] of the last step
	households []policy.Household // [type] the same
	known      bool               // the age at death is known
}

// remove takes step k.
func (r *run) remove(k int, cause Cause) error {
	changed := false
	for i := range r.households {
		h, differs, err := without(r.households[i], cause)
		if err != nil {
			return err
		}
		r.households[i] = h
		changed = changed || differs
	}
	r.known = r.known || cause == LongevityRisk
	stage := "without " + cause.String()
	switch {
	case !changed: // nobody's problem is another: nobody lives otherwise
		for t := range r.result.Cells {
			for g := range r.result.Cells[t] {
				c := &r.result.Cells[t][g]
				c.Assets[k] = c.Assets[k-1]
			}
		}
		return nil
	case r.known:
		return r.liveKnowing(k, stage)
	}
	rules, err := r.solve(r.households, stage)
	if err != nil {
		return err
	}
	r.rules = rules
	return r.live(k, stage)
}

// solve solves problems on all workers; without a stage it tells of no progress.
func (r *run) solve(households []policy.Household, stage string) ([]*policy.Rule, error) {
	rules, errs := make([]*policy.Rule, len(households)), make([]error, len(households))
	var next atomic.Int64
	var mu sync.Mutex
	done := int64(0)
	var wg sync.WaitGroup
	for range max(1, r.o.Workers) {
		wg.Go(func() {
			for i := int(next.Add(1)) - 1; i < len(households); i = int(next.Add(1)) - 1 {
				rules[i], errs[i] = policy.Solve(r.ctx, households[i], r.o.Solver)
				mu.Lock()
				done++
				if r.o.OnProgress != nil && stage != "" {
					r.o.OnProgress("solving "+stage, done, int64(len(households)))
				}
				mu.Unlock()
			}
		})
	}
	wg.Wait()
	return rules, errors.Join(errs...)
}

// live lets all households live by the rules of the step and sums what they hold.
func (r *run) live(k int, stage string) error {
	return r.simulate(r.following(r.rules), r.reporting(stage), sumAssets, k)
}

// following is the population with other rules, and without twins.
func (r *run) following(rules []*policy.Rule) *sim.Population {
	p := *r.p
	p.Types = slices.Clone(r.p.Types)
	for i := range p.Types {
		p.Types[i].Rule, p.Types[i].Twin = rules[i], nil
	}
	return &p
}

// reporting are the options of a simulation of everybody that tells how far it is.
func (r *run) reporting(stage string) sim.Options {
	o := sim.Options{To: r.o.Households}
	if r.o.OnProgress != nil {
		o.OnProgress = func(done, total int64) { r.o.OnProgress(stage, done, total) }
	}
	return o
}

// sumAssets sums what the households of a block hold.
func sumAssets(b *sim.Block, sums *sums) error {
	for _, s := range b.Runs {
		c := sums.cell(s.T, s.Group)
		for i := s.From; i < s.To; i++ {
			part := b.Household[i] % Parts
			c.assets[part] += b.Assets[i]
			c.alive[part]++
		}
	}
	return nil
}

// sums are those of one block.
type sums struct {
	cells  []cellSums
	groups int
}

type cellSums struct{ assets, alive [Parts]float64 }

func (s *sums) cell(t, group int) *cellSums { return &s.cells[t*s.groups+group] }

// simulate lets p live, sums each block and folds the sums in the order of blocks.
func (r *run) simulate(p *sim.Population, o sim.Options, add func(*sim.Block, *sums) error, k int) error {
	groups := len(p.Groups)
	pool := sync.Pool{New: func() any { return &sums{make([]cellSums, p.Years()*groups), groups} }}
	o.Workers, o.Columns = r.o.Workers, sim.Identity
	_, err := sim.Simulate(r.ctx, p, o, func(_ int, b *sim.Block) (func() error, error) {
		s := pool.Get().(*sums)
		clear(s.cells)
		if err := add(b, s); err != nil {
			return nil, err
		}
		return func() error {
			for i := range s.cells {
				c := &r.result.Cells[i/groups][i%groups]
				for part := range Parts {
					c.Assets[k][part] += s.cells[i].assets[part]
					if k == 0 {
						c.Alive[part] += s.cells[i].alive[part]
					}
				}
			}
			pool.Put(s)
			return nil
		}, nil
	})
	return err
}
