package configs

import (
	"bytes"
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"

	"github.com/santhosh-tekuri/jsonschema/v6"

	"cistern/income"
	"cistern/sim"
	"cistern/sim/stress"
)

func quaysideFor(t testing.TB) *Scenario {
	t.Helper()
	sc, err := Builtin("quayside", nil)
	if err != nil {
		t.Fatal(err)
	}
	return sc
}

func stressOf(t testing.TB, text string) *Stress {
	t.Helper()
	st, err := ParseStress("s.yaml", []byte(text), quaysideFor(t))
	if err != nil {
		t.Fatal(err)
	}
	return st
}

// The stresses that ship with the program are sound, and are what their comments
// say.
func TestBuiltinStresses(t *testing.T) {
	sc := quaysideFor(t)
	for _, name := range StressNames() {
		st, err := BuiltinStress(name, sc)
		if err != nil {
			t.Fatal(err)
		}
		if title, err := StressTitle(name); err != nil || title != st.Title || title == "" {
			t.Errorf("%s: title %q, %v", name, title, err)
		}
	}
	harbour, err := BuiltinStress("harbour-closure", sc)
	if err != nil {
		t.Fatal(err)
	}
	year := stress.UsualYear()
	year.JobLoss, year.BenefitRate, year.Level = stress.Rate{X: 2}, stress.Rate{Replace: true, X: 0.35}, -0.05
	if e := harbour.Event; fmt.Sprint(e.Years) != fmt.Sprint([]stress.Year{year, year}) || fmt.Sprint(e.Groups) != "[true false false]" || e.FirstAge != 25 || e.LastAge != 100 || e.Expect != stress.Usual {
		t.Errorf("harbour-closure: %+v", e)
	}
	prices, err := BuiltinStress("price-shock", sc)
	if err != nil {
		t.Fatal(err)
	}
	first, second := stress.UsualYear(), stress.UsualYear()
	first.Prices, first.Return, second.Prices = 0.08, -0.25, 0.04
	if e := prices.Event; fmt.Sprint(e.Years) != fmt.Sprint([]stress.Year{first, second}) || e.Expect != stress.Foreseen || prices.Window != (stress.Window{Before: 2, After: 15}) {
		t.Errorf("price-shock: %+v", prices)
	}
}

// What a stress may say and what it is then; what is not said is as usual.
func TestStressKeys(t *testing.T) {
	for _, tt := range []struct {
		name, event string
		want        func(y []stress.Year, e *stress.Event)
		years       int
	}{
		{"one number", "return: -0.3", func(y []stress.Year, e *stress.Event) { y[0].Return = -0.3 }, 1},
		{"list of returns", "return: [-0.3, 0.1]", func(y []stress.Year, e *stress.Event) { y[0].Return, y[1].Return = -0.3, 0.1 }, 2},
		{"lasts", "earnings: {level: -0.1, lasts: 3}", func(y []stress.Year, e *stress.Event) {
			for s := range y {
				y[s].Level = -0.1
			}
		}, 3},
		{"list", "earnings: {level: [-0.1, 0, 0.02]}", func(y []stress.Year, e *stress.Event) { y[0].Level, y[2].Level = -0.1, 0.02 }, 3},
		{"persistent alone", "earnings: {persistent: -0.2}", func(y []stress.Year, e *stress.Event) { e.Persistent = -0.2 }, 0},
		{"times", "job_loss: {probability: {times: [3, 2]}, benefit_rate: 0.2}", func(y []stress.Year, e *stress.Event) {
			y[0].JobLoss, y[1].JobLoss = stress.Rate{X: 3}, stress.Rate{X: 2}
			y[0].BenefitRate, y[1].BenefitRate = stress.Rate{Replace: true, X: 0.2}, stress.Rate{Replace: true, X: 0.2}
		}, 2},
		{"prices", "cost_of_living: {jump: 0.1, lasts: 2, wealth: real}", func(y []stress.Year, e *stress.Event) {
			y[0].Prices, y[1].Prices, e.WealthKeepsValue = 0.1, 0.1, true
		}, 2},
		{"nothing changes", "job_loss: {probability: {times: 1}, lasts: 5}", func(y []stress.Year, e *stress.Event) {}, 0},
		{"parts of different length", "return: -0.1\n  earnings: {level: -0.1, lasts: 2}", func(y []stress.Year, e *stress.Event) {
			y[0].Return, y[0].Level, y[1].Level = -0.1, -0.1, -0.1
		}, 2},
	} {
		t.Run(tt.name, func(t *testing.T) {
			st := stressOf(t, "stress: 1\nevent:\n  "+tt.event+"\n")
			want := stress.Event{FirstAge: 25, LastAge: 100, Groups: []bool{true, true, true}}
			for range tt.years {
				want.Years = append(want.Years, stress.UsualYear())
			}
			tt.want(want.Years, &want)
			if fmt.Sprint(st.Event) != fmt.Sprint(want) {
				t.Errorf("%+v, want %+v", st.Event, want)
			}
		})
	}
	st := stressOf(t, "stress: 1\nevent: {return: -0.1}\nhits: {ages: {from: 30, to: 40}, groups: [clerks]}\nhouseholds_expect: stressed\nyears: {before: 0, horizon: 3}\nmeasures: {percentiles: [50], runway_months: [2], dry_months: 1, worst: [10], recovered_within: 2}\n")
	if e := st.Event; e.FirstAge != 30 || e.LastAge != 40 || fmt.Sprint(e.Groups) != "[false true false]" || e.Expect != stress.Foreseen || st.Window != (stress.Window{Before: 0, After: 3}) ||
		fmt.Sprint(st.Percentiles, st.RunwayMonths, st.DryMonths, st.Worst, st.Within) != "[50] [2] 1 [10] 0.02" {
		t.Errorf("%+v", st)
	}
}

