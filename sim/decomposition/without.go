package decomposition

import (
	"fmt"
	"math"

	"cistern/policy"
)

// without returns h without a cause, and whether that is another problem. Longevity
// risk is not removed from h itself: see knowing.
func without(h policy.Household, cause Cause) (_ policy.Household, differs bool, err error) {
	switch cause {
	case IncomeRisk:
		twin, err := h.Twin()
		return twin, !certain(&h), err
	case LongevityRisk:
		for _, s := range h.Survival[:h.Years()-1] {
			differs = differs || s < 1
		}
	case BorrowingLimit:
		free := policy.Limit{Kind: policy.LimitNatural}
		if math.IsInf(h.Utility.Infimum(), -1) {
			free.Kind = policy.LimitNone
		}
		differs = h.Limit != free
		h.Limit = free
	}
	return h, differs, nil
}

// certain reports whether a household has no income risk.
func certain(h *policy.Household) bool {
	for t := range h.WorkingYears() {
		if values, _ := h.Income(t, 0); len(values) > 1 {
			return false
		}
	}
	return h.Nodes() == 1
}

// Feasible reports the first cause in order that cannot be removed from h, as no
// household could live without it and without those before it.
func Feasible(h policy.Household, order []Cause) error {
	known := false
	for _, cause := range order {
		free, _, err := without(h, cause)
		if err != nil {
			return err
		}
		h, known = free, known || cause == LongevityRisk
		if known { // shortest and longest life
			if err = knowing(h, 1).Validate(); err == nil {
				err = knowing(h, h.Years()).Validate()
			}
		} else {
			err = h.Validate()
		}
		if err != nil {
			return fmt.Errorf("%v cannot be removed: %w", cause, err)
		}
	}
	return nil
}
