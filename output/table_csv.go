package output

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"strconv"
	"strings"
)

// WriteCSV renders the table as comma-separated values after RFC 4180, with a
// line of names first. Lines end in a bare line feed, which spreadsheets and
// statistics programs read and line-based tools prefer. A float is the shortest
// text that reads back as the same float, NaN, Inf and -Inf are words, a
// missing value is an empty cell and an empty string is "". Strings are written
// as they are, byte for byte: a label that begins with = is a formula to some
// spreadsheets.
func (t *Table) WriteCSV(w io.Writer) error {
	if err := t.Validate(); err != nil {
		return err
	}
	b := bufio.NewWriterSize(w, 1<<16)
	line := make([]byte, 0, 256)
	for j, c := range t.Columns {
		if j > 0 {
			line = append(line, ',')
		}
		line = appendCell(line, c.Name)
	}
	for i := range t.Len() {
		line = append(line, '\n')
		_, _ = b.Write(line) // a bufio.Writer keeps the first error
		line = line[:0]
		for j, c := range t.Columns {
			if j > 0 {
				line = append(line, ',')
			}
			switch {
			case c.IsMissing(i):
			case c.Kind == String:
				line = appendCell(line, c.Strings[i])
			case c.Kind == Int:
				line = strconv.AppendInt(line, c.Ints[i], 10)
			default:
				line = append(line, floatText(c.Floats[i])...)
			}
		}
	}
	_, _ = b.Write(append(line, '\n'))
	return b.Flush()
}

// appendCell adds a string, quoted where it must be.
func appendCell(line []byte, s string) []byte {
	if s != "" && !strings.ContainsAny(s, ",\"\r\n") && s[0] != ' ' && s[len(s)-1] != ' ' {
		return append(line, s...)
	}
	line = append(line, '"')
	line = append(line, strings.ReplaceAll(s, `"`, `""`)...)
	return append(line, '"')
}

// ReadCSV reads what WriteCSV wrote: a table with the names, units, meanings and
// kinds of like, whose values are ignored. Unlike other readers it tells an
// empty string from a missing value and leaves line ends within quotes alone.
// Faults name the line, counted from 1.
func ReadCSV(r io.Reader, like *Table) (*Table, error) {
	all, err := io.ReadAll(r)
	if err != nil {
		return nil, fmt.Errorf("output: %w", err)
	}
	t := &Table{Name: like.Name}
	for _, c := range like.Columns {
		t.Columns = append(t.Columns, &Column{Name: c.Name, Unit: c.Unit, Meaning: c.Meaning, Kind: c.Kind, Digits: c.Digits})
	}
	p := cells{text: string(all), line: 1}
	for row := 0; p.text != ""; row++ {
		at := p.line
		for j, c := range t.Columns {
			cell, quoted, last, err := p.next()
			if err != nil {
				return nil, fmt.Errorf("output: CSV line %d: %w", at, err)
			}
			if last != (j == len(t.Columns)-1) {
				return nil, fmt.Errorf("output: CSV line %d: want %d cells", at, len(t.Columns))
			}
			if row == 0 && cell != c.Name {
				return nil, fmt.Errorf("output: CSV line %d: column %d is %q, want %q", at, j+1, cell, c.Name)
			}
			if row == 0 {
				continue
			}
			if err := c.parse(cell, quoted); err != nil {
				return nil, fmt.Errorf("output: CSV line %d: column %s: %w", at, c.Name, err)
			}
		}
	}
	return t, t.Validate()
}

// parse appends a cell's value.
func (c *Column) parse(cell string, quoted bool) error {
	switch {
	case cell == "" && !quoted:
		c.AppendMissing()
	case c.Kind == String:
		c.AppendString(cell)
	case c.Kind == Int:
		v, err := strconv.ParseInt(cell, 10, 64)
		if err != nil {
			return err
		}
		c.AppendInt(v)
	default:
		v, err := strconv.ParseFloat(cell, 64)
		if err != nil {
			return err
		}
		c.AppendFloat(v)
	}
	return nil
}

// cells splits text into cells.
type cells struct {
	text string // what is left
	line int    // its line
}

// next takes a cell off the text, with the comma or line end behind it.
func (p *cells) next() (cell string, quoted, last bool, err error) {
	if quoted = strings.HasPrefix(p.text, `"`); quoted {
		cell, err = p.unquote()
		if err != nil {
			return "", true, false, err
		}
	} else {
		n := strings.IndexAny(p.text, ",\r\n\"")
		if n < 0 {
			n = len(p.text)
		}
		cell, p.text = p.text[:n], p.text[n:]
	}
	switch {
	case p.text == "":
		return cell, quoted, true, nil
	case p.text[0] == ',':
		p.text = p.text[1:]
		return cell, quoted, false, nil
	case p.text[0] == '\n', strings.HasPrefix(p.text, "\r\n"):
		p.text = p.text[strings.IndexByte(p.text, '\n')+1:]
		p.line++
		return cell, quoted, true, nil
	}
	return "", quoted, false, errors.New("a quote or carriage return stands where a comma or line end should")
}

// unquote takes a quoted string off the text.
func (p *cells) unquote() (string, error) {
	var s strings.Builder
	rest := p.text[1:]
	for {
		n := strings.IndexByte(rest, '"')
		if n < 0 {
			return "", errors.New("a quote is never closed")
		}
		s.WriteString(rest[:n])
		rest = rest[n+1:]
		if !strings.HasPrefix(rest, `"`) {
			break
		}
		s.WriteByte('"')
		rest = rest[1:]
	}
	p.text = rest
	p.line += strings.Count(s.String(), "\n")
	return s.String(), nil
}