// Every fault names its place, key and range.
func TestStressFaults(t *testing.T) {
	for _, tt := range []struct{ name, text, want string }{
		{"empty", "", "s.yaml:1:1: stress: is missing, and has no default"},
		{"no event", "stress: 1\n", "s.yaml:1:1: event: is missing: this block is required"},
		{"event of nothing", "stress: 1\nevent: {}\n", "s.yaml:2:8: event: names nothing that happens, want job_loss, earnings, return or cost_of_living"},
		{"a scenario", "cistern: 1\nstress: 1\nevent: {return: 0}\n", "s.yaml:1:1: cistern: is not a key of the format; allowed here: stress, title"},
		{"format", "stress: 2\nevent: {return: 0}\n", "s.yaml:1:9: stress: is 2, want a whole number from 1 to 1"},
		{"misspelt", "stress: 1\nevent: {job_los: {}}\n", "s.yaml:2:9: event.job_los: is not a key of the format; allowed here: job_loss, earnings, return, cost_of_living; did you mean job_loss?"},
		{"probability", "stress: 1\nevent: {job_loss: {probability: 1.5}}\n", "s.yaml:2:33: event.job_loss.probability: is 1.5, want from 0 to 1"},
		{"probability in a list", "stress: 1\nevent: {job_loss: {probability: [0.5, -1]}}\n", "s.yaml:2:39: event.job_loss.probability[1]: is -1, want from 0 to 1"},
		{"times", "stress: 1\nevent: {job_loss: {probability: {times: 15}}}\n", "s.yaml:2:41: event.job_loss.probability.times: makes the probability of job loss of group dockers 1.05"},
		{"times misspelt", "stress: 1\nevent: {job_loss: {probability: {time: 2}}}\n", "s.yaml:2:34: event.job_loss.probability.time: is not a key of the format; allowed here: times; did you mean times?"},
		{"a word", "stress: 1\nevent: {return: low}\n", "s.yaml:2:17: event.return: is low, want a number from -0.99 to 10"},
		{"a block", "stress: 1\nevent: {return: {value: 1}}\n", "s.yaml:2:17: event.return: is a block of keys, want a number from -0.99 to 10, or a list of them, one a year"},
		{"empty list", "stress: 1\nevent: {return: []}\n", "s.yaml:2:17: event.return: has 0 entries, want 1 to 120, one a year"},
		{"lists of two lengths", "stress: 1\nevent: {job_loss: {probability: [0.1, 0.2], benefit_rate: [0.1]}}\n", "s.yaml:2:19: event.job_loss: has lists of 2 and 1 years, want one length"},
		{"lasts beside a list", "stress: 1\nevent: {earnings: {level: [-0.1], lasts: 2}}\n", "s.yaml:2:42: event.earnings.lasts: stands beside a list of yearly values"},
		{"lasts", "stress: 1\nevent: {earnings: {level: -0.1, lasts: 0}}\n", "s.yaml:2:40: event.earnings.lasts: is 0, want a whole number from 1 to 120"},
		{"level", "stress: 1\nevent: {earnings: {level: -1.1}}\n", "s.yaml:2:27: event.earnings.level: is -1.1, want from -1 to 10"},
		{"jump", "stress: 1\nevent: {cost_of_living: {jump: -0.1, wealth: gold}}\n", "s.yaml:2:46: event.cost_of_living.wealth: is gold, want nominal or real"},
		{"group", "stress: 1\nevent: {return: 0}\nhits: {groups: [doctors]}\n", "s.yaml:3:17: hits.groups[0]: is doctors, want each of dockers, clerks or pilots at most once; did you mean dockers?"},
		{"groups", "stress: 1\nevent: {return: 0}\nhits: {groups: dockers}\n", "s.yaml:3:16: hits.groups: is dockers, want a list of dockers, clerks or pilots"},
		{"ages", "stress: 1\nevent: {return: 0}\nhits: {ages: {from: 24}}\n", "s.yaml:3:21: hits.ages.from: is 24, want a whole number from 25 to 100"},
		{"ages reversed", "stress: 1\nevent: {return: 0}\nhits: {ages: {from: 40, to: 30}}\n", "s.yaml:3:29: hits.ages.to: is 30, want at least from, 40"},
		{"expect", "stress: 1\nevent: {return: 0}\nhouseholds_expect: nothing\n", "s.yaml:3:20: households_expect: is nothing, want normal or stressed"},
		{"horizon", "stress: 1\nevent: {return: 0}\nyears: {horizon: 0}\n", "s.yaml:3:18: years.horizon: is 0, want a whole number from 1 to 100"},
		{"worst", "stress: 1\nevent: {return: 0}\nmeasures: {worst: [0], percentiles: [50, 50]}\n", "s.yaml:3:20: measures.worst[0]: is 0, want above 0 and at most 100"},
		{"twice", "stress: 1\nevent: {return: 0}\nmeasures: {worst: [1], percentiles: [50, 50]}\n", "s.yaml:3:37: measures.percentiles: has 50 twice"},
		{"not a mapping", "- 1\n", "s.yaml:1:1: is a list, want a stress: keys and values, beginning with stress: 1"},
		{"two documents", "stress: 1\n---\nstress: 1\n", "the file is one document"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			_, err := ParseStress("s.yaml", []byte(tt.text), quaysideFor(t))
			if err == nil || !strings.Contains(err.Error(), tt.want) || !IsFault(err) {
				t.Errorf("got %v\nwant %s", err, tt.want)
			}
		})
	}
	if _, err := LoadStress("nowhere.yaml", quaysideFor(t)); err == nil || !strings.Contains(err.Error(), "nowhere.yaml: cannot be read") {
		t.Errorf("a file that is not there: %v", err)
	}
	if _, err := BuiltinStress("harbour", quaysideFor(t)); err == nil || !strings.Contains(err.Error(), "is not a built-in stress; there are harbour-closure, price-shock") {
		t.Errorf("a stress that is not there: %v", err)
	}
}

