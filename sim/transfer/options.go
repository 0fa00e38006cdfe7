package transfer

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"cistern/sim"
)

// Band is a range of ages, both ends included.
type Band struct{ First, Last int }

// Options says what households receive, at what ages, and what is told apart.
type Options struct {
	Amount float64 // money, not 0; negative: a bill
	Ages   []int   // of receipt, ascending
	Years  int     // years looked at after that of receipt, ≥ 0
	Bands  []Band  // ascending, without overlap; together they hold every age of receipt

	// Limits are the upper limits of classes of wealth, ascending: a household is in
	// class k if k of its band's limits lie below the assets with which it entered the
	// year of receipt (at the end of last year, money). nil: everybody is in class 0.
	Limits [][]float64 // [band][class, without the last]

	Weights []float64 // [age of receipt] > 0, what a receipt counts; nil: 1

	Workers    int                     // goroutines, at least 1; 0 counts as 1
	OnProgress func(done, total int64) // households, as for sim.Options
}

// Validate reports every fault at once, given the ages that a life can have.
func (o Options) Validate(firstAge, lastAge int) error {
	var errs []error
	bad := func(format string, a ...any) { errs = append(errs, fmt.Errorf("transfer: "+format, a...)) }
	if o.Amount == 0 || math.IsNaN(o.Amount) || math.IsInf(o.Amount, 0) {
		bad("amount: is %v, want a finite amount other than 0", o.Amount)
	}
	if len(o.Ages) == 0 {
		bad("no age of receipt")
	}
	for i, age := range o.Ages {
		if age < firstAge || age > lastAge || i > 0 && age <= o.Ages[i-1] {
			bad("age of receipt %d: want ascending ages from %d to %d", age, firstAge, lastAge)
		}
		if o.band(age) < 0 {
			bad("age of receipt %d lies in no band", age)
		}
	}
	if o.Years < 0 {
		bad("years: is %d, want at least 0", o.Years)
	}
	for i, b := range o.Bands {
		if b.Last < b.First || i > 0 && b.First <= o.Bands[i-1].Last {
			bad("band %d to %d: want ascending bands without overlap", b.First, b.Last)
		}
	}
	errs = append(errs, o.validateClasses())
	return errors.Join(errs...)
}

func (o Options) validateClasses() error {
	if o.Limits != nil && len(o.Limits) != len(o.Bands) {
		return fmt.Errorf("transfer: limits of wealth for %d bands, want %d", len(o.Limits), len(o.Bands))
	}
	for i, limits := range o.Limits {
		if len(limits) != len(o.Limits[0]) || len(limits) > 100 || !slices.IsSorted(limits) || slices.ContainsFunc(limits, math.IsNaN) {
			return fmt.Errorf("transfer: limits of wealth %v in band %d, want the same number for each band, at most 100, ascending", limits, i)
		}
	}
	if o.Weights != nil && len(o.Weights) != len(o.Ages) {
		return fmt.Errorf("transfer: %d weights for %d ages of receipt", len(o.Weights), len(o.Ages))
	}
	for _, w := range o.Weights {
		if !(w > 0) || math.IsInf(w, 1) {
			return fmt.Errorf("transfer: weight %v, want a finite weight above 0", w)
		}
	}
	return nil
}

// band returns the index of the band that holds an age, or −1.
func (o Options) band(age int) int {
	return slices.IndexFunc(o.Bands, func(b Band) bool { return b.First <= age && age <= b.Last })
}

// classes is the number of classes of wealth.
func (o Options) classes() int {
	if len(o.Limits) == 0 {
		return 1
	}
	return len(o.Limits[0]) + 1
}

// Parts is the number of parts in which households are summed, by their id modulo
// it: sums without one part at a time give jackknife errors.
const Parts = 64

// Sums are sums over receipts; w is the weight of a receipt.
type Sums struct {
	Weight     [Parts]float64   // Σ w of those who received, or paid
	Unable     [Parts]float64   // Σ w of those who could not pay: in no other sum
	Income     [Parts]float64   // Σ w·net income in the year of receipt, money
	Propensity [Parts]float64   // Σ w·marginal propensity to consume then, without the transfer
	Consumed   [][Parts]float64 // [years since] Σ w·(c′ − c), money
	Kept       [][Parts]float64 // [years since] Σ w·(a′ − a) at the end of the year, money
	Receipts   int64            // those behind Weight
}

// Result is what households did.
type Result struct {
	Cells           []Sums // [band][group][class], flat
	Groups, Classes int
	HouseholdYears  int64 // lived with the transfer
	AboveTop        int64 // of these, those above the top of the rule's grid
}

// Cell returns the sums of a band of ages, group and class of wealth.
func (r *Result) Cell(band, group, class int) *Sums {
	return &r.Cells[(band*r.Groups+group)*r.Classes+class]
}

func newResult(p *sim.Population, o *Options) *Result {
	r := &Result{Groups: len(p.Groups), Classes: o.classes()}
	r.Cells = make([]Sums, len(o.Bands)*r.Groups*r.Classes)
	for i := range r.Cells {
		r.Cells[i].Consumed = make([][Parts]float64, o.Years+1)
		r.Cells[i].Kept = make([][Parts]float64, o.Years+1)
	}
	return r
}

// add adds the sums of a block, and clears them.
func (r *Result) add(b *Result) {
	r.HouseholdYears += b.HouseholdYears
	r.AboveTop += b.AboveTop
	b.HouseholdYears, b.AboveTop = 0, 0
	for i := range b.Cells {
		r.Cells[i].add(&b.Cells[i])
	}
}

func (s *Sums) add(b *Sums) {
	move := func(to, from *[Parts]float64) {
		for g, x := range from {
			to[g] += x
		}
		*from = [Parts]float64{}
	}
	move(&s.Unable, &b.Unable)
	if b.Receipts == 0 {
		return
	}
	s.Receipts += b.Receipts
	b.Receipts = 0
	move(&s.Weight, &b.Weight)
	move(&s.Income, &b.Income)
	move(&s.Propensity, &b.Propensity)
	for i := range s.Consumed {
		move(&s.Consumed[i], &b.Consumed[i])
		move(&s.Kept[i], &b.Kept[i])
	}
}
