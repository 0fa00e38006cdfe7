package income

import (
	"errors"
	"fmt"
	"math"
)

// Certain returns survival for sure up to age last: s_t for t = first … last, the
// last entry 0 as in every survival curve here. It panics if last is before first.
func Certain(first, last int) []float64 {
	if last < first {
		panic("income: the last age is before the first")
	}
	s := make([]float64, last-first+1)
	for t := range last - first {
		s[t] = 1
	}
	return s
}

// Gompertz is mortality with hazard (1/Dispersion)·exp((x−ModalAge)/Dispersion)
// at exact age x (Gompertz 1825, Philosophical Transactions 115; the modal-age
// form is common practice).
type Gompertz struct {
	ModalAge   float64 // age at which most deaths happen, years
	Dispersion float64 // years, > 0
}

// Survival returns s_t for ages first … last: exp of minus the integral of the
// hazard over the year, exactly; the last entry is 0.
func (g Gompertz) Survival(first, last int) ([]float64, error) {
	var f faults
	if math.IsNaN(g.ModalAge) || math.IsInf(g.ModalAge, 0) {
		f.add("ModalAge", g.ModalAge, "a finite number")
	}
	if !(g.Dispersion > 0) || math.IsInf(g.Dispersion, 1) {
		f.add("Dispersion", g.Dispersion, "positive and finite")
	}
	checkAges(&f, first, last)
	if err := errors.Join(f...); err != nil {
		return nil, err
	}
	s := Certain(first, last)
	for t := range last - first {
		// From the hazard at the year's end: the factors cannot be 0 and ∞.
		x := (float64(first+t+1) - g.ModalAge) / g.Dispersion
		s[t] = math.Exp(math.Exp(x) * math.Expm1(-1/g.Dispersion))
	}
	return s, nil
}

func checkAges(f *faults, first, last int) {
	if last < first {
		f.add("ages", fmt.Sprintf("%d to %d", first, last), "a last age not before the first")
	}
}

// LifeTable holds annual death probabilities by age.
type LifeTable struct {
	FirstAge int
	Q        []float64 // chance to die within the year at FirstAge, FirstAge+1, …
}

// Survival returns s_t = 1 − q_t for ages first … last; the last entry is 0. The
// table must cover them all but the last. Every fault is reported at once, each as
// a *FieldError.
func (l LifeTable) Survival(first, last int) ([]float64, error) {
	var f faults
	checkAges(&f, first, last)
	end := l.FirstAge + len(l.Q) // the first age beyond the table
	if first < last && (first < l.FirstAge || last > end) {
		f.add("Q", fmt.Sprintf("for ages %d to %d", l.FirstAge, end-1), fmt.Sprintf("every age from %d to %d", first, last-1))
	}
	for i, q := range l.Q {
		if !(q >= 0 && q <= 1) {
			f.add(fmt.Sprintf("Q[%d] (age %d)", i, l.FirstAge+i), q, "from 0 to 1")
		}
	}
	if err := errors.Join(f...); err != nil {
		return nil, err
	}
	s := Certain(first, last)
	for t := range last - first {
		s[t] = 1 - l.Q[first-l.FirstAge+t]
	}
	return s, nil
}

// infantYears is the part of their first year that infants who die in it live: at
// low mortality most die in the first weeks (Coale and Demeny 1983, Regional Model
// Life Tables, put it near 0.1 there; 0.1 is common practice).
const infantYears = 0.1

// Expectancy returns the remaining years of life expected at an age in the table,
//
//	e_x = Σ_k (l_{x+k}/l_x)·(1 − q_{x+k}·(1 − a)),
//
// a = ½ because deaths spread over the year, 0.1 at age 0. Beyond the table's last
// age its hazard holds on (common practice), so e is +Inf if nobody dies there. An
// age outside the table has NaN.
func (l LifeTable) Expectancy(age int) float64 {
	i := age - l.FirstAge
	if i < 0 || i >= len(l.Q) {
		return math.NaN()
	}
	alive, years := 1.0, 0.0
	for k, q := range l.Q[i:] {
		lost := q / 2
		if age+k == 0 {
			lost = q * (1 - infantYears)
		}
		years += alive * (1 - lost)
		alive *= 1 - q
	}
	if alive > 0 {
		years += alive / -math.Log1p(-l.Q[len(l.Q)-1])
	}
	return years
}
