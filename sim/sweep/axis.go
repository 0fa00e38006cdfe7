package sweep

import (
	"fmt"
	"math"
	"strconv"
)

// Axis is one scenario key that varies: over a list of values, or over a range.
type Axis struct {
	Key    string   // dotted scenario key
	Values []string // the list, as a scenario file writes values; nil: a range

	From, To float64 // of the range, From < To, in the unit of the key
	Steps    int     // values of the range in a factorial design, at least 2, both ends included
	Log      bool    // by equal ratios: From must be above 0
}

// Validate reports what is wrong with the axis, or nil.
func (a Axis) Validate() error {
	bad := func(field string, value any, want string) error {
		return &FieldError{Key: a.Key, Field: field, Value: value, Want: want}
	}
	switch {
	case a.Key == "":
		return bad("key", a.Key, "a key of the scenario")
	case a.Values != nil:
		if len(a.Values) == 0 {
			return bad("values", "empty", "at least one value")
		}
		seen := map[string]bool{}
		for _, v := range a.Values {
			if seen[v] {
				return bad("values", v, "every value once")
			}
			seen[v] = true
		}
		return nil
	case math.IsNaN(a.From) || math.IsInf(a.From, 0) || a.Log && a.From <= 0:
		want := "a finite number"
		if a.Log {
			want = "above 0, as the range goes by equal ratios"
		}
		return bad("from", a.From, want)
	case !(a.To > a.From) || math.IsInf(a.To, 0):
		return bad("to", a.To, fmt.Sprintf("above from, %v", a.From))
	}
	return nil
}

// levels is the number of values in a factorial design.
func (a Axis) levels() int {
	if a.Values != nil {
		return len(a.Values)
	}
	return a.Steps
}

// level returns value i of a factorial design as text. Both ends of a range are
// met exactly.
func (a Axis) level(i int) string {
	if a.Values != nil {
		return a.Values[i]
	}
	if i == a.Steps-1 {
		return number(a.To)
	}
	return number(a.at(float64(i) / float64(a.Steps-1)))
}

// read returns the value at u in [0, 1) as text.
func (a Axis) read(u float64) string {
	if a.Values != nil {
		return a.Values[min(int(u*float64(len(a.Values))), len(a.Values)-1)]
	}
	return number(a.at(u))
}

func (a Axis) at(u float64) float64 {
	if u == 0 {
		return a.From
	}
	if a.Log {
		return a.From * math.Exp(u*math.Log(a.To/a.From))
	}
	return a.From + float64(u*(a.To-a.From))
}

// number writes x with twelve significant digits: enough to tell points apart,
// and 0.95 instead of 0.9500000000000001.
func number(x float64) string {
	y, _ := strconv.ParseFloat(strconv.FormatFloat(x, 'g', 12, 64), 64)
	return strconv.FormatFloat(y, 'g', -1, 64)
}

// A FieldError is a setting of a design or an axis that cannot be.
type FieldError struct {
	Key   string // of the axis; empty: the design itself
	Field string
	Value any
	Want  string
}

func (e *FieldError) Error() string {
	if e.Key == "" {
		return fmt.Sprintf("sweep: %s is %v, want %s", e.Field, e.Value, e.Want)
	}
	return fmt.Sprintf("sweep: axis %s: %s is %v, want %s", e.Key, e.Field, e.Value, e.Want)
}
