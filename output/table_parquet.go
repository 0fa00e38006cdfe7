package output

import (
	"fmt"
	"io"
	"strconv"

	"github.com/parquet-go/parquet-go"
	"github.com/parquet-go/parquet-go/compress/zstd"
)

// tableRowGroup is how many rows of a table stand in one row group: a large
// table is encoded piece by piece, in bounded memory.
const tableRowGroup = 131072

// WriteParquet renders the table as a Parquet file: strings by dictionary, ints
// as int64 differences, floats as doubles with split bytes, zstd. A column is
// optional if it has missing values. Units, meanings, notes (note.1, …) and
// provenance stand in the footer, in order of their keys. The bytes depend on
// nothing but the table.
func (t *Table) WriteParquet(w io.Writer) error {
	options, err := t.parquetOptions()
	if err != nil {
		return err
	}
	pw := parquet.NewGenericWriter[any](w, options...)
	buf := make([]parquet.Value, chunkRows)
	group := pw.BeginRowGroup()
	for lo := 0; lo < t.Len(); lo += tableRowGroup {
		hi := min(lo+tableRowGroup, t.Len())
		for j, c := range t.Columns {
			if err := c.put(group.ColumnWriters()[j], j, lo, hi, buf); err != nil {
				return fmt.Errorf("output: table %s: column %s: %w", t.Name, c.Name, err)
			}
		}
		if _, err := group.Commit(); err != nil {
			return fmt.Errorf("output: table %s: %w", t.Name, err)
		}
	}
	if err := pw.Close(); err != nil {
		return fmt.Errorf("output: table %s: %w", t.Name, err)
	}
	return nil
}

// parquetOptions validates the table and returns schema and footer.
func (t *Table) parquetOptions() ([]parquet.WriterOption, error) {
	if err := t.Validate(); err != nil {
		return nil, err
	}
	own := map[string]string{}
	for i, n := range t.Notes {
		own["note."+strconv.Itoa(i+1)] = n
	}
	meta, err := metadata(t.Columns, own, t.Provenance)
	if err != nil {
		return nil, err
	}
	names := make([]string, len(t.Columns))
	nodes := make([]parquet.Node, len(t.Columns))
	for j, c := range t.Columns {
		names[j], nodes[j] = c.Name, c.node()
	}
	options := []parquet.WriterOption{
		parquet.NewSchema(t.Name, inOrder(names, nodes)),
		parquet.Compression(&zstd.Codec{Level: zstd.SpeedFastest}),
		parquet.CreatedBy(createdBy, "", ""),
	}
	for k, v := range meta {
		options = append(options, parquet.KeyValueMetadata(k, v))
	}
	for _, c := range t.Columns {
		// The library leaves NaN out of a page's bounds, and a reader that
		// skips pages by their bounds would lose those rows.
		if c.hasNaN() {
			options = append(options, parquet.SkipPageBounds(c.Name), parquet.SkipPageStatistics(c.Name))
		}
	}
	return options, nil
}

// node returns the column's type and encoding.
func (c *Column) node() parquet.Node {
	var n parquet.Node
	switch c.Kind {
	case String:
		n = parquet.Encoded(parquet.String(), &parquet.RLEDictionary)
	case Int:
		n = parquet.Encoded(parquet.Int(64), &parquet.DeltaBinaryPacked)
	default:
		n = parquet.Encoded(parquet.Leaf(parquet.DoubleType), &parquet.ByteStreamSplit)
	}
	if c.hasMissing() {
		n = parquet.Optional(n)
	}
	return n
}

// put writes rows lo to hi of the column, the j-th of its table. Only values of
// an optional column carry levels.
func (c *Column) put(w *parquet.ColumnWriter, j, lo, hi int, buf []parquet.Value) error {
	optional := c.hasMissing()
	for ; lo < hi; lo += len(buf) {
		part := buf[:min(len(buf), hi-lo)]
		c.box(part, lo)
		if optional {
			for i := range part {
				if c.Missing[lo+i] {
					part[i] = parquet.NullValue().Level(0, 0, j)
				} else {
					part[i] = part[i].Level(0, 1, j)
				}
			}
		}
		if _, err := w.WriteRowValues(part); err != nil {
			return err
		}
	}
	return nil
}

// box turns the values from row lo on into the library's.
func (c *Column) box(part []parquet.Value, lo int) {
	switch c.Kind {
	case String:
		for i, v := range c.Strings[lo : lo+len(part)] {
			part[i] = parquet.ByteArrayValue([]byte(v))
		}
	case Int:
		for i, v := range c.Ints[lo : lo+len(part)] {
			part[i] = parquet.Int64Value(v)
		}
	default:
		for i, v := range c.Floats[lo : lo+len(part)] {
			part[i] = parquet.DoubleValue(v)
		}
	}
}
