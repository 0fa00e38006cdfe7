package pension

import (
	"fmt"
	"slices"
)

// A resolver looks parameters up for one cohort and collects the years for which
// they have no value.
type resolver struct {
	wages   Wages
	cohort  Cohort
	wage    []float64 // [T] W
	f       *faults
	missing []string
}

// year returns the calendar year of year t.
func (r *resolver) year(t int) int { return r.cohort.Birth + r.cohort.FirstAge + t }

// when names year t in an error.
func (r *resolver) when(t int) string { return fmt.Sprintf(" (in %d)", r.year(t)) }

// in returns a parameter in a calendar year. Where it has no value there, that is a
// fault, reported once a field.
func (r *resolver) in(field string, p Parameter, year int) float64 {
	x, ok := p.At(r.cohort.Birth, year)
	if !ok && !slices.Contains(r.missing, field) {
		r.missing = append(r.missing, field)
		missing := fmt.Sprintf("year %d", year)
		if p.Table.By == BirthYear {
			missing = fmt.Sprintf("birth year %d", r.cohort.Birth)
		}
		r.f.add(field+".Table", "without "+missing, fmt.Sprintf("a value for it: people born in %d live under these rules from %d to %d, and amounts are stated for %d",
			r.cohort.Birth, r.year(0), r.year(len(r.cohort.Survival)-1), r.wages.BaseYear))
	}
	return x
}

// at returns a parameter in year t.
func (r *resolver) at(field string, p Parameter, t int) float64 { return r.in(field, p, r.year(t)) }

// growth returns g of a calendar year.
func (r *resolver) growth(year int) float64 { return r.in("Wages.Growth", r.wages.Growth, year) }

// factor returns by how much an index changes an amount from the year before to a
// calendar year.
func (r *resolver) factor(field string, x Index, year int) float64 {
	wages, rate := r.in(field+".Wages", x.Wages, year), r.in(field+".Rate", x.Rate, year)
	if wages != 0 {
		wages *= r.growth(year)
	}
	return (1 + wages) * (1 + rate)
}

// levels returns how an index has changed an amount since the base year, [T].
func (r *resolver) levels(field string, x Index) []float64 {
	levels := make([]float64, len(r.cohort.Survival))
	first, last := r.year(0), r.year(len(levels)-1)
	keep := func(year int, level float64) {
		if year >= first && year <= last {
			levels[year-first] = level
		}
	}
	base := r.wages.BaseYear
	keep(base, 1)
	level := 1.0
	for y := base + 1; y <= last; y++ {
		level *= r.factor(field, x, y)
		keep(y, level)
	}
	level = 1
	for y := base - 1; y >= first; y-- {
		level /= r.factor(field, x, y+1)
		keep(y, level)
	}
	return levels
}

// chain returns how an index changes an amount from the first year on, [T].
func (r *resolver) chain(field string, x Index) []float64 {
	levels := make([]float64, len(r.cohort.Survival))
	levels[0] = 1
	for t := 1; t < len(levels); t++ {
		levels[t] = levels[t-1] * r.factor(field, x, r.year(t))
	}
	return levels
}

// amounts returns an amount by year, [T], uprated from the base year.
func (r *resolver) amounts(field string, p Parameter, uprating []float64) []float64 {
	a := make([]float64, len(r.cohort.Survival))
	for t := range a {
		a[t] = r.at(field, p, t) * uprating[t]
	}
	return a
}
