package income

import (
	"errors"
	"fmt"
	"math"
	"slices"
)

// A Change is how a year's earnings differ from what their process says:
//
//	Factor · P_t·exp(z+Shift−κ_t)·exp(ε−σ²/2)   (form log),
//	Factor · (P_t + z + Shift + ε)              (form level),
//
// and in a year of job loss BenefitRate of JobLoss in place of the process's.
// The corrections κ_t and σ²/2 stay those of the process.
type Change struct {
	JobLoss JobLoss // in place of the process's
	Factor  float64 // ≥ 0; 1 changes nothing
	Shift   float64 // of the persistent part, in its unit; 0 changes nothing
}

// change returns how year t differs from the process.
func (e *Earnings) change(t int) Change {
	if e.changes == nil {
		return Change{JobLoss: e.JobLoss, Factor: 1}
	}
	return e.changes[t]
}

// Change returns earnings that are those of e but for the years from first on, one
// for each of changes, which replace what e had there. The chain and its
// distribution by age stay the same; so does what the persistent part supports in
// the end ([Earnings.Final]) but for the Shift of the last working year. Invalid
// changes are reported as *FieldError, all at once. It panics if there are more
// changes than years.
func (e *Earnings) Change(first int, changes []Change) (*Earnings, error) {
	if first < 0 || first+len(changes) > e.Years() {
		panic("income: changes beyond the working years")
	}
	var f faults
	for i, c := range changes {
		c.validate(&f, e.FirstAge+first+i)
	}
	if err := errors.Join(f...); err != nil {
		return nil, err
	}
	d := *e
	d.Base, d.Benefit, d.values = slices.Clone(e.Base), slices.Clone(e.Benefit), slices.Clone(e.values)
	d.changes, d.changed = make([]Change, e.Years()), make([][]float64, e.Years())
	for t := range d.changes {
		d.changes[t], d.changed[t] = e.change(t), e.outcomeWeights(t)
	}
	for i, c := range changes {
		t := first + i
		d.changes[t], d.changed[t] = c, d.weigh(c.JobLoss.Probability)
		d.fillYear(t)
		if err := d.checkYear(t); err != nil {
			return nil, err
		}
	}
	d.fillFinal()
	return &d, nil
}

func (c Change) validate(f *faults, age int) {
	at := func(field string) string { return fmt.Sprintf("Change.%s at age %d", field, age) }
	if q := c.JobLoss.Probability; !(q >= 0 && q <= 1) {
		f.add(at("JobLoss.Probability"), q, "from 0 to 1")
	}
	if b := c.JobLoss.BenefitRate; !(b >= 0) || math.IsInf(b, 1) {
		f.add(at("JobLoss.BenefitRate"), b, "at least 0 and finite")
	}
	if x := c.Factor; !(x >= 0) || math.IsInf(x, 1) {
		f.add(at("Factor"), x, "at least 0 and finite")
	}
	if x := c.Shift; math.IsNaN(x) || math.IsInf(x, 0) {
		f.add(at("Shift"), x, "a finite number")
	}
}

// JobLossIn returns the risk of job loss in year t.
func (e *Earnings) JobLossIn(t int) JobLoss { return e.change(t).JobLoss }

// TransitorySD returns the standard deviation of what the transitory shock does in
// year t: of ε in form log, of money in form level.
func (e *Earnings) TransitorySD(t int) float64 {
	if e.Form == Level {
		return e.Transitory.SD * e.change(t).Factor
	}
	return e.Transitory.SD
}

// Final returns the final earnings that the persistent part supports at a node, in
// money: P_c·exp(z_c−κ_c) or P_c + z_c in the last working year c. The Factor of a
// [Change] of that year does not count.
func (e *Earnings) Final(node int) float64 { return e.final[node] }
