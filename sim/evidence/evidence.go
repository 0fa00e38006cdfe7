package evidence

import (
	"context"
	"fmt"
	"math"
)

// Check is one comparison. It passes if |Found − Expected| ≤ Tolerance.
type Check struct {
	Area      string // the package concerned: income, policy or sim
	Name      string // what is compared
	Source    string // where the expected value comes from
	Expected  float64
	Found     float64
	Tolerance float64 // absolute
}

// Pass reports whether the value found is the one expected.
func (c Check) Pass() bool { return math.Abs(c.Found-c.Expected) <= c.Tolerance }

// A suite adds the checks of one area.
type suite func(ctx context.Context) ([]Check, error)

// Run makes every check, in a fixed order, and calls onCheck, if not nil, after
// each. It stops with an error where a check cannot be made at all or ctx ends; a
// check that fails is no error.
func Run(ctx context.Context, onCheck func(Check)) ([]Check, error) {
	var all []Check
	for _, s := range []suite{chains, certainPaths, exponential, limits, panel, events} {
		checks, err := s(ctx)
		if err != nil {
			return all, fmt.Errorf("evidence: %w", err)
		}
		for _, c := range checks {
			all = append(all, c)
			if onCheck != nil {
				onCheck(c)
			}
		}
	}
	return all, nil
}
