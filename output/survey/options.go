package survey

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
)

// Options says what to describe.
type Options struct {
	Files     []string // Parquet files, in order; all have the columns asked for
	Unit      string   // column of the unit that a row belongs to, whole numbers or text; empty: each row is a unit of its own
	Weight    string   // column of weights; empty: every row counts the same
	By        []string // columns to tell apart, whole numbers, bools or text
	Variables []string // columns to describe; none: all numbers that are not named above

	Percentiles []float64 // in percent
	Lorenz      []float64 // poorest shares, in percent
	TopShares   []float64 // richest shares, in percent
	Shortfalls  []float64 // worst shares, in percent
	Tail        float64   // upper share whose tail index is wanted, in percent; 0: none

	Workers    int
	Budget     int64                               // bytes for values held at a time; 0: the engine's own
	OnProgress func(stage string, done, all int64) // row groups; called one at a time
}

// reserved are the columns of the table beside those told apart.
var reserved = []string{"panel", "variable", "statistic", "level", "estimate", "standard_error", "lower", "upper", "rows"}

// names reports columns that are named twice or whose names the table needs.
func (o *Options) names() error {
	for i, name := range o.By {
		if slices.Contains(o.By[:i], name) {
			return &ColumnError{Column: name, Problem: "is to be told apart twice"}
		}
		if slices.Contains(reserved, name) {
			return &ColumnError{Column: name, Problem: "cannot be told apart: the table has a column of that name itself"}
		}
	}
	for i, name := range o.Variables {
		if slices.Contains(o.Variables[:i], name) {
			return &ColumnError{Column: name, Problem: "is to be described twice"}
		}
	}
	if len(o.By) > mostColumns {
		return &ColumnError{Column: o.By[mostColumns], Problem: fmt.Sprintf("is one too many to tell apart: want at most %d", mostColumns)}
	}
	return nil
}

// Levels reports lists of levels that cannot be.
func (o Options) Levels() error {
	var errs []error
	for _, l := range []struct {
		name   string
		levels []float64
		most   float64
	}{{"percentiles", o.Percentiles, 100}, {"lorenz", o.Lorenz, 100}, {"top-shares", o.TopShares, 100}, {"shortfall", o.Shortfalls, math.Nextafter(100, 101)}, {"tail", []float64{o.Tail}, 100}} {
		for i, p := range l.levels {
			switch {
			case l.name == "tail" && p == 0:
			case !(p > 0 && p < l.most):
				errs = append(errs, fmt.Errorf("%s is %v, want above 0 and below 100", l.name, p))
			case slices.Contains(l.levels[:i], p):
				errs = append(errs, fmt.Errorf("%s has %v twice", l.name, p))
			}
		}
	}
	return errors.Join(errs...)
}

// MostCells is how many cells may be told apart.
const MostCells = 100_000

// A ColumnError is a column that a file lacks or that cannot serve.
type ColumnError struct {
	File, Column, Problem string   // File is empty where it is the same for all
	Known                 []string // columns that the file has
}

func (e *ColumnError) Error() string {
	text := fmt.Sprintf("column %s %s", e.Column, e.Problem)
	if e.File != "" {
		text = e.File + ": " + text
	}
	if len(e.Known) > 0 {
		text += "; it has " + strings.Join(e.Known, ", ")
	}
	return text
}

// A ValueError is a value that has no place in a statistic.
type ValueError struct {
	File, Column string
	Row          int64 // from 1
	Problem      string
}

func (e *ValueError) Error() string {
	return fmt.Sprintf("%s: column %s %s in row %d", e.File, e.Column, e.Problem, e.Row)
}
