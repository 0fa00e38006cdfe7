package pension

import (
	"fmt"
	"math"
)

// A Parameter is a number of the rules: a constant, or a table where it is phased
// in. The zero Parameter is the constant 0.
type Parameter struct {
	Constant float64 // where Table is nil
	Table    *Table
}

// Constant returns the parameter that is x in every year.
func Constant(x float64) Parameter { return Parameter{Constant: x} }

// At returns the parameter for a birth cohort in a calendar year; false if its
// table has no value there.
func (p Parameter) At(birth, year int) (float64, bool) {
	if p.Table == nil {
		return p.Constant, true
	}
	if p.Table.By == BirthYear {
		year = birth
	}
	return p.Table.At(year)
}

// By says what the years of a table are.
type By int

// The years of a table.
const (
	CalendarYear By = iota // those in which a rule applies
	BirthYear              // those in which people were born
)

// String returns the name used in scenario files.
func (b By) String() string {
	if b == BirthYear {
		return "birth_year"
	}
	return "year"
}

// The ends of tables without end.
const (
	Always  = math.MinInt // From of a first row: since ever
	Forever = math.MaxInt // To of a last row: ever after
)

// A Row is the value of all years From … To, both included.
type Row struct {
	From, To int
	Value    float64
}

// A Table is a value by year. In steps every year between the first and the last
// must be in exactly one row. Linear fills the years between rows:
//
//	v = v_i + (v_{i+1} − v_i)·(year − To_i)/(From_{i+1} − To_i).
type Table struct {
	By     By
	Linear bool
	Rows   []Row // ascending
}

// At returns the value of a year; false before the first row and after the last,
// and in a gap of steps.
func (t *Table) At(year int) (float64, bool) {
	for i, r := range t.Rows {
		switch {
		case year > r.To:
			continue
		case year >= r.From:
			return r.Value, true
		case i == 0 || !t.Linear:
			return 0, false
		}
		before := t.Rows[i-1]
		part := float64(year-before.To) / float64(r.From-before.To)
		return before.Value + float64(part*(r.Value-before.Value)), true
	}
	return 0, false
}

// validate reports rows out of order, overlaps, gaps and values outside in.
func (t *Table) validate(f *faults, field string, in limits) {
	if t.By != CalendarYear && t.By != BirthYear {
		f.add(field+".By", int(t.By), "year or birth_year")
	}
	if len(t.Rows) == 0 {
		f.add(field+".Rows", "empty", "at least one row")
	}
	for i, r := range t.Rows {
		at := fmt.Sprintf("%s.Rows[%d]", field, i)
		if !in.ok(r.Value) {
			f.add(at+".Value", r.Value, in.want)
		}
		if r.From > r.To {
			f.add(at, r.years(), "years in ascending order")
		}
		if i > 0 {
			t.validateOrder(f, at, t.Rows[i-1], r)
		}
	}
}

func (t *Table) validateOrder(f *faults, at string, before, r Row) {
	switch {
	case r.From < before.From:
		f.add(at, r.years(), fmt.Sprintf("rows in ascending order: the one before it is for %s", before.years()))
	case r.From <= before.To:
		f.add(at, r.years(), fmt.Sprintf("rows that do not overlap: the one before it is for %s", before.years()))
	case !t.Linear && r.From > before.To+1:
		f.add(at, r.years(), fmt.Sprintf("rows without a gap: the one before it ends with %d, so this one begins with %d", before.To, before.To+1))
	}
}

// years names the years of a row.
func (r Row) years() string {
	switch {
	case r.From == Always && r.To == Forever:
		return "all years"
	case r.From == Always:
		return fmt.Sprintf("years to %d", r.To)
	case r.To == Forever:
		return fmt.Sprintf("years from %d", r.From)
	case r.From == r.To:
		return fmt.Sprintf("year %d", r.From)
	}
	return fmt.Sprintf("years %d to %d", r.From, r.To)
}

// validate reports faults of the parameter and values outside in.
func (p Parameter) validate(f *faults, field string, in limits) {
	if p.Table != nil {
		p.Table.validate(f, field+".Table", in)
		return
	}
	if !in.ok(p.Constant) {
		f.add(field, p.Constant, in.want)
	}
}
