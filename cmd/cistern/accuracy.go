package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"sync"

	"cistern/output"
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

// judge judges every set of states with both quadratures (points between nodes
// with the solver's own only), types shared out over workers.
func (a *accuracy) judge(ctx context.Context, rules []*policy.Rule, sets [][]state, workers int) error {
	type job struct{ place, quadrature, kind int }
	jobs := make(chan job, 3*len(rules))
	for kind := range rules {
		jobs <- job{0, 1, kind}
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
				for _, s := range sets[j.place] {
					if s.kind != j.kind {
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

// pool gathers the cells that fit: t or group −1 means all.
func (a *accuracy) pool(place, quadrature, group, t int) errorList {
	var all errorList
	for c, l := range a.cells {
		if c.place == place && c.quadrature == quadrature && (group < 0 || c.group == group) && (t < 0 || c.t == t) {
			all.join(l)
		}
	}
	slices.Sort(all.errors) // whatever order the map gave
	return all
}

// stats returns mean, 99th percentile and maximum of sorted errors.
func (l *errorList) stats() (mean, p99, most float64) {
	n := len(l.errors)
	for _, e := range l.errors {
		mean += e
	}
	return mean / float64(n), l.errors[min(n*99/100, n-1)], l.errors[n-1]
}

// table is accuracy.csv: log10 errors by group and age, with rows for all groups
// and all ages together.
func (a *accuracy) table(years int) *output.Table {
	t := output.NewTable("accuracy")
	t.Notes = append(t.Notes, "Euler-equation errors: log10 of the share of consumption by which a household that follows the rule errs in a year. "+
		"They understate the error of the rule itself, which adds up over the years ahead.")
	where := t.AddString("states", "", "simulated states, or points half-way between the nodes of the rule")
	how := t.AddString("quadrature", "", "expectations by the solver's own nodes, or by a much finer quadrature of the shock that is simulated")
	group := t.AddString("group", "", "group of households")
	age := t.AddInt("age", "year", "age; empty for all ages")
	count := t.AddInt("judged", "", "states judged, away from the limit")
	limit := t.AddInt("at_limit", "", "states at the borrowing limit, where the equation is an inequality")
	mean := t.AddFloat("mean_log10", "", "log10 of the mean error away from the limit")
	p99 := t.AddFloat("p99_log10", "", "log10 of the 99th percentile")
	most := t.AddFloat("max_log10", "", "log10 of the maximum")
	violation := t.AddFloat("limit_max_log10", "", "log10 of the largest violation of the inequality at the limit; empty if there is none")
	for place := range places {
		for q := range quadratures {
			for g := -1; g < len(a.groups); g++ {
				for year := -1; year < years; year++ {
					l := a.pool(place, q, g, year)
					if len(l.errors) == 0 && l.atLimit == 0 {
						continue
					}
					where.AppendString(places[place])
					how.AppendString(quadratures[q])
					if g < 0 {
						group.AppendString(output.Everyone)
					} else {
						group.AppendString(a.groups[g])
					}
					if year < 0 {
						age.AppendMissing()
					} else {
						age.AppendInt(int64(a.firstAge + year))
					}
					count.AppendInt(int64(len(l.errors)))
					limit.AppendInt(int64(l.atLimit))
					appendErrors(l, mean, p99, most, violation)
				}
			}
		}
	}
	return t
}

func appendErrors(l errorList, mean, p99, most, violation *output.Column) {
	if len(l.errors) == 0 {
		mean.AppendMissing()
		p99.AppendMissing()
		most.AppendMissing()
	} else {
		a, b, c := l.stats()
		appendLog10(mean, a)
		appendLog10(p99, b)
		appendLog10(most, c)
	}
	appendLog10(violation, l.limit)
}

// appendLog10 appends log10 x, or nothing for an error of exactly 0.
func appendLog10(c *output.Column, x float64) {
	if x == 0 {
		c.AppendMissing()
		return
	}
	c.AppendFloat(math.Log10(x))
}

// sentence says how accurate the rule was, in a line.
func (a *accuracy) sentence() string {
	own, fine := a.pool(0, 0, -1, -1), a.pool(0, 1, -1, -1)
	if len(own.errors) == 0 || len(fine.errors) == 0 {
		return "no simulated state away from the limit was judged"
	}
	m1, _, x1 := own.stats()
	m2, p2, _ := fine.stats()
	return fmt.Sprintf("Euler-equation errors at simulated states: mean 10^%.1f, maximum 10^%.1f of consumption; against the continuous shock mean 10^%.1f, 99th percentile 10^%.1f. "+
		"They understate the error of the rule itself.", math.Log10(m1), math.Log10(x1), math.Log10(m2), math.Log10(p2))
}

// rulesSentence is sentence for rules that were judged without a panel.
func (a *accuracy) rulesSentence() string {
	l := a.pool(1, 0, -1, -1)
	if len(l.errors) == 0 {
		return "no point away from the limit was judged"
	}
	mean, _, most := l.stats()
	return fmt.Sprintf("Euler-equation errors half-way between nodes: mean 10^%.1f, maximum 10^%.1f of consumption. They understate the error of the rule itself.",
		math.Log10(mean), math.Log10(most))
}
