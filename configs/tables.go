package configs

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"path"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"cistern/income"
)

// maxTableBytes bounds the size of a table.
const maxTableBytes = 16 << 20

// files reads the tables that a scenario names, each once.
type files struct {
	open   func(name string) (data []byte, shown string, err error)
	inputs []Input
	names  map[string]string // resolved name by name
}

func newFiles(open func(name string) ([]byte, string, error)) *files {
	return &files{open: open, names: map[string]string{}}
}

// copyName is the name under which the resolved scenario finds a copy of a table.
func (f *files) copyName(name string) string {
	if copy, ok := f.names[name]; ok {
		return copy
	}
	base := path.Base(filepath.ToSlash(strings.TrimPrefix(name, shippedPrefix)))
	copy := "inputs/" + base
	for k := 2; f.taken(copy); k++ {
		copy = fmt.Sprintf("inputs/%d-%s", k, base)
	}
	f.names[name] = copy
	return copy
}

func (f *files) taken(copy string) bool {
	for _, c := range f.names {
		if c == copy {
			return true
		}
	}
	return false
}

// table reads a CSV file with the given columns, in any order. A fault names the
// file and the line.
func (f *files) table(faults *faults, ref tableRef, columns ...string) (rows [][]string, lines []int, shown string) {
	data, shown, err := f.open(ref.name)
	if err != nil {
		e := &PosError{Key: ref.key, Message: fmt.Sprintf("names %s, which cannot be read: %v", ref.name, unwrapped(err))}
		if ref.at != nil {
			e.File, e.Line, e.Column = ref.at.source, ref.at.line, ref.at.column
		}
		faults.add(e)
		return nil, nil, shown
	}
	if len(data) > maxTableBytes {
		faults.add(&PosError{File: shown, Message: fmt.Sprintf("is %d bytes long, want at most %d", len(data), maxTableBytes)})
		return nil, nil, shown
	}
	if copy := f.copyName(ref.name); !slices.ContainsFunc(f.inputs, func(i Input) bool { return i.Name == copy }) {
		f.inputs = append(f.inputs, Input{copy, data})
	}
	r := csv.NewReader(strings.NewReader(strings.TrimPrefix(string(data), "\uFEFF")))
	r.Comment = '#'
	r.TrimLeadingSpace = true
	var at []int
	for {
		record, err := r.Read()
		if err == io.EOF {
			break
		}
		var p *csv.ParseError
		if errors.As(err, &p) {
			faults.add(&PosError{File: shown, Line: p.Line, Message: p.Err.Error()})
			return nil, nil, shown
		}
		line, _ := r.FieldPos(0)
		if at == nil {
			if at = header(faults, shown, line, record, columns); at == nil {
				return nil, nil, shown
			}
			continue
		}
		row := make([]string, len(columns))
		for k, c := range at {
			row[k] = strings.TrimSpace(record[c])
		}
		rows, lines = append(rows, row), append(lines, line)
	}
	switch {
	case at == nil:
		faults.add(&PosError{File: shown, Line: 1, Message: "is empty, want a header and rows"})
	case len(rows) == 0:
		faults.add(&PosError{File: shown, Line: 1, Message: "has a header but no rows"})
	}
	return rows, lines, shown
}

// unwrapped drops the path from a file error, which the message has already.
func unwrapped(err error) error {
	if e := errors.Unwrap(err); e != nil {
		return e
	}
	return err
}

// header finds the columns.
func header(faults *faults, shown string, line int, record, columns []string) []int {
	var at []int
	for _, c := range columns {
		named := func(s string) bool { return strings.TrimSpace(s) == c }
		k := slices.IndexFunc(record, named)
		if k < 0 {
			faults.add(&PosError{File: shown, Line: line, Message: fmt.Sprintf("has no column %s, want columns %s", c, strings.Join(columns, ", "))})
			return nil
		}
		if slices.IndexFunc(record[k+1:], named) >= 0 {
			faults.add(&PosError{File: shown, Line: line, Message: fmt.Sprintf("has column %s twice", c)})
			return nil
		}
		at = append(at, k)
	}
	return at
}

// maxNamed bounds how many of a table's kinds of rows an error lists.
const maxNamed = 20

// lifeTable reads the rows of one sex and year.
func (f *files) lifeTable(faults *faults, ref tableRef, sex string, year int) *income.LifeTable {
	rows, lines, shown := f.table(faults, ref, "age", "sex", "year", "q")
	q := map[int]float64{}
	low, high := 1<<30, -1
	var seen []string
	for i, r := range rows {
		if key := r[1] + " " + r[2]; len(seen) <= maxNamed && !slices.Contains(seen, key) {
			seen = append(seen, key)
		}
		if r[1] != sex || r[2] != strconv.Itoa(year) {
			continue
		}
		age, err := strconv.Atoi(r[0])
		x, err2 := strconv.ParseFloat(r[3], 64)
		switch _, twice := q[age]; {
		case err != nil || age < 0 || age > 200:
			faults.add(&PosError{File: shown, Line: lines[i], Message: fmt.Sprintf("age is %q, want a whole number from 0 to 200", clip(r[0]))})
		case err2 != nil || !decimal.MatchString(r[3]) || !(x >= 0 && x <= 1):
			faults.add(&PosError{File: shown, Line: lines[i], Message: fmt.Sprintf("q is %q, want a probability from 0 to 1", clip(r[3]))})
		case twice:
			faults.add(&PosError{File: shown, Line: lines[i], Message: fmt.Sprintf("has age %d a second time for %s %d", age, sex, year)})
		default:
			q[age] = x
			low, high = min(low, age), max(high, age)
		}
	}
	if len(q) == 0 {
		if len(rows) > 0 {
			if len(seen) > maxNamed {
				seen = append(seen[:maxNamed], "…")
			}
			faults.add(&PosError{File: shown, Message: fmt.Sprintf("has no rows for sex %s and year %d, only for %s", sex, year, strings.Join(seen, ", "))})
		}
		return nil
	}
	table := &income.LifeTable{FirstAge: low}
	for age := low; age <= high; age++ {
		x, ok := q[age]
		if !ok {
			faults.add(&PosError{File: shown, Message: fmt.Sprintf("has no row for age %d, %s %d", age, sex, year)})
			return nil
		}
		table.Q = append(table.Q, x)
	}
	return table
}

// profileTable reads earnings by age.
func (f *files) profileTable(faults *faults, ref tableRef) (ages []int, earnings []float64) {
	rows, lines, shown := f.table(faults, ref, "age", "earnings")
	for i, r := range rows {
		age, err := strconv.Atoi(r[0])
		y, err2 := strconv.ParseFloat(r[1], 64)
		switch {
		case err != nil || age < 0 || age > 200:
			faults.add(&PosError{File: shown, Line: lines[i], Message: fmt.Sprintf("age is %q, want a whole number from 0 to 200", clip(r[0]))})
		case err2 != nil || !decimal.MatchString(r[1]) || y-y != 0:
			faults.add(&PosError{File: shown, Line: lines[i], Message: fmt.Sprintf("earnings is %q, want a number", clip(r[1]))})
		case slices.Contains(ages, age):
			faults.add(&PosError{File: shown, Line: lines[i], Message: fmt.Sprintf("has age %d a second time", age)})
		default:
			ages, earnings = append(ages, age), append(earnings, y)
		}
	}
	return ages, earnings
}
