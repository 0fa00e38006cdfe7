package stress

import (
	"context"
	"fmt"
	"math"
	"runtime/debug"
	"sync"
	"sync/atomic"

	"cistern/policy"
	"cistern/sim"
)

// Options says how an event is prepared.
type Options struct {
	Solver          policy.Options
	Autocorrelation []float64 // [type] ρ of the persistent part
	Workers         int       // goroutines, at least 1; 0 counts as 1

	// OnCourse, if set, is called after each course of life is ready, one call at a
	// time, with the number done and to do.
	OnCourse func(done, total int)
}

// Prepare returns the event for a simulation of p: for every type and age at the
// event what its households then live through, and the rule that they follow.
// Invalid events and households that could not live through the event
// (*HardshipError) are errors; so is the end of ctx.
//
// The cost is one backward step a type, age and year of the event but the last
// under Foreseen, nothing to speak of under Usual, and in either case all years of
// life from the event on where the persistent part is shifted. What is kept is a
// table of the rule for every type, age and year of the window that has one of its
// own.
func Prepare(ctx context.Context, p *sim.Population, e *Event, w Window, o Options) (*sim.Event, error) {
	if err := e.Validate(); err != nil {
		return nil, err
	}
	if len(o.Autocorrelation) != len(p.Types) {
		panic("stress: one autocorrelation for each type")
	}
	entries := NewEntries(w, p.Years())
	pr := &preparation{p: p, e: e, w: w, o: o, entries: entries, courses: make([]*sim.Course, len(p.Types)*entries.Cohorts)}
	if err := pr.all(ctx); err != nil {
		return nil, err
	}
	return &sim.Event{Entry: entries.Of, First: -w.Before, Last: w.After, Course: func(kind, entry int) *sim.Course {
		return pr.courses[kind*entries.Cohorts+entry-entries.Earliest]
	}}, nil
}

// preparation is an event in the making.
type preparation struct {
	p       *sim.Population
	e       *Event
	w       Window
	o       Options
	entries Entries
	courses []*sim.Course // [type][entry]; nil: as usual
}

// all makes every course. The first error in the order of courses ends it: those
// before it are made in any case, so that it does not depend on the workers.
func (pr *preparation) all(ctx context.Context) error {
	errs := make([]error, len(pr.courses))
	var next atomic.Int64
	var mu sync.Mutex
	done, end := 0, len(pr.courses) // end: where the first error so far is
	var wg sync.WaitGroup
	for range min(max(1, pr.o.Workers), len(pr.courses)) {
		wg.Go(func() {
			for {
				i := int(next.Add(1)) - 1
				mu.Lock()
				beyond := i >= end
				mu.Unlock()
				if beyond || ctx.Err() != nil {
					return
				}
				errs[i] = pr.safely(ctx, i)
				mu.Lock()
				if errs[i] != nil {
					end = min(end, i)
				} else if done++; pr.o.OnCourse != nil {
					pr.o.OnCourse(done, len(pr.courses))
				}
				mu.Unlock()
			}
		})
	}
	wg.Wait()
	if ctx.Err() != nil {
		return fmt.Errorf("stress: stopped: %w", context.Cause(ctx))
	}
	for _, err := range errs {
		if err != nil {
			return err
		}
	}
	return nil
}

// safely makes a course and turns a panic into an error.
func (pr *preparation) safely(ctx context.Context, i int) (err error) {
	defer func() {
		if r := recover(); r != nil {
			err = fmt.Errorf("stress: panic: %v\n%s", r, debug.Stack())
		}
	}()
	kind, entry := i/pr.entries.Cohorts, pr.entries.Earliest+i%pr.entries.Cohorts
	pr.courses[i], err = pr.course(ctx, kind, -entry)
	return err
}

// course returns what households of a type live through that are in year onset of
// life in the event's year; nil: nothing.
func (pr *preparation) course(ctx context.Context, kind, onset int) (*sim.Course, error) {
	t := &pr.p.Types[kind]
	h := &t.Rule.Household
	from, until := pr.e.stretch(h, onset)
	until = min(until, onset+pr.w.After+1) // later years are not looked at
	if until <= from || !pr.e.hits(h, t.Group, onset) {
		return nil, nil
	}
	rule, err := Rule(ctx, t.Rule, pr.e, pr.o.Autocorrelation[kind], onset, pr.o.Solver)
	if err != nil {
		return nil, err
	}
	if err := bearable(t, rule, from, until); err != nil {
		err.Group, err.Year = pr.p.Groups[t.Group].Name, err.Age-h.FirstAge-onset
		return nil, err
	}
	return sim.NewCourse(t.Rule, rule, from, until), nil
}

