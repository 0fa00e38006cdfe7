package pension

import (
	"fmt"
	"math"

	"cistern/income"
)

// Mortality is death probabilities by age and calendar year, from which every birth
// cohort has a life table of its own: at age x a cohort born in b dies by the table
// of year b+x. Between two tables ln q is linear in the year (q where one of them is
// 0); before the first table its q holds; after the last one q falls by Improvement
// a year,
//
//	q(x, y) = q(x, last)·(1 − Improvement)^(y − last).
type Mortality struct {
	Years       []int // ascending
	Tables      []income.LifeTable
	Improvement float64 // a year after the last table, at least 0 and below 1
}

// Survival returns s_t of a cohort for ages first … last; the last entry is 0. Every
// fault is reported at once, each as a *FieldError.
func (m Mortality) Survival(birth, first, last int) ([]float64, error) {
	var f faults
	m.validate(&f, first, last)
	if f != nil {
		return nil, f.err()
	}
	cohort := income.LifeTable{FirstAge: first, Q: make([]float64, last-first)}
	for t := range cohort.Q {
		cohort.Q[t] = m.at(first+t, birth+first+t)
	}
	return cohort.Survival(first, last)
}

func (m Mortality) validate(f *faults, first, last int) {
	if last < first {
		f.add("ages", fmt.Sprintf("%d to %d", first, last), "a last age not before the first")
	}
	if len(m.Years) == 0 || len(m.Years) != len(m.Tables) {
		f.add("Years", fmt.Sprintf("%d years for %d tables", len(m.Years), len(m.Tables)), "one for each table, at least one")
		return
	}
	if !belowOne.ok(m.Improvement) {
		f.add("Improvement", m.Improvement, belowOne.want)
	}
	for i, l := range m.Tables {
		if i > 0 && m.Years[i] <= m.Years[i-1] {
			f.add(fmt.Sprintf("Years[%d]", i), m.Years[i], fmt.Sprintf("above %d, the year before it", m.Years[i-1]))
		}
		if end := l.FirstAge + len(l.Q); first < last && (first < l.FirstAge || last > end) {
			f.add(fmt.Sprintf("Tables[%d]", i), fmt.Sprintf("for ages %d to %d", l.FirstAge, end-1), fmt.Sprintf("every age from %d to %d", first, last-1))
		}
		for k, q := range l.Q {
			if !fraction.ok(q) {
				f.add(fmt.Sprintf("Tables[%d].Q[%d] (age %d)", i, k, l.FirstAge+k), q, fraction.want)
			}
		}
	}
}

// at returns q at an age in a calendar year.
func (m Mortality) at(age, year int) float64 {
	q := func(i int) float64 { return m.Tables[i].Q[age-m.Tables[i].FirstAge] }
	last := len(m.Years) - 1
	if year >= m.Years[last] {
		return q(last) * math.Pow(1-m.Improvement, float64(year-m.Years[last]))
	}
	if year <= m.Years[0] {
		return q(0)
	}
	i := 1
	for year > m.Years[i] {
		i++
	}
	part := float64(year-m.Years[i-1]) / float64(m.Years[i]-m.Years[i-1])
	if q(i-1) == 0 || q(i) == 0 {
		return (1-part)*q(i-1) + part*q(i)
	}
	return math.Pow(q(i-1), 1-part) * math.Pow(q(i), part)
}
