package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"sync"

	"cistern/policy"
	"cistern/sim"
)

func isCancelled(err error) bool { return errors.Is(err, context.Canceled) }

// statesPerCell is how many simulated states of an age and group are judged: the
// first ones by household id.
const statesPerCell = 60

// pointsPerNode is at how many points between the nodes of one curve a rule is
// judged.
const pointsPerNode = 20

// fineEvery is which of these points the fine quadrature judges too: every fourth,
// as it takes 24 times as long a point.
const fineEvery = 4

// sample collects simulated states for judging.
type sample struct {
	groups, years int
	mu            sync.Mutex
	states        [][]state // [group·years + t]
}

// state is a simulated state of one type.
type state struct {
	group, t, kind int // kind is the type
	policy.State
}

func newSample(groups, years int) *sample {
	return &sample{groups: groups, years: years, states: make([][]state, groups*years)}
}

// candidates returns the states of a block that may still be wanted.
func (s *sample) candidates(b *sim.Block) []state {
	var out []state
	s.mu.Lock()
	defer s.mu.Unlock()
	for _, r := range b.Runs {
		if len(s.states[r.Group*s.years+r.T]) >= statesPerCell {
			continue
		}
		for k := r.From; k < min(r.To, r.From+statesPerCell); k++ {
			out = append(out, state{r.Group, r.T, r.Type, policy.State{Node: int(b.Node[k]), Cash: b.CashOnHand[k]}})
		}
	}
	return out
}

// add keeps the candidates that there is room for. It is called in the order of
// blocks, so that what is kept does not depend on the workers.
func (s *sample) add(states []state) {
	s.mu.Lock()
	defer s.mu.Unlock()
	for _, x := range states {
		cell := &s.states[x.group*s.years+x.t]
		if len(*cell) < statesPerCell {
			*cell = append(*cell, x)
		}
	}
}

// between returns states half-way between nodes of every type's rule.
func between(groups []int, rules []*policy.Rule, highest float64) []state {
	var out []state
	for kind, rule := range rules {
		for t := range rule.Curves {
			all := rule.BetweenNodes(t, highest)
			stride := max(1, len(all)/(pointsPerNode*len(rule.Curves[t])))
			for i := t % stride; i < len(all); i += stride {
				out = append(out, state{groups[kind], t, kind, all[i]})
			}
		}
	}
	return out
}

// where and quadrature name the two ways of choosing states and of judging.
var (
	places      = []string{"simulated", "between_nodes"}
	quadratures = []string{"solver", "fine"}
)

// accuracy holds Euler-equation errors by place, quadrature, group and age.
type accuracy struct {
	groups   []string
	firstAge int
	cells    map[cell]*errorList
}

type cell struct{ place, quadrature, group, t int }

// errorList is the errors of one cell.
type errorList struct {
	errors  []float64
	atLimit int
	limit   float64 // largest violation at the limit
}

// judge measures the accuracy of the rules.
func (r *run) judge(ctx context.Context) error {
	groups := make([]int, len(r.problems))
	for i, p := range r.problems {
		groups[i] = p.Group
	}
	var simulated []state
	for _, cell := range r.sample.states {
		simulated = append(simulated, cell...)
	}
	sets := [][]state{simulated, between(groups, r.rules, r.result.HighestCash)}
	r.accuracy = &accuracy{groups: r.groupNames(), firstAge: r.sc.FirstAge, cells: map[cell]*errorList{}}
	if err := r.accuracy.judge(ctx, r.rules, sets, r.g.workers); err != nil {
		return err
	}
	if n := beyondBliss(r.rules, simulated); n > 0 {
		r.warnings = append(r.warnings, fmt.Sprintf("in %d of %d judged states consumption lies beyond the bliss point, where more of it does harm; raise preferences.utility.bliss_point", n, len(simulated)))
	}
	if r.result.AboveTop > 0 {
		r.warnings = append(r.warnings, fmt.Sprintf("%d household-years of %d lie above the top of the asset grid, where the rule is extrapolated; raise solver.highest_assets",
			r.result.AboveTop, r.result.HouseholdYears))
	}
	return nil
}

// beyondBliss counts the states in which more consumption would do harm.
func beyondBliss(rules []*policy.Rule, states []state) int {
	n := 0
	for _, s := range states {
		if rule := rules[s.kind]; rule.Household.Utility.Marginal(rule.Consumption(s.t, s.Node, s.Cash)) < 0 {
			n++
		}
	}
	return n
}

// judge judges every set of states with both quadratures (of the points between
// nodes some only with the fine one), types shared out over workers.
func (a *accuracy) judge(ctx context.Context, rules []*policy.Rule, sets [][]state, workers int) error {
	type job struct{ place, quadrature, kind int }
	jobs := make(chan job, 4*len(rules))
	for kind := range rules {
		jobs <- job{0, 1, kind}
		jobs <- job{1, 1, kind}
		jobs <- job{0, 0, kind}
		jobs <- job{1, 0, kind}
	}
	close(jobs)
	var mu sync.Mutex
	var wg sync.WaitGroup
	for range max(1, workers) {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for j := range jobs {
				judge := policy.NewJudge(rules[j.kind], j.quadrature == 1)
				local := map[cell]*errorList{}
				for i, s := range sets[j.place] {
					if s.kind != j.kind || j.place == 1 && j.quadrature == 1 && i%fineEvery != 0 {
						continue
					}
					if ctx.Err() != nil {
						return
					}
					e, atLimit := judge.Error(s.t, s.Node, s.Cash)
					c := cell{j.place, j.quadrature, s.group, s.t}
					if local[c] == nil {
						local[c] = new(errorList)
					}
					local[c].add(e, atLimit)
				}
				mu.Lock()
				for c, l := range local {
					if a.cells[c] == nil {
						a.cells[c] = new(errorList)
					}
					a.cells[c].join(l)
				}
				mu.Unlock()
			}
		}()
	}
	wg.Wait()
	if ctx.Err() != nil {
		return context.Cause(ctx)
	}
	return nil
}

func (l *errorList) add(e float64, atLimit bool) {
	if atLimit {
		l.atLimit++
		l.limit = math.Max(l.limit, e)
		return
	}
	l.errors = append(l.errors, e)
}

func (l *errorList) join(m *errorList) {
	l.errors = append(l.errors, m.errors...)
	l.atLimit += m.atLimit
	l.limit = math.Max(l.limit, m.limit)
}
