package transfer

import (
	"context"
	"fmt"
	"math"
	"slices"
	"sync"

	"cistern/policy"
	"cistern/sim"
)

// Run lets every household of p receive the transfer. The sums do not depend on
// the number of workers: they are formed within blocks of households and added in
// the order of blocks. Memory does not grow with the number of households.
//
// It returns an error if p or o is invalid, if a household comes to a state that
// its utility does not allow (*sim.StateError), or, wrapping context.Cause(ctx),
// within a block of the end of ctx.
func Run(ctx context.Context, p *sim.Population, o Options) (*Result, error) {
	if err := p.Validate(); err != nil {
		return nil, err
	}
	first := p.Types[0].Rule.Household.FirstAge
	if err := o.Validate(first, first+p.Years()-1); err != nil {
		return nil, err
	}
	e := newExperiment(p, o)
	_, err := sim.Simulate(ctx, p, sim.Options{Workers: o.Workers, OnProgress: o.OnProgress,
		Columns: sim.Identity | sim.States | sim.Propensity | sim.Changes}, e.block)
	if err != nil {
		return nil, err
	}
	return e.total, nil
}

// experiment is a run on its way.
type experiment struct {
	p     *sim.Population
	o     Options
	ages  []receipt
	rules [][]*policy.Table // [type][t]; nil in years that nobody is looked at

	total *Result // written by commits only
	mu    sync.Mutex
	spare []*lives
}

// receipt is an age at which households receive.
type receipt struct {
	t      int // years from the first age
	band   int
	weight float64
}

func newExperiment(p *sim.Population, o Options) *experiment {
	e := &experiment{p: p, o: o, total: newResult(p, &o)}
	first := p.Types[0].Rule.Household.FirstAge
	looked := make([]bool, p.Years())
	for i, age := range o.Ages {
		r := receipt{t: age - first, band: o.band(age), weight: 1}
		if o.Weights != nil {
			r.weight = o.Weights[i]
		}
		e.ages = append(e.ages, r)
		for t := r.t; t <= min(r.t+o.Years, p.Years()-1); t++ {
			looked[t] = true
		}
	}
	for _, tp := range p.Types {
		tables := make([]*policy.Table, p.Years())
		for t := range tables {
			if looked[t] {
				tables[t] = tp.Rule.Table(t)
			}
		}
		e.rules = append(e.rules, tables)
	}
	return e
}

// block lives the second lives of the households of a block.
func (e *experiment) block(_ int, b *sim.Block) (func() error, error) {
	l := e.take()
	for _, run := range b.Runs {
		for i := range e.ages {
			if since := run.T - e.ages[i].t; since >= 0 && since <= e.o.Years {
				if err := l.year(e, b, run, i, since); err != nil {
					return nil, err
				}
			}
		}
	}
	return func() error {
		e.total.add(l.sums)
		e.give(l)
		return nil
	}, nil
}

func (e *experiment) take() *lives {
	e.mu.Lock()
	defer e.mu.Unlock()
	if n := len(e.spare); n > 0 {
		l := e.spare[n-1]
		e.spare = e.spare[:n-1]
		return l
	}
	return newLives(e)
}

func (e *experiment) give(l *lives) {
	e.mu.Lock()
	defer e.mu.Unlock()
	e.spare = append(e.spare, l)
}

// chunk is the number of households evaluated at a time.
const chunk = 1024

// lives are the second lives of the households of one block.
type lives struct {
	sums   *Result
	assets [][]float64 // [age of receipt][place in the block] at the end of last year
	class  [][]int16   // [age of receipt][place in the block]; −1: cannot pay

	cash, spent [chunk]float64
}

func newLives(e *experiment) *lives {
	l := &lives{sums: newResult(e.p, &e.o)}
	for range e.ages {
		l.assets = append(l.assets, make([]float64, sim.Unit))
		l.class = append(l.class, make([]int16, sim.Unit))
	}
	return l
}

// year takes those of a run who received at age i through the year, a number of
// years since.
func (l *lives) year(e *experiment, b *sim.Block, run sim.Run, i, since int) error {
	for from := run.From; from < run.To; from += chunk {
		to := min(from+chunk, run.To)
		cash, spent := l.cash[:to-from], l.spent[:to-from]
		if since == 0 {
			for k := range cash {
				cash[k] = b.CashOnHand[from+k] + e.o.Amount
			}
		} else {
			R := 1 + e.p.Types[run.Type].Rule.Household.ReturnIn(run.T)
			for k := range cash {
				cash[k] = float64(R*l.assets[i][b.Household[from+k]-b.First]) + b.Income[from+k]
			}
		}
		e.rules[run.Type][run.T].Evaluate(b.Node[from:to], cash, spent, nil)
		if since == 0 {
			l.receive(e, b, run, i, from, to)
		}
		if err := l.settle(e, b, run, i, since, from, to); err != nil {
			return err
		}
	}
	return nil
}

// receive says in which class of wealth those are who receive, and sums what they
// are like.
func (l *lives) receive(e *experiment, b *sim.Block, run sim.Run, i, from, to int) {
	r := e.ages[i]
	var limits []float64
	if e.o.Limits != nil {
		limits = e.o.Limits[r.band]
	}
	floor := e.p.Types[run.Type].Rule.Household.Utility.Infimum()
	for k := from; k < to; k++ {
		id := b.Household[k]
		class, _ := slices.BinarySearch(limits, b.LastAssets[k]) // limits below
		s, part := l.sums.Cell(r.band, run.Group, class), id%Parts
		if !(l.spent[k-from] > floor) {
			s.Unable[part] += r.weight
			l.class[i][id-b.First] = -1
			continue
		}
		l.class[i][id-b.First] = int16(class)
		s.Receipts++
		s.Weight[part] += r.weight
		s.Income[part] += float64(r.weight * b.Income[k])
		s.Propensity[part] += float64(r.weight * b.Propensity[k])
	}
}

// settle sums what the transfer changes in the year and keeps what is left.
func (l *lives) settle(e *experiment, b *sim.Block, run sim.Run, i, since, from, to int) error {
	r, rule := e.ages[i], e.p.Types[run.Type].Rule
	curves, floor := rule.Curves[run.T], rule.Household.Utility.Infimum()
	for k := from; k < to; k++ {
		id := b.Household[k]
		place := id - b.First
		class := l.class[i][place]
		if class < 0 {
			continue
		}
		m, c, curve := l.cash[k-from], l.spent[k-from], &curves[b.Node[k]]
		if !(c > floor && c <= math.MaxFloat64) {
			return fmt.Errorf("transfer: after %g at age %d: %w", e.o.Amount, e.o.Ages[i],
				&sim.StateError{Group: e.p.Groups[run.Group].Name, Age: rule.Household.FirstAge + run.T, Household: id, Cash: m, Consumption: c})
		}
		a := m - c
		if a < curve.Bound { // by rounding alone
			a = curve.Bound
			c = m - a
		}
		l.assets[i][place] = a
		l.sums.HouseholdYears++
		if m > curve.Top() {
			l.sums.AboveTop++
		}
		s := l.sums.Cell(r.band, run.Group, int(class))
		s.Consumed[since][id%Parts] += float64(r.weight * (c - b.Consumption[k]))
		s.Kept[since][id%Parts] += float64(r.weight * (a - b.Assets[k]))
	}
	return nil
}
