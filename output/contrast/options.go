package contrast

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"cistern/output"
)

// confidence of every interval, and the normal quantile that belongs to it.
const (
	confidence = 0.95
	normal     = 1.959963984540054
)

// Options says what a [Contrast] is about.
type Options struct {
	FirstYear, LastYear int           // calendar years, the event's is 0
	Groups              []string      // names of the groups, in the order of Span.Group; "all" is taken
	Bands               []output.Band // of ages in the event's year; they do not overlap

	Percentiles  []float64 // in per cent, each above 0 and below 100
	RunwayMonths []float64 // the share of households with less than each is counted
	DryMonths    float64   // months of consumption below which a household is dry, above 0
	Worst        []float64 // per cent of households whose mean shortfall is taken, above 0 and at most 100
	Within       float64   // fraction within which a figure is back, above 0

	Households int64 // whose ids run from 0
	RowsAYear  int64 // about how many rows a year has, at least as many as it will be
	Weighted   bool  // spans carry weights that differ
	Workers    int   // goroutines that call Add, at least 1
	Budget     int64 // bytes for values held at a time, where weights do not need more; 0: DefaultBudget
}

// DefaultBudget is 1 GiB.
const DefaultBudget = 1 << 30

// bytesPerRow is more than what a row takes that is held and sorted, with a weight
// or without.
func (o *Options) bytesPerRow() int64 {
	if o.Weighted {
		return 170
	}
	return 120
}

// Held returns how many bytes the values held at a time will take, at most.
func (o Options) Held() float64 {
	all := float64(o.RowsAYear) * float64(o.LastYear-o.FirstYear+1) * float64(o.bytesPerRow())
	return math.Min(all, float64(o.budget()))
}

// budget is Budget, or its default; rows with weights take at least what a year of
// them needs.
func (o *Options) budget() int64 {
	budget := o.Budget
	if budget == 0 {
		budget = DefaultBudget
	}
	if o.Weighted {
		budget = max(budget, o.RowsAYear*o.bytesPerRow())
	}
	return budget
}

// batch is how many calendar years are described at a time: as many as fit the
// budget.
func (o *Options) batch() int {
	years := int64(o.LastYear - o.FirstYear + 1)
	return int(min(years, max(1, o.budget()/max(1, o.RowsAYear*o.bytesPerRow()))))
}

// Validate reports every fault at once.
func (o Options) Validate() error {
	var errs []error
	bad := func(format string, a ...any) { errs = append(errs, fmt.Errorf("contrast: "+format, a...)) }
	if o.FirstYear > 0 || o.LastYear < 0 || o.LastYear-o.FirstYear > 250 {
		bad("years %d to %d, want at most 250 with the event's year 0 among them", o.FirstYear, o.LastYear)
	}
	if len(o.Groups) == 0 || slices.Contains(o.Groups, output.Everyone) {
		bad("groups %q, want at least one and none called %q", o.Groups, output.Everyone)
	}
	for i, b := range o.Bands {
		if b.Last < b.First || slices.ContainsFunc(o.Bands[:i], func(a output.Band) bool { return a.First <= b.Last && b.First <= a.Last }) {
			bad("ages %v are empty or stand twice", b)
		}
	}
	for _, l := range []struct {
		name string
		x    []float64
		high float64
		open bool
	}{{"percentile", o.Percentiles, 100, true}, {"runway", o.RunwayMonths, math.MaxFloat64, false}, {"worst share", o.Worst, 100, false},
		{"dry runway", []float64{o.DryMonths}, math.MaxFloat64, false}, {"nearness", []float64{o.Within}, math.MaxFloat64, false}} {
		for i, x := range l.x {
			if !(x > 0 && (x < l.high || x == l.high && !l.open)) || slices.Contains(l.x[:i], x) {
				bad("%s %v is out of range or stands twice", l.name, x)
			}
		}
	}
	if o.Households < 1 || o.RowsAYear < 0 || o.Workers < 1 || o.Budget < 0 {
		bad("%d households, %d rows a year, %d workers, %d bytes", o.Households, o.RowsAYear, o.Workers, o.Budget)
	}
	return errors.Join(errs...)
}
