package income

import (
	"errors"
	"fmt"
)

// A FieldError is a value that a field cannot have. Where there are several, they
// come joined; [Faults] takes them apart.
type FieldError struct {
	Field string // Go name, with a dot between levels and an index where there is one
	Value any
	Want  string // the allowed range, in words
}

func (e *FieldError) Error() string {
	return fmt.Sprintf("%s: is %v, want %s", e.Field, e.Value, e.Want)
}

// Faults returns the field errors in err, in the order found.
func Faults(err error) []*FieldError {
	switch e := err.(type) {
	case nil:
		return nil
	case *FieldError:
		return []*FieldError{e}
	case interface{ Unwrap() []error }:
		var out []*FieldError
		for _, part := range e.Unwrap() {
			out = append(out, Faults(part)...)
		}
		return out
	}
	return Faults(errors.Unwrap(err))
}

// faults collects field errors.
type faults []error

func (f *faults) add(field string, value any, want string) {
	*f = append(*f, &FieldError{field, value, want})
}

// addAll adds the faults of a part.
func (f *faults) addAll(err error) {
	if err != nil {
		*f = append(*f, err)
	}
}
