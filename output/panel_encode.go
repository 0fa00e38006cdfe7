package output

import (
	"errors"
	"fmt"
	"math"

	"github.com/parquet-go/parquet-go"
)

// A ValueError is a state that has no place in a panel: NaN or infinite, or too
// large for single precision.
type ValueError struct {
	Column    string
	Household int64
	Age       int32
	Value     float64
}

func (e *ValueError) Error() string {
	return fmt.Sprintf("output: panel: %s of household %d at age %d is %v, want a finite number", e.Column, e.Household, e.Age, e.Value)
}

// chunkRows is how many values are boxed at a time: 512 of them (12 KB) stay in
// the first-level cache.
const chunkRows = 512

// encoder is one worker's scratch space.
type encoder struct {
	format *panelFormat
	groups []parquet.Value // the groups' names, boxed
	buf    []parquet.Value // chunkRows values
	ints   []int64         // a column in order, of each type
	small  []int32
	floats []float64
	single []float32
	bools  []bool
}

func newEncoder(f *panelFormat) *encoder {
	e := &encoder{format: f, buf: make([]parquet.Value, chunkRows)}
	for _, name := range f.o.Groups {
		e.groups = append(e.groups, parquet.ByteArrayValue([]byte(name)))
	}
	return e
}

// grow makes room for n rows.
func (e *encoder) grow(n int) {
	if cap(e.ints) >= n {
		return
	}
	n += n / 16 // units differ a little in their number of rows
	e.ints, e.small, e.floats, e.bools = make([]int64, n), make([]int32, n), make([]float64, n), make([]bool, n)
	if e.format.o.Precision == Single {
		e.single = make([]float32, n)
	}
}

// encode writes rows into the row group g, column by column in schema order,
// and compresses what is left in its buffers. Columns are independent of one
// another, so their order here is free.
func (e *encoder) encode(g *parquet.ConcurrentRowGroupWriter, r *Rows) error {
	e.grow(r.N)
	if err := e.order(r); err != nil {
		return err
	}
	w := g.ColumnWriters()
	err := errors.Join(
		e.putInts(w[0], r),
		e.putAges(w[2], r),
		e.putGroups(w[1], r), // reuses the space of the ages
		e.putFloats(w[3], r, "persistent", r.Persistent),
		e.putFloats(w[4], r, "transitory", r.Transitory),
		e.putBools(w[5], r, r.Employed),
		e.putFloats(w[6], r, "earnings", r.Earnings),
		e.putFloats(w[7], r, "pension", r.Pension),
		e.putFloats(w[8], r, "taxes", r.Taxes),
		e.putFloats(w[9], r, "income", r.Income),
		e.putFloats(w[10], r, "cash_on_hand", r.CashOnHand),
		e.putFloats(w[11], r, "consumption", r.Consumption),
		e.putFloats(w[12], r, "assets", r.Assets),
		e.putBools(w[13], r, r.Died),
	)
	if err != nil {
		return err
	}
	return g.Flush()
}

// chunks boxes n values by box, chunkRows at a time, and writes them. The loop
// over the values belongs inside box, where the constructors inline. The values
// carry no levels: every column is required.
func (e *encoder) chunks(c *parquet.ColumnWriter, n int, box func(lo int, part []parquet.Value)) error {
	for lo := 0; lo < n; lo += len(e.buf) {
		part := e.buf[:min(len(e.buf), n-lo)]
		box(lo, part)
		if _, err := c.WriteRowValues(part); err != nil {
			return fmt.Errorf("output: panel: %w", err)
		}
	}
	return nil
}

