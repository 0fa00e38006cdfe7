package income

import (
	"errors"
	"fmt"
	"math"
)

// Polynomial returns earnings by age from a polynomial in (age − from): its value
// in form level, exp of its value in form log. Coefficients are in ascending
// order of the power; years counts ages from first.
func Polynomial(form Form, coefficients []float64, from float64, first, years int) []float64 {
	p := make([]float64, years)
	for t := range p {
		x := float64(first+t) - from
		y := 0.0
		for k := len(coefficients) - 1; k >= 0; k-- {
			y = float64(y*x) + coefficients[k]
		}
		if form == Log {
			y = math.Exp(y)
		}
		p[t] = y
	}
	return p
}

// Table returns earnings by age from a table in any order that must hold every age
// from first on; nothing is filled in between. Ages that are missing or there
// twice are reported at once, each as a *FieldError. Earnings of other ages are
// not used.
func Table(ages []int, earnings []float64, first, years int) ([]float64, error) {
	if len(ages) != len(earnings) {
		panic("income: ages and earnings differ in length")
	}
	var f faults
	at := make(map[int]float64, len(ages))
	for i, a := range ages {
		if _, twice := at[a]; twice {
			f.add(fmt.Sprintf("ages[%d]", i), a, "each age once")
		}
		at[a] = earnings[i]
	}
	p := make([]float64, years)
	for t := range p {
		y, ok := at[first+t]
		if !ok {
			f.add("ages", fmt.Sprintf("without %d", first+t), fmt.Sprintf("every age from %d to %d", first, first+years-1))
		}
		p[t] = y
	}
	if err := errors.Join(f...); err != nil {
		return nil, err
	}
	return p, nil
}

// Constant returns the same earnings for a number of years.
func Constant(y float64, years int) []float64 {
	p := make([]float64, years)
	for t := range p {
		p[t] = y
	}
	return p
}
