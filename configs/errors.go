package configs

import (
	"cmp"
	"errors"
	"fmt"
	"slices"
)

// A PosError is a mistake at a known place in a scenario or in a table that a
// scenario names. Line and Column count from 1; both are 0 for a value that did
// not come from the file, and Line alone is set for tables.
type PosError struct {
	File         string
	Line, Column int
	Key          string // dotted path of the setting, empty where the file as a whole is at fault
	Message      string // what is wrong and what is allowed
}

func (e *PosError) Error() string {
	s := e.File
	if e.Line > 0 {
		s += fmt.Sprintf(":%d", e.Line)
		if e.Column > 0 {
			s += fmt.Sprintf(":%d", e.Column)
		}
	}
	if e.Key != "" {
		s += ": " + e.Key
	}
	return s + ": " + e.Message
}

// maxFaults is how many faults are reported: whoever has more has one to begin
// with.
const maxFaults = 100

// faults collects position errors, each once and at most maxFaults.
type faults struct {
	list []*PosError
	more bool // there were others
}

func (f *faults) add(e *PosError) {
	if len(f.list) >= maxFaults {
		f.more = true
		return
	}
	for _, x := range f.list {
		if *x == *e {
			return
		}
	}
	f.list = append(f.list, e)
}

// err returns all faults in the order of their places, joined.
func (f *faults) err() error {
	slices.SortStableFunc(f.list, func(a, b *PosError) int {
		return cmp.Or(cmp.Compare(a.File, b.File), cmp.Compare(a.Line, b.Line), cmp.Compare(a.Column, b.Column))
	})
	var errs []error
	for _, e := range f.list {
		errs = append(errs, e)
	}
	if f.more {
		errs = append(errs, fmt.Errorf("and more: only the first %d faults are listed", maxFaults))
	}
	return errors.Join(errs...)
}

// IsFault reports whether err is a mistake in a scenario or its overrides.
func IsFault(err error) bool {
	var p *PosError
	return errors.As(err, &p)
}
