package sim

import (
	"errors"
	"math"
	"strings"
	"testing"

	"cistern/income"
	"cistern/policy"
)

// spread lets households of p's length of life begin in every year from long ago
// to the event's last.
func spread(p *Population, first, last int) func(int64) int {
	n := int64(p.Years() + last - first)
	return func(id int64) int { return int(id*7%n) + first - p.Years() + 1 }
}

// harder returns h with more job loss, lower earnings and returns in the years from
// … until−1.
func harder(tb testing.TB, h policy.Household, from, until int) policy.Household {
	tb.Helper()
	h.Returns, h.Pension.Worth = make([]float64, h.Years()), make([]float64, h.Years())
	for t := range h.Returns {
		if h.Returns[t], h.Pension.Worth[t] = h.Return, 1; t >= from && t < until {
			h.Returns[t], h.Pension.Worth[t] = -0.1, 0.9
		}
	}
	works := min(until, h.WorkingYears())
	var changes []income.Change
	for range works - min(from, works) {
		changes = append(changes, income.Change{JobLoss: income.JobLoss{Probability: 0.3, BenefitRate: 0.5}, Factor: 0.9, Shift: -0.05})
	}
	e, err := h.Earnings.Change(min(from, works), changes)
	if err != nil {
		tb.Fatal(err)
	}
	h.Earnings = e
	return h
}

// struck is an event of some years that everybody meets while following the usual
// rule.
func struck(tb testing.TB, p *Population, years, first, last int) *Event {
	return &Event{Entry: spread(p, first, last), First: first, Last: last, Course: func(kind, entry int) *Course {
		usual := p.Types[kind].Rule
		from, until := max(0, -entry), min(years-entry, p.Years())
		if until <= from {
			return nil
		}
		rule := &policy.Rule{Household: harder(tb, usual.Household, from, until), Curves: usual.Curves}
		return NewCourse(usual, rule, from, until)
	}}
}

// The usual rows under an event are those of a simulation without one, to the bit,
// and blocks hold all of the wanted years and no others.
func TestEventLeavesUsualRows(t *testing.T) {
	for _, c := range []corner{
		{"two groups, five types", mixed(t, Unit+500)},
		{"no transitory shock", population(t, riskyWith(t, func(p *income.Process) { p.Transitory.SD = 0 }), Unit+500)},
		{"no job loss", population(t, riskyWith(t, func(p *income.Process) { p.JobLoss = income.JobLoss{} }), Unit+500)},
		{"form level", population(t, exponential(t, 40), Unit+500)},
	} {
		t.Run(c.name, func(t *testing.T) {
			const first, last = -3, 6
			want := simulate(t, c.p, Options{Columns: All})
			at := map[[2]int]int{} // row of a household's year
			for k, id := range want.Household {
				at[[2]int{int(id), want.t[k]}] = k
			}
			e := struck(t, c.p, 2, first, last)
			rows, differ := 0, 0
			working, lost := 0.0, 0.0
			_, err := Simulate(t.Context(), c.p, Options{Columns: All &^ Order, Event: e}, func(_ int, b *Block) (func() error, error) {
				for _, r := range b.Runs {
					for k := r.From; k < r.To; k++ {
						id := b.Household[k]
						if r.Year != e.Entry(id)+r.T || r.Year < first || r.Year > last {
							t.Fatalf("household %d: year %d of life in calendar year %d", id, r.T, r.Year)
						}
						w := at[[2]int{int(id), r.T}]
						from, to := b.floats(), want.floats()
						for i := range from {
							if math.Float64bits((*from[i])[k]) != math.Float64bits((*to[i])[w]) {
								t.Fatalf("household %d, year %d of life: column %d is %v, usually %v", id, r.T, i, (*from[i])[k], (*to[i])[w])
							}
						}
						if b.Node[k] != want.Node[w] || b.Employed[k] != want.Employed[w] || b.Died[k] != want.Died[w] || b.JobLost[k] != want.JobLost[w] || b.AtLimit[k] != want.AtLimit[w] {
							t.Fatalf("household %d, year %d of life differs", id, r.T)
						}
						if (r.Year == 0 || r.Year == 1) && c.p.Types[r.Type].Rule.Household.Working(r.T) {
							if working++; b.EventJobLost[k] {
								lost++
							}
						}
						if b.EventAssets[k] != b.Assets[k] {
							differ++
							if r.Year < 0 {
								t.Fatalf("household %d is hit before the event", id)
							}
						}
						rows++
					}
				}
				return nil, nil
			})
			if err != nil {
				t.Fatal(err)
			}
			share(t, "job loss under the event", 0, lost, working, 0.3, "derived: the event's probability")
			expected := 0
			for k, id := range want.Household {
				if year := e.Entry(id) + want.t[k]; year >= first && year <= last {
					expected++
				}
			}
			if rows != expected || differ < rows/10 {
				t.Errorf("%d rows, want %d; %d of them differ under the event", rows, expected, differ)
			}
		})
	}
}

