package output

import (
	"errors"
	"fmt"
	"io"
	"os"

	"github.com/parquet-go/parquet-go"
)

// A Source is an open Parquet file of flat columns, one of this package's own
// as a rule: a panel's part or a table. Columns are read one at a time, a row
// group at a time, which is what statistics over large panels need.
//
// A Source is not safe for concurrent use; open the file once a goroutine.
type Source struct {
	path    string
	f       *os.File
	file    *parquet.File
	columns map[string]sourceColumn
	names   []string
}

// sourceColumn is where a column stands and what it is.
type sourceColumn struct {
	index    int
	kind     Kind
	optional bool
	unsigned bool    // integers stand for numbers from 0
	scale    float64 // decimal: integers stand for that part of themselves; 0: not so
	refused  string  // why it cannot be read; empty where it can
}

// OpenParquet opens the file path. Columns that are neither text, bool, integer,
// decimal of at most 18 digits nor floating point, or are nested, cannot be read:
// the file opens, and NewColumn says why.
func OpenParquet(path string) (*Source, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, fmt.Errorf("output: %w", err)
	}
	s := &Source{path: path, f: f, columns: map[string]sourceColumn{}}
	if err := s.open(); err != nil {
		return nil, fmt.Errorf("output: %s: %w", path, errors.Join(err, f.Close()))
	}
	return s, nil
}

func (s *Source) open() (err error) {
	defer rescue(&err)
	info, err := s.f.Stat()
	if err != nil {
		return err
	}
	s.file, err = parquet.OpenFile(s.f, info.Size(), parquet.SkipPageIndex(true), parquet.SkipBloomFilters(true))
	if err != nil {
		return err
	}
	leaf := 0
	for _, c := range s.file.Root().Columns() {
		sc := describeColumn(c)
		sc.index = leaf
		leaf += leaves(c)
		s.columns[c.Name()] = sc
		s.names = append(s.names, c.Name())
	}
	return nil
}

// Close closes the file.
func (s *Source) Close() error { return s.f.Close() }

// Has returns the kind of a column, whether values may be missing, and whether it
// is there and can be read.
func (s *Source) Has(name string) (kind Kind, optional, readable bool) {
	c, ok := s.columns[name]
	return c.kind, c.optional, ok && c.refused == ""
}

// Names returns the columns' names in order.
func (s *Source) Names() []string { return s.names }

// Rows returns the number of rows in the file.
func (s *Source) Rows() int64 { return s.file.NumRows() }

// Groups returns the number of row groups.
func (s *Source) Groups() int { return len(s.file.RowGroups()) }

// GroupRows returns the number of rows of row group g.
func (s *Source) GroupRows(g int) int64 { return s.file.RowGroups()[g].NumRows() }

// Metadata returns the footer's key-value pairs: units, meanings, provenance.
func (s *Source) Metadata() map[string]string {
	m := map[string]string{}
	for _, kv := range s.file.Metadata().KeyValueMetadata {
		m[kv.Key] = kv.Value
	}
	return m
}

// NewColumn returns an empty column for the file's column name, with the unit
// and meaning that stand in the footer.
func (s *Source) NewColumn(name string) (*Column, error) {
	sc, ok := s.columns[name]
	if !ok {
		return nil, fmt.Errorf("output: %s has no column %s", s.path, name)
	}
	if sc.refused != "" {
		return nil, fmt.Errorf("output: %s: column %s is %s, want text, a number or a bool", s.path, name, sc.refused)
	}
	unit, _ := s.file.Lookup("column." + name + ".unit")
	meaning, _ := s.file.Lookup("column." + name + ".meaning")
	return &Column{Name: name, Kind: sc.kind, Unit: unit, Meaning: meaning}, nil
}

// ReadColumn appends the values of row group g to c, a column made by NewColumn
// and perhaps emptied by Reset since. Floats of either width become float64,
// bools become 0 and 1. A damaged file is an error.
func (s *Source) ReadColumn(g int, c *Column) (err error) {
	defer func() {
		if err != nil {
			err = fmt.Errorf("output: %s: column %s: %w", s.path, c.Name, err)
		}
	}()
	defer rescue(&err)
	group := s.file.RowGroups()[g]
	sc, before := s.columns[c.Name], c.Len()
	pages := group.ColumnChunks()[sc.index].Pages()
	defer func() { err = errors.Join(err, pages.Close()) }()
	for {
		page, err := pages.ReadPage()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			return err
		}
		err = c.readPage(page, &sc)
		parquet.Release(page)
		if err != nil {
			return err
		}
	}
	if got := int64(c.Len() - before); got != group.NumRows() {
		return fmt.Errorf("%d values in row group %d, want %d", got, g, group.NumRows())
	}
	return nil
}

// rescue turns a panic into an error: the library trusts some of what a file
// says about itself, so a damaged one can make it panic.
func rescue(err *error) {
	if r := recover(); r != nil {
		*err = fmt.Errorf("damaged: %v", r)
	}
}

// ReadTable reads the whole file path into memory.
func ReadTable(path string) (*Table, error) {
	s, err := OpenParquet(path)
	if err != nil {
		return nil, err
	}
	defer func() { _ = s.Close() }()
	t := &Table{Name: s.file.Schema().Name(), Provenance: s.Metadata()}
	for _, name := range s.names {
		c, err := s.NewColumn(name)
		if err != nil {
			return nil, err
		}
		for g := range s.Groups() {
			if err := s.ReadColumn(g, c); err != nil {
				return nil, err
			}
		}
		delete(t.Provenance, "column."+name+".unit")
		delete(t.Provenance, "column."+name+".meaning")
		t.Columns = append(t.Columns, c)
	}
	for i := 1; ; i++ {
		key := fmt.Sprintf("note.%d", i)
		note, ok := t.Provenance[key]
		if !ok {
			return t, t.Validate()
		}
		t.Notes = append(t.Notes, note)
		delete(t.Provenance, key)
	}
}
