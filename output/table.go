package output

import (
	"errors"
	"fmt"
	"maps"
	"math"
	"slices"
)

// Kind is the type of a column's values.
type Kind int

// The kinds of column.
const (
	String Kind = iota
	Int
	Float
)

// String returns "string", "int" or "float".
func (k Kind) String() string {
	switch k {
	case String:
		return "string"
	case Int:
		return "int"
	case Float:
		return "float"
	}
	return fmt.Sprintf("Kind(%d)", int(k))
}

// Column is one named column of a [Table]. Exactly one of Strings, Ints and
// Floats is in use, the one of its Kind.
type Column struct {
	Name    string // words of the trade in snake_case, unit last
	Unit    string // "crown", "year", "fraction"; "" for labels and pure numbers
	Meaning string // one sentence for a reader who has only the file
	Kind    Kind
	Digits  int // significant digits in aligned text; 0 = 6. Other renderers never round.

	Strings []string
	Ints    []int64
	Floats  []float64
	Missing []bool // nil where no value is missing; else one entry a value
}

// AppendString adds a value to a column of strings.
func (c *Column) AppendString(v string) {
	c.want(String)
	c.Strings = append(c.Strings, v)
	c.present()
}

// AppendInt adds a value to a column of integers.
func (c *Column) AppendInt(v int64) { c.want(Int); c.Ints = append(c.Ints, v); c.present() }

// AppendFloat adds a value to a column of floats. NaN is a value: it says that
// the number could not be computed. See AppendMissing.
func (c *Column) AppendFloat(v float64) { c.want(Float); c.Floats = append(c.Floats, v); c.present() }

// AppendMissing adds the absence of a value: nothing that could be computed
// belongs here.
func (c *Column) AppendMissing() {
	if c.Missing == nil {
		c.Missing = make([]bool, c.Len(), c.Len()+8)
	}
	switch c.Kind {
	case String:
		c.Strings = append(c.Strings, "")
	case Int:
		c.Ints = append(c.Ints, 0)
	case Float:
		c.Floats = append(c.Floats, 0)
	}
	c.Missing = append(c.Missing, true)
}

func (c *Column) want(k Kind) {
	if c.Kind != k {
		panic(fmt.Sprintf("output: column %s holds %ss, not %ss", c.Name, c.Kind, k))
	}
}

func (c *Column) present() {
	if c.Missing != nil {
		c.Missing = append(c.Missing, false)
	}
}

// Len returns the number of values, missing ones included.
func (c *Column) Len() int {
	switch c.Kind {
	case String:
		return len(c.Strings)
	case Int:
		return len(c.Ints)
	default:
		return len(c.Floats)
	}
}

// IsMissing reports whether value i is missing.
func (c *Column) IsMissing(i int) bool { return c.Missing != nil && c.Missing[i] }

// hasMissing reports whether any value is.
func (c *Column) hasMissing() bool { return slices.Contains(c.Missing, true) }

// hasNaN reports whether any value present is NaN.
func (c *Column) hasNaN() bool {
	return c.Kind == Float && slices.ContainsFunc(c.Floats, math.IsNaN)
}

// Table is a tidy table: one observation a row, one variable a column, all
// columns equally long. It is a value to be rendered, compared or read back;
// nothing in it depends on how it will be shown.
type Table struct {
	Name       string // "summary", "accuracy", …
	Columns    []*Column
	Provenance map[string]string // where it comes from; goes into a Parquet file's footer
	Notes      []string          // warnings and explanations that must travel with the numbers
}

// NewTable returns an empty table without columns.
func NewTable(name string) *Table { return &Table{Name: name} }

// AddString adds an empty column of strings and returns it.
func (t *Table) AddString(name, unit, meaning string) *Column {
	return t.add(name, unit, meaning, String)
}

// AddInt adds an empty column of integers and returns it.
func (t *Table) AddInt(name, unit, meaning string) *Column {
	return t.add(name, unit, meaning, Int)
}

// AddFloat adds an empty column of floats and returns it.
func (t *Table) AddFloat(name, unit, meaning string) *Column {
	return t.add(name, unit, meaning, Float)
}

func (t *Table) add(name, unit, meaning string, k Kind) *Column {
	if t.Column(name) != nil {
		panic("output: table " + t.Name + " has two columns " + name)
	}
	c := &Column{Name: name, Unit: unit, Meaning: meaning, Kind: k}
	t.Columns = append(t.Columns, c)
	return c
}

// Column returns the column called name, nil if there is none.
func (t *Table) Column(name string) *Column {
	for _, c := range t.Columns {
		if c.Name == name {
			return c
		}
	}
	return nil
}

// Len returns the number of rows.
func (t *Table) Len() int {
	if len(t.Columns) == 0 {
		return 0
	}
	return t.Columns[0].Len()
}

// Validate reports every fault of the table at once: no columns, a nameless or
// repeated column, columns of different lengths. Every renderer calls it.
func (t *Table) Validate() error {
	var errs []error
	if len(t.Columns) == 0 {
		errs = append(errs, fmt.Errorf("output: table %s has no columns", t.Name))
	}
	seen := map[string]bool{}
	for i, c := range t.Columns {
		if c.Name == "" || seen[c.Name] {
			errs = append(errs, fmt.Errorf("output: table %s: column %d: name %q is empty or taken", t.Name, i+1, c.Name))
		}
		seen[c.Name] = true
		if c.Len() != t.Len() {
			errs = append(errs, fmt.Errorf("output: table %s: column %s has %d rows, %s has %d", t.Name, c.Name, c.Len(), t.Columns[0].Name, t.Len()))
		}
		if c.Missing != nil && len(c.Missing) != c.Len() {
			errs = append(errs, fmt.Errorf("output: table %s: column %s has %d marks of missing values for %d rows", t.Name, c.Name, len(c.Missing), c.Len()))
		}
	}
	return errors.Join(errs...)
}

// metadata returns the footer of a Parquet file that holds columns: the unit
// and the meaning of each, and the entries of all the maps. A key that appears
// twice is an error.
func metadata(columns []*Column, entries ...map[string]string) (map[string]string, error) {
	m := map[string]string{}
	for _, c := range columns {
		m["column."+c.Name+".unit"] = c.Unit
		m["column."+c.Name+".meaning"] = c.Meaning
	}
	for _, e := range entries {
		for _, k := range slices.Sorted(maps.Keys(e)) {
			if _, taken := m[k]; taken || k == "" {
				return nil, fmt.Errorf("output: provenance key %q is empty or taken", k)
			}
			m[k] = e[k]
		}
	}
	return m, nil
}