// A life under an event follows the model with the event's incomes and returns and
// the course's rule (the accounting of the model, by hand from rules and tables),
// and an event from birth to death is another scenario: a simulation of it gives
// the same rows to the bit.
func TestLifeUnderEvent(t *testing.T) {
	p := mixed(t, Unit)
	other := *p
	other.Types = append([]Type(nil), p.Types...)
	for k := range other.Types {
		h := harder(t, p.Types[k].Rule.Household, 0, p.Years())
		other.Types[k].Rule = solve(t, h, policy.DefaultOptions())
	}
	want := simulate(t, &other, Options{Columns: All})
	at := map[[2]int]int{}
	for k, id := range want.Household {
		at[[2]int{int(id), want.t[k]}] = k
	}
	e := &Event{Entry: func(int64) int { return 0 }, First: 0, Last: p.Years(), Course: func(kind, entry int) *Course {
		if entry != 0 {
			return nil
		}
		return NewCourse(p.Types[kind].Rule, other.Types[kind].Rule, 0, p.Years())
	}}
	n := 0
	if _, err := Simulate(t.Context(), p, Options{Columns: All &^ Order, Event: e}, func(_ int, b *Block) (func() error, error) {
		for _, r := range b.Runs {
			for k := r.From; k < r.To; k++ {
				w := at[[2]int{int(b.Household[k]), r.T}]
				if b.EventIncome[k] != want.Income[w] || b.EventConsumption[k] != want.Consumption[w] || b.EventAssets[k] != want.Assets[w] || b.EventJobLost[k] != want.JobLost[w] {
					t.Fatalf("household %d, year %d: income %v, consumption %v, assets %v, want %v, %v, %v", b.Household[k], r.T,
						b.EventIncome[k], b.EventConsumption[k], b.EventAssets[k], want.Income[w], want.Consumption[w], want.Assets[w])
				}
				n++
			}
		}
		return nil, nil
	}); err != nil {
		t.Fatal(err)
	}
	if n != want.N {
		t.Errorf("%d rows, want %d", n, want.N)
	}
}

