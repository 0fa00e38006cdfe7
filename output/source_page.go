package output

import (
	"errors"
	"io"
	"slices"

	"github.com/parquet-go/parquet-go"
)

// Reset empties the column and keeps its memory.
func (c *Column) Reset() {
	c.Strings, c.Ints, c.Floats, c.Missing = c.Strings[:0], c.Ints[:0], c.Floats[:0], nil
}

// readPage appends a page's values, read as whole slices (a few nanoseconds a
// value); those of kinds that have no slices one by one.
func (c *Column) readPage(page parquet.Page, sc *sourceColumn) error {
	n := int(page.NumValues())
	nulls := int(page.NumNulls())
	into := c
	var whole Column
	if sc.scale != 0 {
		whole.Kind = Int
		into = &whole
	}
	read, err := into.readValuesOf(page, n-nulls, sc)
	if err != nil {
		return err
	}
	if !read { // one by one, absent ones included
		return into.readValues(page)
	}
	for _, v := range whole.Ints {
		c.Floats = append(c.Floats, float64(v)*sc.scale)
	}
	switch {
	case nulls > 0:
		c.spread(page.DefinitionLevels(), n-nulls)
	case c.Missing != nil:
		c.Missing = append(c.Missing, make([]bool, n)...)
	}
	return nil
}

// readValuesOf appends the n values that a page has. It reports false, and does
// nothing, where they can be read one by one only.
func (c *Column) readValuesOf(page parquet.Page, n int, sc *sourceColumn) (read bool, err error) {
	if dict := page.Dictionary(); dict != nil {
		data := page.Data()
		c.lookUp(dict, data.Int32()[:n])
		sc.interpret(c, n, page.Type().Kind())
		return true, nil
	}
	data := page.Data()
	switch page.Type().Kind() {
	case parquet.Double:
		c.Floats = append(c.Floats, data.Double()[:n]...)
	case parquet.Float:
		for _, v := range data.Float()[:n] {
			c.Floats = append(c.Floats, float64(v))
		}
	case parquet.Int64:
		c.Ints = append(c.Ints, data.Int64()[:n]...)
	case parquet.Int32:
		for _, v := range data.Int32()[:n] {
			c.Ints = append(c.Ints, int64(v))
		}
		sc.interpret(c, n, parquet.Int32)
	default:
		return false, nil
	}
	if sc.unsigned && page.Type().Kind() == parquet.Int64 && slices.ContainsFunc(c.Ints[len(c.Ints)-n:], func(v int64) bool { return v < 0 }) {
		return false, errors.New("an unsigned integer is above 2^63 - 1")
	}
	return true, nil
}

// lookUp appends the dictionary's values at the indexes.
func (c *Column) lookUp(dict parquet.Dictionary, indexes []int32) {
	var words Column // the dictionary
	words.Kind = c.Kind
	for i := range dict.Len() {
		words.appendValue(dict.Index(int32(i)))
	}
	switch c.Kind {
	case String:
		for _, i := range indexes {
			c.Strings = append(c.Strings, words.Strings[i])
		}
	case Int:
		for _, i := range indexes {
			c.Ints = append(c.Ints, words.Ints[i])
		}
	default:
		for _, i := range indexes {
			c.Floats = append(c.Floats, words.Floats[i])
		}
	}
}

// readValues appends a page's values one by one, absent ones included.
func (c *Column) readValues(page parquet.Page) error {
	var buf [chunkRows]parquet.Value
	for r := page.Values(); ; {
		n, err := r.ReadValues(buf[:])
		for _, v := range buf[:n] {
			c.appendValue(v)
		}
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return err
		}
		if n == 0 {
			return io.ErrNoProgress
		}
	}
}

// appendValue appends one value, copying text out of the page.
func (c *Column) appendValue(v parquet.Value) {
	if v.IsNull() {
		c.AppendMissing()
		return
	}
	switch v.Kind() {
	case parquet.ByteArray:
		c.AppendString(string(v.ByteArray()))
	case parquet.Double:
		c.AppendFloat(v.Double())
	case parquet.Float:
		c.AppendFloat(float64(v.Float()))
	case parquet.Int64:
		c.AppendInt(v.Int64())
	case parquet.Int32:
		c.AppendInt(int64(v.Int32()))
	case parquet.Boolean:
		if v.Boolean() {
			c.AppendInt(1)
		} else {
			c.AppendInt(0)
		}
	}
}
