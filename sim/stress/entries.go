package stress

import "math"

// Window is which calendar years are looked at: Before years before the event's,
// that year itself, and After years after it.
type Window struct{ Before, After int }

// Entries says in which calendar year households enter life that lasts up to a
// number of years: spread evenly over all years of entry from which anybody can be
// alive in the window.
type Entries struct {
	Earliest int // calendar year
	Cohorts  int // number of years of entry
}

// NewEntries returns the entries of households that live up to a number of years.
func NewEntries(w Window, years int) Entries {
	return Entries{Earliest: -w.Before - years + 1, Cohorts: w.Before + w.After + years}
}

// Of returns the calendar year in which a household is in its first year of life:
// the fractional part of id·√2 among the years of entry. Multiples of an irrational
// number are spread so evenly that any range of ids has every year of entry in
// equal shares, to within a few households, and since √2 is not a fraction of the
// number that spreads groups, every year of entry has every group in its share.
func (e Entries) Of(id int64) int {
	x := float64(id) * (math.Sqrt2 - 1)
	x -= math.Floor(x)
	return e.Earliest + min(int(x*float64(e.Cohorts)), e.Cohorts-1)
}

// Weight returns how many households one that entered in a calendar year stands
// for, relative to one of year 0, in a population that grows by a share growth a
// year: (1+growth)^entry. Among those alive in a year it is proportional to
// (1+growth)^−age.
func Weight(growth float64, entry int) float64 {
	return math.Pow(1+growth, float64(entry))
}
