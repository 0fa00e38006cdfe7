package output

import (
	"math"

	"github.com/parquet-go/parquet-go"
	"github.com/parquet-go/parquet-go/format"
)

// describeColumn says how a column of a file is read, or why it cannot be.
func describeColumn(c *parquet.Column) sourceColumn {
	sc := sourceColumn{optional: c.Optional()}
	if !c.Leaf() || c.Repeated() {
		sc.refused = "nested"
		return sc
	}
	sc.kind = Int
	switch c.Type().Kind() {
	case parquet.ByteArray:
		sc.kind = String
	case parquet.Float, parquet.Double:
		sc.kind = Float
	case parquet.Boolean, parquet.Int32, parquet.Int64:
	default:
		sc.refused = "of type " + c.Type().String()
	}
	logical := c.Type().LogicalType()
	if logical == nil {
		return sc
	}
	switch l := logical.Value.(type) {
	case *format.IntType:
		sc.unsigned = !l.IsSigned
	case *format.DecimalType:
		if sc.kind != Int {
			sc.refused = "a decimal of more than 18 digits"
		}
		sc.kind, sc.scale = Float, math.Pow(10, -float64(l.Scale))
	case *format.DateType, *format.TimeType, *format.TimestampType:
		sc.refused = "a time"
	}
	return sc
}

// leaves counts the columns of a file below c.
func leaves(c *parquet.Column) int {
	if c.Leaf() {
		return 1
	}
	n := 0
	for _, sub := range c.Columns() {
		n += leaves(sub)
	}
	return n
}

// interpret turns integers of a page into what they stand for: the last n of c.
func (sc *sourceColumn) interpret(c *Column, n int, width parquet.Kind) {
	if !sc.unsigned || width != parquet.Int32 {
		return
	}
	for i := len(c.Ints) - n; i < len(c.Ints); i++ {
		c.Ints[i] &= 1<<32 - 1
	}
}

// spread moves the last n values of a column apart, so that those without a value,
// by the levels of a page, have places too.
func (c *Column) spread(levels []byte, n int) {
	const full = 1 // a flat column has one level of definition
	if c.Missing == nil {
		c.Missing = make([]bool, c.Len()-n, c.Len()-n+len(levels))
	}
	at := c.Len() - n
	for _, l := range levels {
		c.Missing = append(c.Missing, l != full)
	}
	more := len(levels) - n
	switch c.Kind {
	case String:
		c.Strings = spread(c.Strings, at, more, levels, full)
	case Int:
		c.Ints = spread(c.Ints, at, more, levels, full)
	default:
		c.Floats = spread(c.Floats, at, more, levels, full)
	}
}

func spread[E any](x []E, at, more int, levels []byte, full byte) []E {
	var zero E
	from := len(x) - 1
	for range more {
		x = append(x, zero)
	}
	for k := len(levels) - 1; k >= 0; k-- {
		if levels[k] != full {
			x[at+k] = zero
			continue
		}
		x[at+k] = x[from]
		from--
	}
	return x
}
