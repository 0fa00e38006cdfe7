package policy

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"cistern/income"
)

// A FieldError is a value that a household cannot have. Field is the Go name of
// the field, with a dot between levels.
type FieldError struct {
	Field string
	Value any
	Want  string // the allowed range, in words
}

func (e *FieldError) Error() string {
	return fmt.Sprintf("%s: is %v, want %s", e.Field, e.Value, e.Want)
}

// Bequest is the motive to leave an estate: v(x) = Weight·u(x + Shift), x the
// estate R·a in money. Weight 0 means no motive.
type Bequest struct {
	Weight float64 // ≥ 0
	Shift  float64 // money, ≥ 0
}

// LimitKind says how the borrowing limit is given.
type LimitKind int

const (
	LimitAmount  LimitKind = iota // an amount of money
	LimitNatural                  // whatever the lowest possible income can repay
	LimitNone                     // none: only for utilities that allow any consumption
)

// Limit is the borrowing limit: assets at the end of a year stay ≥ −b_t. Under
// LimitAmount b_t is Amount as long as the lowest income still to come can repay
// it, and that lowest income's present value afterwards: nobody leaves the last
// year with debt.
type Limit struct {
	Kind   LimitKind
	Amount float64 // money, ≥ 0; LimitAmount only
}

// Household is the problem of one type of household: everything it faces from
// FirstAge to its last possible age. Index t counts years from FirstAge. A
// Household is not changed by solving or simulating and may be shared.
type Household struct {
	FirstAge       int
	Survival       []float64 // [T] chance to live from t to t+1; the last is 0
	Utility        Utility
	DiscountFactor float64 // β, a year, > 0
	Bequest        Bequest
	Return         float64   // r, a year, > −1
	Returns        []float64 // [T] r of each year, earned on what was kept the year before, where it differs from year to year; nil: Return in all
	Limit          Limit
	Earnings       *income.Earnings // working ages FirstAge … ClaimAge−1
	Pension        Pension
	Laws           Laws // what earnings and entitlements come to, in place of Pension; nil: earnings are spendable as they are and Pension is paid
}

// Years returns T, the number of years from the first to the last possible age.
func (h Household) Years() int { return len(h.Survival) }

// WorkingYears returns the number of years before the claim age.
func (h Household) WorkingYears() int { return min(h.Earnings.Years(), h.Years()) }

// ReturnIn returns r of year t, which is earned on the assets kept in year t−1.
func (h Household) ReturnIn(t int) float64 {
	if t < len(h.Returns) {
		return h.Returns[t]
	}
	return h.Return
}

// Nodes returns the number of persistent nodes.
func (h Household) Nodes() int { return h.Earnings.Chain.Len() }

// Working reports whether year t is before the claim age.
func (h Household) Working(t int) bool { return t < h.WorkingYears() }

// Income returns the income that a household without Laws can meet at a persistent
// node in year t, as values (money) with their probabilities, the same probabilities for
// every node of a working year and a single certain value from the claim age on.
// The transitory shock stands at its quadrature nodes.
func (h Household) Income(t, node int) (values, weights []float64) {
	if h.Working(t) {
		return h.Earnings.Outcomes(t, node)
	}
	return []float64{h.PensionIn(t, node)}, certainty
}

var certainty = []float64{1}

// Moves reports whether the persistent node can change between t and t+1: it
// does while the next year is worked, and stays at its last working value then.
func (h Household) Moves(t int) bool { return h.Working(t + 1) }

// MeanIncome returns mean net income in year t over nodes and shocks, in money. With
// Laws it is that of a household which earns the mean of every age.
func (h Household) MeanIncome(t int) float64 {
	if h.Laws != nil {
		net, _ := h.career()
		return net[t]
	}
	if h.Working(t) {
		return h.Earnings.Mean(t)
	}
	last := h.Earnings.Distribution[h.WorkingYears()-1]
	mean := 0.0
	for j, p := range last {
		mean += p * h.PensionIn(t, j)
	}
	return mean
}

// peakIncome returns the highest mean income of any year, in money; 1 where nobody
// has any.
func (h Household) peakIncome() float64 {
	peak := 0.0
	if h.Laws != nil {
		net, _ := h.career()
		for _, y := range net {
			peak = math.Max(peak, math.Abs(y))
		}
	} else {
		for t := range h.Years() {
			peak = math.Max(peak, math.Abs(h.MeanIncome(t)))
		}
	}
	if peak == 0 {
		return 1
	}
	return peak
}

