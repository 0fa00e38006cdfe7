package pension

import (
	"fmt"
	"math"
	"slices"
)

// A Piecewise is a continuous piecewise-linear function that is 0 up to 0,
//
//	f(x) = Σ_i rate_i · min(max(x − from_i, 0), from_{i+1} − from_i),
//
// the tax of a schedule of brackets or the pension of a benefit formula. It is
// immutable.
type Piecewise struct {
	from  []float64 // ascending, the first 0
	value []float64 // f(from)
	rate  []float64
}

// NewPiecewise returns the function with the given rates from the given edges on.
// The first edge must be 0, the others ascending and finite, the rates finite; else
// *FieldError values with fields From[i] and Rate[i].
func NewPiecewise(from, rate []float64) (*Piecewise, error) {
	var f faults
	validateEdges(&f, func(i int) string { return fmt.Sprintf("From[%d]", i) }, "", from)
	if len(rate) != len(from) {
		f.add("Rate", fmt.Sprintf("%d rates", len(rate)), fmt.Sprintf("%d, one for each bracket", len(from)))
	}
	for i, x := range rate {
		if !finite.ok(x) {
			f.add(fmt.Sprintf("Rate[%d]", i), x, finite.want)
		}
	}
	if f != nil {
		return nil, f.err()
	}
	return newPiecewise(slices.Clone(from), slices.Clone(rate)), nil
}

func newPiecewise(from, rate []float64) *Piecewise {
	value := make([]float64, len(from))
	for i := 1; i < len(from); i++ {
		value[i] = value[i-1] + float64(rate[i-1]*(from[i]-from[i-1]))
	}
	return &Piecewise{from, value, rate}
}

// validateEdges reports edges that do not begin with 0 and ascend from there; field
// names an edge, when a year, if any.
func validateEdges(f *faults, field func(i int) string, when string, from []float64) {
	if len(from) == 0 {
		f.add(field(0), "missing", "at least one bracket")
	}
	for i, x := range from {
		switch {
		case i == 0 && x != 0:
			f.add(field(i), x, "0: the first bracket begins there"+when)
		case i > 0 && !(x > from[i-1] && !math.IsInf(x, 1)):
			f.add(field(i), x, fmt.Sprintf("finite and above %v, where the one before it begins%s", from[i-1], when))
		}
	}
}

// At returns f(x).
func (p *Piecewise) At(x float64) float64 {
	if !(x > 0) {
		return 0
	}
	i := len(p.from) - 1
	for x < p.from[i] {
		i--
	}
	return p.value[i] + float64(p.rate[i]*(x-p.from[i]))
}

// Tax returns the tax on taxable income x, for use as a [Schedule].
func (p *Piecewise) Tax(x float64) float64 { return p.At(x) }

// Marginal returns f′ on one side of x.
func (p *Piecewise) Marginal(x float64, side Side) float64 {
	i := len(p.from) - 1
	for i >= 0 && !side.past(x, p.from[i]) {
		i--
	}
	if i < 0 {
		return 0
	}
	return p.rate[i]
}

// Kinks returns where f bends, ascending.
func (p *Piecewise) Kinks() []float64 {
	var kinks []float64
	before := 0.0
	for i, r := range p.rate {
		if r != before {
			kinks = append(kinks, p.from[i])
		}
		before = r
	}
	return kinks
}

// Steepest returns the highest rate, 0 if all are negative.
func (p *Piecewise) steepest() float64 { return max(0, slices.Max(p.rate)) }