// The years under an event add up: cash-on-hand is what was kept under the event at
// the event's return plus the event's income, and consumption is the rule's
// (derived: the accounting of the model).
func TestEventAddsUp(t *testing.T) {
	p := mixed(t, Unit)
	const years, first, last = 3, -1, 7
	e := struck(t, p, years, first, last)
	type state struct{ assets float64 }
	kept := map[int64]state{}
	checked := 0
	_, err := Simulate(t.Context(), p, Options{Columns: All &^ Order, Event: e}, func(_ int, b *Block) (func() error, error) {
		for _, r := range b.Runs {
			usual := p.Types[r.Type].Rule
			for k := r.From; k < r.To; k++ {
				id, node := b.Household[k], int(b.Node[k])
				before, known := kept[id]
				kept[id] = state{b.EventAssets[k]}
				if !known || r.Year < 0 {
					continue
				}
				h := usual.Household
				if r.Year < years {
					from := max(0, r.T-r.Year)
					h = harder(t, h, from, min(r.T-r.Year+years, p.Years()))
				}
				income := h.PensionIn(r.T, node)
				if h.Working(r.T) {
					income = h.Earnings.Benefit[r.T][node]
					if !b.EventJobLost[k] {
						if b.JobLost[k] {
							t.Fatalf("household %d keeps its job under the event alone", id)
						}
						income = h.Earnings.At(r.T, node, b.Transitory[k])
					}
				}
				cash := (1+h.ReturnIn(r.T))*before.assets + income
				c := usual.Consumption(r.T, node, cash)
				for _, v := range [][2]float64{{b.EventIncome[k], income}, {b.EventConsumption[k], c}, {b.EventAssets[k], cash - c}} {
					if math.Abs(v[0]-v[1]) > 1e-10*(1+math.Abs(v[1])) {
						t.Fatalf("household %d, year %d: got %v, want %v", id, r.Year, v[0], v[1])
					}
				}
				checked++
			}
		}
		return nil, nil
	})
	if err != nil || checked < 5*Unit/2 {
		t.Errorf("error %v, %d checked", err, checked)
	}
}

// Under an event that changes nothing, households live as usual, to the bit, with
// and without a course; rows do not depend on workers.
func TestEventOfNothing(t *testing.T) {
	p := mixed(t, 3*Unit)
	for _, course := range []func(kind, entry int) *Course{
		func(int, int) *Course { return nil },
		func(kind, entry int) *Course {
			r := p.Types[kind].Rule
			return NewCourse(r, &policy.Rule{Household: r.Household, Curves: r.Curves}, min(max(0, -entry), p.Years()), p.Years())
		},
	} {
		var sums []uint64
		for _, workers := range []int{1, 3} {
			var sum uint64
			o := Options{Workers: workers, Columns: Identity, Event: &Event{Entry: spread(p, -2, 5), First: -2, Last: 5, Course: course}}
			if _, err := Simulate(t.Context(), p, o, func(_ int, b *Block) (func() error, error) {
				return func() error {
					for k := range b.N {
						if b.EventIncome[k] != b.Income[k] || b.EventConsumption[k] != b.Consumption[k] || b.EventAssets[k] != b.Assets[k] || b.EventLowest[k] != b.Lowest[k] {
							t.Fatalf("household %d differs under an event of nothing", b.Household[k])
						}
						sum = scramble(sum + math.Float64bits(b.EventAssets[k]) + uint64(b.Household[k]))
					}
					return nil
				}, nil
			}); err != nil {
				t.Fatal(err)
			}
			sums = append(sums, sum)
		}
		if sums[0] != sums[1] {
			t.Error("three workers give other rows than one")
		}
	}
}

// What an event must not be, and what it must not do to a household.
func TestEventFaults(t *testing.T) {
	p := population(t, risky(t), Unit)
	_, err := Simulate(t.Context(), p, Options{Columns: Order, Event: &Event{First: 1, Last: 2}}, nothing)
	for _, want := range []string{"wants Entry and Course", "years 1 to 2", "no Position"} {
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("error %v has no %q", err, want)
		}
	}
	e := struck(t, p, 1, 0, 2)
	rule := p.Types[0].Rule
	e.Course = func(kind, entry int) *Course {
		if entry != -10 {
			return nil
		}
		h := rule.Household
		changed, err := h.Earnings.Change(10, []income.Change{{Factor: 0}})
		if err != nil {
			t.Fatal(err)
		}
		h.Earnings = changed
		return NewCourse(rule, &policy.Rule{Household: h, Curves: rule.Curves}, 10, 11)
	}
	var s *StateError
	if _, err := Simulate(t.Context(), p, Options{Event: e}, nothing); !errors.As(err, &s) || !s.Event || s.Age != 35 || !strings.Contains(s.Error(), "under the event") {
		t.Errorf("earnings of nothing give %v", err)
	}
}