// order scatters households and ages and checks what comes out: every
// household of the unit in turn, one row for each of its consecutive years. A
// place taken twice leaves another empty, so this also proves that Position is
// a permutation.
func (e *encoder) order(r *Rows) error {
	ids, ages := e.ints[:r.N], e.small[:r.N]
	for i := range ids {
		ids[i] = -1
	}
	for k, pos := range r.Position[:r.N] {
		if uint(pos) >= uint(r.N) {
			return fmt.Errorf("output: panel: row %d of the unit from household %d has place %d of %d", k, r.First, pos, r.N)
		}
		ids[pos] = r.Household[k]
	}
	for _, s := range r.Spans {
		for _, pos := range r.Position[s.From:s.To] {
			ages[pos] = s.Age
		}
	}
	id, age := r.First-1, int32(0)
	for i, next := range ids {
		if next != id+1 && (next != id || ages[i] != age+1 || i == 0) {
			return fmt.Errorf("output: panel: household %d at age %d follows household %d at age %d; want consecutive years and households", next, ages[i], id, age)
		}
		id, age = next, ages[i]
	}
	if end := r.First + int64(r.Households); id+1 != end {
		return fmt.Errorf("output: panel: the unit from household %d ends with %d, want %d", r.First, id, end-1)
	}
	return nil
}

func (e *encoder) putInts(c *parquet.ColumnWriter, r *Rows) error {
	return e.chunks(c, r.N, func(lo int, part []parquet.Value) {
		for i, v := range e.ints[lo : lo+len(part)] {
			part[i] = parquet.Int64Value(v)
		}
	})
}

func (e *encoder) putGroups(c *parquet.ColumnWriter, r *Rows) error {
	for _, s := range r.Spans {
		for _, pos := range r.Position[s.From:s.To] {
			e.small[pos] = int32(s.Group)
		}
	}
	return e.chunks(c, r.N, func(lo int, part []parquet.Value) {
		for i, g := range e.small[lo : lo+len(part)] {
			part[i] = e.groups[g]
		}
	})
}

func (e *encoder) putAges(c *parquet.ColumnWriter, r *Rows) error {
	return e.chunks(c, r.N, func(lo int, part []parquet.Value) {
		for i, v := range e.small[lo : lo+len(part)] {
			part[i] = parquet.Int32Value(v)
		}
	})
}

func (e *encoder) putBools(c *parquet.ColumnWriter, r *Rows, column []bool) error {
	column = column[:r.N]
	for k, pos := range r.Position[:r.N] {
		e.bools[pos] = column[k]
	}
	return e.chunks(c, r.N, func(lo int, part []parquet.Value) {
		for i, v := range e.bools[lo : lo+len(part)] {
			part[i] = parquet.BooleanValue(v)
		}
	})
}

func (e *encoder) putFloats(c *parquet.ColumnWriter, r *Rows, name string, column []float64) error {
	column = column[:r.N]
	if e.format.o.Precision == Single {
		return e.putSingles(c, r, name, column)
	}
	var odd float64 // v − v is 0 for a finite v and NaN for any other
	for k, pos := range r.Position[:r.N] {
		v := column[k]
		odd += v - v
		e.floats[pos] = v
	}
	if odd != 0 {
		return e.refuse(r, name, column)
	}
	return e.chunks(c, r.N, func(lo int, part []parquet.Value) {
		for i, v := range e.floats[lo : lo+len(part)] {
			part[i] = parquet.DoubleValue(v)
		}
	})
}

func (e *encoder) putSingles(c *parquet.ColumnWriter, r *Rows, name string, column []float64) error {
	var odd float32
	for k, pos := range r.Position[:r.N] {
		v := float32(column[k])
		odd += v - v
		e.single[pos] = v
	}
	if odd != 0 {
		return e.refuse(r, name, column)
	}
	return e.chunks(c, r.N, func(lo int, part []parquet.Value) {
		for i, v := range e.single[lo : lo+len(part)] {
			part[i] = parquet.FloatValue(v)
		}
	})
}

// refuse finds the first household, in household order, whose value is at fault.
func (e *encoder) refuse(r *Rows, name string, column []float64) error {
	bad, place := -1, int32(math.MaxInt32)
	for k, v := range column {
		if e.format.o.Precision == Single {
			v = float64(float32(v))
		}
		if (math.IsNaN(v) || math.IsInf(v, 0)) && r.Position[k] < place {
			bad, place = k, r.Position[k]
		}
	}
	err := &ValueError{Column: name, Household: r.Household[bad], Value: column[bad]}
	for _, s := range r.Spans {
		if s.From <= bad && bad < s.To {
			err.Age = s.Age
		}
	}
	return err
}