// Rule returns the rule that households whose usual rule is usual follow from year
// onset of life on, in which the event comes (negative: they enter that many years
// after it). Its Household is the one that lives through the event; its curves of
// earlier years are nil or the usual ones. rho is the autocorrelation of their
// persistent part.
func Rule(ctx context.Context, usual *policy.Rule, e *Event, rho float64, onset int, o policy.Options) (*policy.Rule, error) {
	h := usual.Household
	life, err := e.Household(h, rho, onset)
	if err != nil {
		return nil, err
	}
	from, until := e.stretch(&h, onset)
	ahead := until // the rule is the usual one from this year on
	switch {
	case e.shifts(&h, onset):
		ahead = h.Years()
		if h.Pension.FinalEarningsRate == 0 {
			ahead = h.WorkingYears() // the pension does not know of the shift
		}
		if e.Expect == Foreseen {
			ahead = max(ahead, min(onset+len(e.Years)-1, h.Years()))
		}
	case e.Expect == Foreseen:
		ahead = max(from, until-1) // next year is a usual one: so is the rule
	default:
		ahead = from
	}
	if ahead == from {
		return &policy.Rule{Household: life, Curves: usual.Curves, Bounds: usual.Bounds}, nil
	}
	expected := life
	if e.Expect == Usual {
		if expected, err = e.shifted(h, rho, onset); err != nil {
			return nil, err
		}
	}
	rule, err := policy.Continue(ctx, expected, o, usual, ahead, from)
	if err != nil {
		return nil, err
	}
	return &policy.Rule{Household: life, Curves: rule.Curves, Bounds: rule.Bounds, Updates: rule.Updates}, nil
}

// A HardshipError is a household that would have nothing left to consume in a year
// of the event: its lowest income there does not bear what it may owe.
type HardshipError struct {
	Group string
	Age   int
	Year  int     // of the event
	Cash  float64 // lowest cash-on-hand, money
	Least float64 // cash-on-hand must exceed this, money
}

func (e *HardshipError) Error() string {
	return fmt.Sprintf("stress: in year %d of the event a household of group %s aged %d can be left with cash-on-hand %.6g, and must have more than %.6g to consume anything: "+
		"give it a benefit or a higher income, or let it owe less", e.Year, e.Group, e.Age, e.Cash, e.Least)
}

// bearable sees to it that in the years from … until−1 even who owes all that the
// limit allows and earns the least has something to consume. Where that is not so
// in usual times either, households see to it themselves: whoever reckons with an
// income of nothing keeps something.
func bearable(t *sim.Type, rule *policy.Rule, from, until int) *HardshipError {
	floor := rule.Household.Utility.Infimum()
	for year := from; year < until && !math.IsInf(floor, -1); year++ {
		for j := range rule.Curves[year] {
			cash, least := leastCash(t, rule, from, year, j)
			if enough(cash, least+floor) {
				continue
			}
			if usually, needed := leastCash(t, t.Rule, 0, year, j); enough(usually, needed+floor) {
				return &HardshipError{Age: rule.Household.FirstAge + year, Cash: cash, Least: least + floor}
			}
		}
	}
	return nil
}

// enough reports whether cash exceeds least by more than rounding.
func enough(cash, least float64) bool {
	return cash-least > 1e-9*(math.Abs(cash)+math.Abs(least))
}

// leastCash returns the least cash-on-hand in a year at node j of a household that
// follows rule from year from on and its type's rule before, and the assets that it
// must end the year with at least.
func leastCash(t *sim.Type, rule *policy.Rule, from, year, j int) (cash, bound float64) {
	h := &rule.Household
	cash = (1+h.ReturnIn(year))*poorest(t, rule, from, year, j) + leastIncome(h, year, j)
	return cash, rule.Curves[year][j].Bound
}

// poorest returns the lowest assets that a household that is at node j in a year can
// have kept the year before.
func poorest(t *sim.Type, rule *policy.Rule, from, year, j int) float64 {
	if year == 0 {
		if t.Start.Median > 0 {
			return 0
		}
		return t.Start.Constant
	}
	before := t.Rule
	if year > from {
		before = rule
	}
	if !rule.Household.Moves(year - 1) {
		return before.Curves[year-1][j].Bound
	}
	low := math.Inf(1)
	for k := range before.Curves[year-1] {
		low = math.Min(low, before.Curves[year-1][k].Bound)
	}
	return low
}

func leastIncome(h *policy.Household, year, j int) float64 {
	low := math.Inf(1)
	values, weights := h.Income(year, j)
	for k, y := range values {
		if weights[k] > 0 {
			low = math.Min(low, y)
		}
	}
	return low
}
