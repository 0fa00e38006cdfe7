package income

import "fmt"

// A FieldError is a value that a field cannot have.
type FieldError struct {
	Field string
	Value any
	Want  string // the allowed range, in words
}

func (e *FieldError) Error() string {
	return fmt.Sprintf("%s: is %v, want %s", e.Field, e.Value, e.Want)
}

// faults collects field errors.
type faults []error

func (f *faults) add(field string, value any, want string) {
	*f = append(*f, &FieldError{field, value, want})
}