// The resolved stress says everything and reads back as the same stress.
func TestResolvedStressRoundTrip(t *testing.T) {
	for _, text := range []string{
		"stress: 1\nevent: {return: -0.1}\n",
		"stress: 1\ntitle: \"a: b\"\nevent:\n  job_loss: {probability: {times: [3, 2]}, benefit_rate: [0.2, 0.3]}\n  earnings: {level: [-0.1, -0.05], persistent: -0.1}\n  return: [0.1]\n  cost_of_living: {jump: 0.05, lasts: 4, wealth: real}\nhits: {ages: {to: 50}, groups: [pilots, dockers]}\nhouseholds_expect: stressed\n",
	} {
		st := stressOf(t, text)
		again := stressOf(t, string(st.YAML()))
		if a, b := string(st.YAML()), string(again.YAML()); a != b || fmt.Sprint(st.Event, st.Window, st.Title) != fmt.Sprint(again.Event, again.Window, again.Title) {
			t.Errorf("resolved:\n%s\nread back and resolved again:\n%s", a, b)
		}
		for _, want := range []string{"households_expect:", "horizon: 10", "runway_months: [1, 3, 6]", "recovered_within: 5"} {
			if !strings.Contains(string(st.YAML()), want) {
				t.Errorf("the resolved stress has no %q:\n%s", want, st.YAML())
			}
		}
	}
}

