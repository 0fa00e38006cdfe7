package pension

import (
	"fmt"
	"math"
	"slices"
)

// A Law is the rules as one birth cohort meets them. It is immutable and safe for
// concurrent use.
type Law struct {
	rules   Rules
	cohort  Cohort
	claims  claims
	years   []year // [T]
	pillars []accrued
	final   accrued   // final earnings in the place of an entitlement
	flat    []float64 // [T] money
	factor  []float64 // [c] of flat pensions for the claim age
}

// A year is what a Law needs to know of one year.
type year struct {
	employee, pensioner                  float64
	ceiling, deductible, taxablePensions float64
	onBenefits                           bool
	brackets                             *Piecewise // tax where it has brackets, for speed
	tax                                  Schedule   // nil where there is no tax
	minimum                              topUp
	motion                               [MaxPillars]motion
	wage                                 float64
	support                              Support
	floor, interest, consumption         float64
	employer                             float64
}

// For returns the rules as a cohort meets them, which must not be changed any more.
// Every fault is reported at once, each as a *FieldError; years for which a table
// has no value are among them.
func (r Rules) For(c Cohort) (*Law, error) {
	if err := r.Validate(); err != nil {
		return nil, err
	}
	var f faults
	if c.validate(&f, r.Wages); f != nil {
		return nil, f.err()
	}
	c.Survival, c.Returns = slices.Clone(c.Survival), slices.Clone(c.Returns)
	l := &Law{rules: r, cohort: c}
	rs := &resolver{wages: r.Wages, cohort: c, f: &f}
	if l.fillWages(rs); f != nil {
		return nil, f.err()
	}
	l.claims = r.Claim.claims(rs)
	l.fillYears(rs)
	l.fillPillars(rs)
	if f != nil {
		return nil, f.err()
	}
	return l, nil
}

// fillWages sets W by year.
func (l *Law) fillWages(r *resolver) {
	r.wage = r.levels("Wages.Growth", WithWages())
	for t := range r.wage {
		r.wage[t] *= l.rules.Wages.Average
		if !(r.wage[t] > 0) || math.IsInf(r.wage[t], 1) {
			r.f.add("Wages.Growth", fmt.Sprintf("average earnings of %v in %d", r.wage[t], r.year(t)), "growth under which they stay positive and finite")
			return
		}
	}
}

// fillYears sets what does not depend on pillars.
func (l *Law) fillYears(r *resolver) {
	c, x := &l.rules.Contributions, &l.rules.Taxes
	l.years = make([]year, len(r.wage))
	ceiling := r.amounts("Contributions.Ceiling", c.Ceiling, r.levels("Contributions.Uprating", c.Uprating))
	tax := x.Income.schedules(r, r.wage)
	support := l.rules.Assistance.supports(r)
	for t := range l.years {
		brackets, _ := tax[t].(*Piecewise)
		l.years[t] = year{
			wage:            r.wage[t],
			employee:        r.at("Contributions.Employee", c.Employee, t),
			employer:        r.at("Contributions.Employer", c.Employer, t),
			pensioner:       r.at("Contributions.Pensioner", c.Pensioner, t),
			ceiling:         ceiling[t],
			deductible:      r.at("Contributions.Deductible", c.Deductible, t),
			taxablePensions: r.at("Taxes.Pensions", x.Pensions, t),
			onBenefits:      c.OnBenefits,
			tax:             tax[t],
			brackets:        brackets,
			support:         support[t],
			interest:        r.at("Taxes.Interest", x.Interest, t),
			consumption:     r.at("Taxes.Consumption", x.Consumption, t),
		}
	}
	if m := l.rules.Minimum; m != nil {
		amount := r.amounts("Minimum.Amount", m.Amount, r.levels("Minimum.Uprating", m.Uprating))
		for t := range l.years {
			l.years[t].minimum = topUp{amount[t], r.at("Minimum.Taper", m.Taper, t)}
		}
	}
	if m := l.rules.Floor; m != nil {
		amount := r.amounts("Floor.Amount", m.Amount, r.levels("Floor.Uprating", m.Uprating))
		for t := range l.years {
			l.years[t].floor = amount[t]
		}
	}
	l.checkMargins(r)
}

// checkMargins sees to it that net income rises with gross income, and reports the
// first year in which it does not.
func (l *Law) checkMargins(r *resolver) {
	if len(*r.f) > 0 {
		return
	}
	for t := range l.years {
		y := &l.years[t]
		checkMargin(r.f, y.tax, r.year(t), y.ceiling, powerReach*y.wage, "Contributions.Employee", y.employee, y.deductible)
		checkMargin(r.f, y.tax, r.year(t), math.Inf(1), powerReach*y.wage, "Contributions.Pensioner", y.pensioner, y.deductible)
		if len(*r.f) > 0 {
			return
		}
	}
}
