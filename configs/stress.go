package configs

import (
	"errors"
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"

	"cistern/income"
	"cistern/policy"
	"cistern/sim"
	"cistern/sim/stress"
)

// Stress is an event as described, checked and resolved against a scenario.
type Stress struct {
	Name   string // of the file without its ending, or of a built-in stress
	Title  string
	Event  stress.Event
	Window stress.Window

	Percentiles  []float64 // in percent
	RunwayMonths []float64
	DryMonths    float64
	Worst        []float64 // in percent
	Within       float64   // fraction

	resolved *tree
	at       *node // the event's block
}

// LoadStress reads the stress in a file, which must fit the scenario: its groups,
// ages and rates. All faults are reported at once, each as a *PosError.
func LoadStress(file string, sc *Scenario) (*Stress, error) {
	data, err := readBounded(file, maxScenarioBytes)
	if err != nil {
		return nil, &PosError{File: file, Message: fmt.Sprintf("cannot be read: %v", unwrapped(err))}
	}
	return resolveStress(strings.TrimSuffix(filepath.Base(file), filepath.Ext(file)), file, data, sc)
}

// BuiltinStress reads a stress that ships with the program.
func BuiltinStress(name string, sc *Scenario) (*Stress, error) {
	data, err := StressSource(name)
	if err != nil {
		return nil, err
	}
	return resolveStress(name, name+".yaml", data, sc)
}

// ParseStress reads a stress from memory; source stands for it in errors.
func ParseStress(source string, data []byte, sc *Scenario) (*Stress, error) {
	return resolveStress(source, source, data, sc)
}

func resolveStress(name, source string, data []byte, sc *Scenario) (*Stress, error) {
	root, faults := parse(source, data)
	if root == nil {
		return nil, faults.err()
	}
	if root.kind != mapping {
		faults.add(&PosError{File: source, Line: root.line, Column: root.column, Message: "is " + root.show() + ", want a stress: keys and values, beginning with stress: 1"})
		return nil, faults.err()
	}
	out := new(tree)
	st := describeStress(&section{w: &walk{faults: faults}, n: root, out: out}, sc)
	if err := faults.err(); err != nil {
		return nil, err
	}
	st.Name, st.resolved, st.at = name, out, root.get("event")
	return st, nil
}

// YAML returns the stress as resolved, every default written out. Reading it with
// the same scenario gives the same stress.
func (st *Stress) YAML() []byte {
	var b strings.Builder
	b.WriteString("# The stress as resolved: every default is written out.\n")
	st.resolved.write(&b, "")
	return []byte(b.String())
}

// Fault turns what the event does to a household that could not live through it
// into a fault of the file, and leaves other errors as they are.
func (st *Stress) Fault(err error) error {
	var hard *stress.HardshipError
	var earnings *income.FieldError
	var household *policy.FieldError
	var state *sim.StateError
	message := ""
	switch {
	case errors.As(err, &hard):
		message = strings.TrimPrefix(hard.Error(), "stress: ")
	case errors.As(err, &earnings):
		message = "makes " + earnings.Error()
	case errors.As(err, &household):
		message = "makes " + household.Error()
	case errors.As(err, &state) && state.Event:
		message = strings.TrimPrefix(state.Error(), "sim: ")
	default:
		return err
	}
	return &PosError{File: st.at.source, Line: st.at.line, Column: st.at.column, Key: "event", Message: message}
}

// StressNames returns the built-in stresses.
func StressNames() []string { return shippedNames("stresses") }

// StressSource returns a built-in stress as it is written, comments and all.
func StressSource(name string) ([]byte, error) {
	data, err := shipped.ReadFile("stresses/" + name + ".yaml")
	if err != nil {
		return nil, &PosError{File: name, Message: fmt.Sprintf("is not a built-in stress; there are %s%s", strings.Join(StressNames(), ", "), suggest(name, StressNames()))}
	}
	return data, nil
}

// StressTitle returns the title of a built-in stress.
func StressTitle(name string) (string, error) {
	data, err := StressSource(name)
	if err != nil {
		return "", err
	}
	root, faults := parse(name, data)
	if title := root.get("title"); title != nil {
		return title.text, nil
	}
	return "", faults.err()
}

// Autocorrelations returns the autocorrelation of the persistent part of all
// Problems.
func (sc *Scenario) Autocorrelations() []float64 {
	var rho []float64
	for _, p := range sc.Problems() {
		rho = append(rho, sc.Groups[p.Group].Process.Autocorrelation)
	}
	return rho
}

// StressCost estimates what a stress takes: the scenario's households solved once
// more for the years that need it, and lived as many times as there are passes.
// held is what values held at a time take, in bytes.
func (sc *Scenario) StressCost(st *Stress, workers int, held float64) Cost {
	c := Cost{MemoryBytes: bytesFixed + float64(max(workers, 1))*bytesPerWorker + held}
	tables := 1.0 // rules kept, in lives
	switch {
	case st.Event.Persistent != 0:
		tables += float64(st.Window.After + 1)
	case st.Event.Expect == stress.Foreseen:
		tables += float64(min(len(st.Event.Years), st.Window.After+1) - 1)
	}
	for _, p := range sc.Problems() {
		points := float64(sc.Solver.AssetPoints)
		if sc.Solver.Interpolation == policy.Cubic {
			points *= kinkNodes
		}
		c.MemoryBytes += points * float64(p.Household.Nodes()) * float64(p.Household.Years()) * bytesPerRule * max(1, tables)
	}
	return c
}

// alive returns the share of households of all entries that live in a year of a
// stress's window: expected years of life over the years of entry.
func (sc *Scenario) alive(st *Stress) float64 {
	years, cohorts := 0.0, 0.0
	for _, p := range sc.Problems() {
		h, share := p.Household, sc.Groups[p.Group].Share/float64(len(sc.Groups[p.Group].Discounts))
		lived := 1.0
		for _, s := range h.Survival {
			years += share * lived
			lived *= s
		}
		cohorts = float64(stress.NewEntries(st.Window, h.Years()).Cohorts)
	}
	return years / cohorts
}

// RowsAYear returns an upper bound on how many households live in a year of the
// stress's window: what is expected, and six binomial standard deviations or more.
func (sc *Scenario) RowsAYear(st *Stress) int64 {
	n := float64(sc.Households)
	return min(sc.Households, int64(n*sc.alive(st)*1.02)+int64(6*math.Sqrt(n))+100)
}

func shippedNames(folder string) []string {
	entries, err := shipped.ReadDir(folder)
	if err != nil {
		panic("configs: " + err.Error()) // embedded
	}
	var names []string
	for _, e := range entries {
		if name, ok := strings.CutSuffix(e.Name(), ".yaml"); ok {
			names = append(names, name)
		}
	}
	slices.Sort(names)
	return names
}
