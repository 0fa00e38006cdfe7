package pension

import (
	"errors"
	"math"

	"cistern/income"
)

// A FieldError is a value that a rule cannot have. Field is the path of Go names
// below [Rules], such as "Claim.Statutory". Where there are several they come
// joined; [income.Faults] takes them apart.
type FieldError = income.FieldError

// faults collects field errors.
type faults []error

func (f *faults) add(field string, value any, want string) {
	*f = append(*f, &FieldError{Field: field, Value: value, Want: want})
}

func (f faults) err() error { return errors.Join(f...) }

// A limits is an allowed range of numbers, in words and as a test that NaN fails.
type limits struct {
	want string
	ok   func(float64) bool
}

var (
	fraction   = limits{"from 0 to 1", func(x float64) bool { return x >= 0 && x <= 1 }}
	belowOne   = limits{"at least 0 and below 1", func(x float64) bool { return x >= 0 && x < 1 }}
	notBelow0  = limits{"at least 0 and finite", func(x float64) bool { return x >= 0 && !math.IsInf(x, 1) }}
	positive   = limits{"positive, +Inf for none", func(x float64) bool { return x > 0 }}
	finiteRate = limits{"above -1 and finite", func(x float64) bool { return x > -1 && !math.IsInf(x, 1) }}
	someAge    = limits{"an age from 1 to 150", func(x float64) bool { return x >= 1 && x <= 150 }}
	finite     = limits{"a finite number", func(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }}
)
