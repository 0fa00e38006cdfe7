package income

import (
	"errors"
	"fmt"
	"math"
)

// Certain returns survival for sure up to age last: s_t for t = first … last, the
// last entry 0 as in every survival curve here.
func Certain(first, last int) []float64 {
	s := make([]float64, last-first+1)
	for t := range last - first {
		s[t] = 1
	}
	return s
}

// Gompertz is mortality with hazard (1/Dispersion)·exp((x−ModalAge)/Dispersion)
// at exact age x (Gompertz 1825; in the modal-age form common practice).
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
		x := (float64(first+t) - g.ModalAge) / g.Dispersion
		s[t] = math.Exp(-math.Exp(x) * math.Expm1(1/g.Dispersion))
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
// table must cover them all but the last.
func (l LifeTable) Survival(first, last int) ([]float64, error) {
	var f faults
	checkAges(&f, first, last)
	if first < l.FirstAge || last > l.FirstAge+len(l.Q) {
		f.add("Q", fmt.Sprintf("ages %d to %d", l.FirstAge, l.FirstAge+len(l.Q)-1), fmt.Sprintf("every age from %d to %d", first, last-1))
	}
	for i, q := range l.Q {
		if !(q >= 0 && q <= 1) {
			f.add(fmt.Sprintf("Q at age %d", l.FirstAge+i), q, "from 0 to 1")
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

// Expectancy returns the remaining years of life expected at an age in the table,
// deaths spread evenly over the year: Σ_k l_{x+k}·(1 − q_{x+k}/2) / l_x, the last
// age of the table closed by its hazard held constant (common practice).
func (l LifeTable) Expectancy(age int) float64 {
	i := age - l.FirstAge
	if i < 0 || i >= len(l.Q) {
		return math.NaN()
	}
	alive, years := 1.0, 0.0
	for _, q := range l.Q[i:] {
		years += alive * (1 - q/2)
		alive *= 1 - q
	}
	if q := l.Q[len(l.Q)-1]; alive > 0 && q < 1 {
		years += alive / -math.Log1p(-q)
	}
	return years
}