// The schema accepts the stresses that ship with the program, as written and as
// resolved, and refuses what the program refuses; the judge is a general-purpose
// validator.
func TestStressSchema(t *testing.T) {
	doc, err := jsonschema.UnmarshalJSON(bytes.NewReader(StressSchema()))
	if err != nil {
		t.Fatal(err)
	}
	c := jsonschema.NewCompiler()
	if err := c.AddResource("stress.json", doc); err != nil {
		t.Fatal(err)
	}
	s, err := c.Compile("stress.json")
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range StressNames() {
		source, err := StressSource(name)
		if err != nil {
			t.Fatal(err)
		}
		for _, text := range [][]byte{source, stressOf(t, string(source)).YAML()} {
			if err := s.Validate(instance(t, text)); err != nil {
				t.Errorf("%s is refused: %v\n%s", name, err, text)
			}
		}
	}
	for _, wrong := range []string{"event: {return: 0}", "stress: 1", "stress: 1\nevent: {job_loss: {probability: 2}}", "stress: 1\nevent: {job_loss: {probability: {time: 2}}}",
		"stress: 1\nevent: {return: []}", "stress: 1\nevent: {earnings: {level: [-2]}}", "stress: 1\nevent: {return: 0}\nhits: {groups: []}", "stress: 1\nevents: {}"} {
		if s.Validate(instance(t, []byte(wrong))) == nil {
			t.Errorf("accepted: %s", wrong)
		}
	}
}

// Errors of the libraries that are the file's fault become faults at the event's
// place; others stay what they are.
func TestStressFault(t *testing.T) {
	st := stressOf(t, "stress: 1\nevent: {return: 0}\n")
	for _, err := range []error{&stress.HardshipError{Group: "dockers", Age: 30, Year: 1}, fmt.Errorf("x: %w", &income.FieldError{Field: "F", Want: "less"}), &sim.StateError{Event: true}} {
		got := st.Fault(err)
		if !IsFault(got) || !strings.HasPrefix(got.Error(), "s.yaml:2:8: event: ") {
			t.Errorf("%v became %v", err, got)
		}
	}
	for _, other := range []error{errors.New("disk full"), &sim.StateError{}} {
		if st.Fault(other) != other {
			t.Errorf("%v is not the file's fault and has changed", other)
		}
	}
}

// As many rows a year as will be, and not many more: expected life over the years of
// entry (derived).
func TestStressRows(t *testing.T) {
	sc := quaysideFor(t)
	sc.Households = 1_000_000
	st := stressOf(t, "stress: 1\nevent: {return: 0}\n")
	years, alive := 0.0, 1.0
	for _, s := range sc.Groups[0].Household.Survival {
		years += alive
		alive *= s
	}
	want := 1e6 * years / (76 + 12)
	if got := float64(sc.RowsAYear(st)); got < want || got > 1.03*want+math.Sqrt(1e6)*7 {
		t.Errorf("%v rows a year, expected %v", got, want)
	}
	if normal, stressed := sc.StressCost(st, 2, 1e6), sc.StressCost(stressOf(t, "stress: 1\nevent: {earnings: {persistent: -0.1}}\n"), 2, 1e6); !(stressed.MemoryBytes > normal.MemoryBytes+50e6) {
		t.Errorf("memory %v, with rules of its own for every age and year %v", normal.MemoryBytes, stressed.MemoryBytes)
	}
}
