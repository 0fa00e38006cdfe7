package output

import (
	"errors"
	"fmt"
	"maps"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
)

// A Part is a part file that is whole on disk.
type Part struct {
	Path       string
	Index      int64             // k of part-k.parquet
	First      int64             // id of its first household
	Households int64             // First … First + Households − 1
	Rows       int64             // household-years
	Metadata   map[string]string // the footer
}

// Finished lists the parts that are whole in the folder dir, in order. Files
// that are not parts, temporary ones above all, are passed over; a part that
// cannot be read, or whose footer contradicts its name, is an error. A folder
// that does not exist holds no parts.
func Finished(dir string) ([]Part, error) {
	entries, err := os.ReadDir(dir)
	if errors.Is(err, os.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, fmt.Errorf("output: %w", err)
	}
	var parts []Part
	for _, e := range entries {
		k, isPart := partIndex(e.Name())
		if !isPart {
			continue
		}
		part, err := readPart(filepath.Join(dir, e.Name()), k)
		if err != nil {
			return nil, err
		}
		parts = append(parts, part)
	}
	slices.SortFunc(parts, func(a, b Part) int { return int(a.Index - b.Index) })
	return parts, nil
}

// partIndex returns k for the file name of part k.
func partIndex(name string) (k int64, isPart bool) {
	number, hasPrefix := strings.CutPrefix(name, "part-")
	number, hasSuffix := strings.CutSuffix(number, ".parquet")
	k, err := strconv.ParseInt(number, 10, 64)
	return k, hasPrefix && hasSuffix && err == nil && PartName(k) == name
}

// readPart reads a part's footer.
func readPart(path string, k int64) (Part, error) {
	s, err := OpenParquet(path)
	if err != nil {
		return Part{}, err
	}
	defer func() { _ = s.Close() }()
	p := Part{Path: path, Index: k, Rows: s.Rows(), Metadata: s.Metadata()}
	var errs [3]error
	var block int64
	p.First, errs[0] = strconv.ParseInt(p.Metadata[keyFirst], 10, 64)
	p.Households, errs[1] = strconv.ParseInt(p.Metadata[keyHouseholds], 10, 64)
	block, errs[2] = strconv.ParseInt(p.Metadata[keyBlock], 10, 64)
	if err := errors.Join(errs[:]...); err != nil {
		return Part{}, fmt.Errorf("output: %s is not a panel's part: %w", path, err)
	}
	if p.First != k*block || p.Households < 1 || p.Households > block {
		return Part{}, fmt.Errorf("output: %s holds %d households from %d in blocks of %d; its name says otherwise", path, p.Households, p.First, block)
	}
	return p, nil
}

// Resume returns the household from which a panel with these options, written
// to the folder dir before, has to be continued: the first that is not in an
// unbroken run of whole parts from o.From on. Give it to NewPanel as From; it
// equals To if nothing is left to do. A part that another panel left there
// (other provenance, precision, block or columns) is an error.
func (o PanelOptions) Resume(dir string) (int64, error) {
	if o.Unit == 0 {
		o.Unit = DefaultUnit
	}
	if err := o.Validate(); err != nil {
		return 0, err
	}
	parts, err := Finished(dir)
	if err != nil {
		return 0, err
	}
	want, err := panelMetadata(o)
	if err != nil {
		return 0, err
	}
	next := o.From
	for _, p := range parts {
		if p.First < o.From || p.First >= o.To {
			continue // another share of the same population
		}
		if p.First != next {
			break
		}
		want[keyFirst] = strconv.FormatInt(p.First, 10)
		want[keyHouseholds] = strconv.FormatInt(min(int64(o.Block), o.To-p.First), 10)
		if !maps.Equal(p.Metadata, want) {
			return 0, fmt.Errorf("output: %s was written by another run (%s differs)", p.Path, difference(p.Metadata, want))
		}
		next += p.Households
	}
	return next, nil
}

// difference names the first key, in order, in which two footers differ.
func difference(a, b map[string]string) string {
	keys := slices.Sorted(maps.Keys(a))
	keys = append(keys, slices.Sorted(maps.Keys(b))...)
	for _, k := range keys {
		va, inA := a[k]
		vb, inB := b[k]
		if va != vb || inA != inB {
			return k
		}
	}
	return "nothing"
}

// ReadPanel reads the parts of the folder dir in order of households, one unit
// at a time, and hands each to the function each: a table of the columns asked
// for, in that order, sorted by household, then age. The table's memory is used
// again for the next unit. Bools are ints 0 and 1; single precision is widened.
// Without a part, each is never called.
func ReadPanel(dir string, columns []string, each func(*Table) error) error {
	parts, err := Finished(dir)
	if err != nil {
		return err
	}
	for _, p := range parts {
		if err := readUnits(p, columns, each); err != nil {
			return err
		}
	}
	return nil
}

func readUnits(p Part, columns []string, each func(*Table) error) error {
	s, err := OpenParquet(p.Path)
	if err != nil {
		return err
	}
	defer func() { _ = s.Close() }()
	t := &Table{Name: "panel", Provenance: p.Metadata}
	for _, name := range columns {
		c, err := s.NewColumn(name)
		if err != nil {
			return err
		}
		t.Columns = append(t.Columns, c)
	}
	for g := range s.Groups() {
		for _, c := range t.Columns {
			c.Reset()
			if err := s.ReadColumn(g, c); err != nil {
				return err
			}
		}
		if err := each(t); err != nil {
			return err
		}
	}
	return nil
}