// Validate reports every fault at once, each as a *FieldError.
func (h Household) Validate() error {
	var errs []error
	bad := func(field string, value any, want string) {
		errs = append(errs, &FieldError{field, value, want})
	}
	if h.Utility == nil {
		return errors.Join(&FieldError{"Utility", nil, "a utility family"})
	}
	if h.Earnings == nil || h.Earnings.Years() == 0 {
		return errors.Join(&FieldError{"Earnings", nil, "at least one working year"})
	}
	if h.Years() == 0 {
		return errors.Join(&FieldError{"Survival", "empty", "at least one year of life"})
	}
	for t, s := range h.Survival {
		if !(s >= 0 && s <= 1) {
			bad(fmt.Sprintf("Survival[%d]", t), s, "between 0 and 1")
		}
	}
	if s := h.Survival[h.Years()-1]; s != 0 {
		bad("Survival[last]", s, "0: nobody outlives the last age")
	}
	if !(h.DiscountFactor > 0) || math.IsInf(h.DiscountFactor, 1) {
		bad("DiscountFactor", h.DiscountFactor, "positive and finite")
	}
	if !(h.Return > -1) || math.IsInf(h.Return, 1) {
		bad("Return", h.Return, "above -1 and finite")
	}
	if n := len(h.Returns); n != 0 && n != h.Years() {
		bad("Returns", fmt.Sprintf("%d returns", n), fmt.Sprintf("%d, one for each year of life, or none", h.Years()))
	}
	for t, r := range h.Returns {
		if !(r > -1) || math.IsInf(r, 1) {
			bad(fmt.Sprintf("Returns[%d]", t), r, "above -1 and finite")
		}
	}
	if n := len(h.Pension.Worth); n != 0 && n != h.Years() {
		bad("Pension.Worth", fmt.Sprintf("%d values", n), fmt.Sprintf("%d, one for each year of life, or none", h.Years()))
	}
	for t, x := range h.Pension.Worth {
		if !(x >= 0) || math.IsInf(x, 1) {
			bad(fmt.Sprintf("Pension.Worth[%d]", t), x, "at least 0 and finite")
		}
	}
	if !(h.Bequest.Weight >= 0) || math.IsInf(h.Bequest.Weight, 1) {
		bad("Bequest.Weight", h.Bequest.Weight, "at least 0 and finite")
	}
	if !(h.Bequest.Shift >= 0) || math.IsInf(h.Bequest.Shift, 1) {
		bad("Bequest.Shift", h.Bequest.Shift, "at least 0 and finite")
	}
	if h.Limit.Kind == LimitAmount && (!(h.Limit.Amount >= 0) || math.IsInf(h.Limit.Amount, 1)) {
		bad("Limit.Amount", h.Limit.Amount, "at least 0 and finite")
	}
	if h.Limit.Kind == LimitNone && !math.IsInf(h.Utility.Infimum(), -1) {
		bad("Limit", "none", "0, an amount or natural: with "+h.Utility.Family()+" utility debt without limit has no solution")
	}
	if err := errors.Join(errs...); err != nil {
		return err
	}
	if err := h.validateLaws(); err != nil {
		return err
	}
	bounds, err := h.bounds(h.entitlementGrids(DefaultOptions()))
	if err != nil {
		return err
	}
	return h.validateEstate(bounds)
}

// validateEstate sees to it that no estate that the limit allows is one that the
// bequest motive cannot bear.
func (h Household) validateEstate(bounds [][]float64) error {
	floor := h.Utility.Infimum()
	if h.Bequest.Weight == 0 || math.IsInf(floor, -1) {
		return nil
	}
	for t, s := range h.Survival {
		worst := (1 + h.ReturnIn(t+1)) * slices.Min(bounds[t])
		if s < 1 && worst+h.Bequest.Shift < floor {
			return &FieldError{"Bequest.Shift", h.Bequest.Shift, fmt.Sprintf("at least %.6g: who dies at age %d may owe %.6g, and utility of the estate must bear it",
				floor-worst, h.FirstAge+t, -worst)}
		}
	}
	return nil
}
