package distribution

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// Groups is the number of jackknife groups: a row of unit u is in group u mod
// Groups. A power of two; with 64 a standard error is itself known to about 9 %.
const Groups = 64

// confidence of every interval.
const confidence = 0.95

// Variable is a column to describe.
type Variable struct {
	Name     string
	Optional bool        // NaN says that a row has no value; otherwise every value must be finite
	MeanOnly bool        // the standard deviation is not wanted, which saves time
	Shares   []Threshold // shares of rows to count
	Held     bool        // the distribution is wanted by some target: quantiles or anything made of them
}

// Threshold asks for the share of rows with a value at or below Value, or, where
// Strict, below it.
type Threshold struct {
	Value  float64 // in the unit of the variable
	Strict bool
}

// Set says what a target wants to know of a variable's distribution beyond means
// and shares.
type Set uint

// The parts of a Set.
const (
	Percentiles   Set = 1 << iota // all Options.Percentiles
	Median                        // the 50th percentile alone, unless Percentiles is asked for
	Gini                          // Gini coefficient
	Concentration                 // Lorenz ordinates, top shares, S80/S20
	Shortfall                     // expected shortfalls
	Tail                          // Hill's index
	Classes                       // means of Options.Means within classes
)

// sums are the parts made of partial sums between thresholds.
const sums = Concentration | Shortfall | Tail | Classes

// Target is a set of cells described as one.
type Target struct {
	Cells []Cell
	Wants []Set // [variable]

	// Independent says that the rows are independent and of equal weight: one a
	// unit. Intervals of quantiles and shares then need no design effect.
	Independent bool
}

// Cell is a cell of a target with its weight.
type Cell struct {
	Index  int
	Weight float64 // above 0
}

// Options says what a [Study] is about.
type Options struct {
	Variables []Variable
	Cells     int // cells are numbered from 0
	Targets   []Target

	Percentiles []float64 // in percent, each above 0 and below 100
	Lorenz      []float64 // poorest shares in percent, above 0 and below 100
	TopShares   []float64 // richest shares in percent, above 0 and below 100
	Shortfalls  []float64 // worst shares in percent, above 0 and at most 100
	Tails       []float64 // shares of the upper tail in percent, above 0 and below 100
	Classes     int       // quantile classes for Means, at least 2 where any target wants them
	Means       []int     // variables whose means within the classes of another are wanted

	Rows     int64 // how many rows there will be, at most: decides on the method
	Weighted bool  // rows carry weights, at least 0; they must then fit the budget
	Workers  int   // goroutines that call Add, at least 1
	Budget   int64 // bytes for values held at a time; 0: DefaultBudget
}

// DefaultBudget is 256 MiB.
const DefaultBudget = 256 << 20

// Validate reports every fault of the options at once.
func (o Options) Validate() error {
	var errs []error
	bad := func(format string, a ...any) {
		errs = append(errs, fmt.Errorf("distribution: "+format, a...))
	}
	if len(o.Variables) == 0 || len(o.Variables) > 250 {
		bad("%d variables, want 1 to 250", len(o.Variables))
	}
	if o.Cells < 1 || o.Rows < 0 || o.Rows >= 1<<50 || o.Workers < 1 || o.Budget < 0 {
		bad("%d cells, %d rows, %d workers, %d bytes: want at least 1 cell, rows from 0 to %d, workers from 1, bytes from 0",
			o.Cells, o.Rows, o.Workers, o.Budget, int64(1<<50-1))
	}
	for _, l := range []struct {
		name   string
		levels []float64
		whole  bool // 100 is a level
	}{{"percentile", o.Percentiles, false}, {"lorenz", o.Lorenz, false}, {"top share", o.TopShares, false}, {"shortfall", o.Shortfalls, true}, {"tail", o.Tails, false}} {
		for i, p := range l.levels {
			if !(p > 0 && p < 100 || p == 100 && l.whole) {
				bad("%s %v, want above 0 and below 100", l.name, p)
			} else if slices.Contains(l.levels[:i], p) {
				bad("%s %v stands twice", l.name, p)
			}
		}
	}
	for i, m := range o.Means {
		if m < 0 || m >= len(o.Variables) || slices.Contains(o.Means[:i], m) {
			bad("means of variable %d, want one of %d, each once", m, len(o.Variables))
		}
	}
	for _, v := range o.Variables {
		if v.MeanOnly && v.Held {
			bad("variable %s is held, but only its mean is wanted", v.Name)
		}
		for _, s := range v.Shares {
			if math.IsNaN(s.Value) {
				bad("variable %s: a threshold is no number", v.Name)
			}
		}
	}
	for i, t := range o.Targets {
		if err := o.validateTarget(t); err != nil {
			bad("target %d: %w", i, err)
		}
	}
	return errors.Join(errs...)
}

func (o Options) validateTarget(t Target) error {
	if len(t.Wants) != len(o.Variables) {
		return fmt.Errorf("wants something of %d variables, not %d", len(t.Wants), len(o.Variables))
	}
	for v, w := range t.Wants {
		if w != 0 && !o.Variables[v].Held {
			return fmt.Errorf("wants the distribution of %s, which is not held", o.Variables[v].Name)
		}
		if w&Classes != 0 && o.Classes < 2 {
			return fmt.Errorf("%d classes, want at least 2", o.Classes)
		}
	}
	seen := map[int]bool{}
	for _, c := range t.Cells {
		if c.Index < 0 || c.Index >= o.Cells || seen[c.Index] {
			return fmt.Errorf("cell %d is not one of %d, or stands twice", c.Index, o.Cells)
		}
		seen[c.Index] = true
		if !(c.Weight > 0) || math.IsInf(c.Weight, 1) {
			return fmt.Errorf("weight %v of cell %d, want above 0", c.Weight, c.Index)
		}
	}
	return nil
}

// weighted reports whether cells of the target differ in weight.
func (t *Target) weighted() bool {
	for _, c := range t.Cells {
		if c.Weight != t.Cells[0].Weight {
			return true
		}
	}
	return false
}
