package output

import (
	"bufio"
	"io"
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// WriteText renders the table for a terminal: a line of names, a line of units
// where there are any, numbers to the right, labels to the left, two spaces
// between columns, notes below. Floats are rounded to the column's Digits; a
// missing value is "-". Characters that could move the cursor are escaped.
func (t *Table) WriteText(w io.Writer) error {
	if err := t.Validate(); err != nil {
		return err
	}
	widths := make([]int, len(t.Columns))
	units := false
	for j, c := range t.Columns {
		widths[j] = max(runes(printable(c.Name)), runes(printable(c.Unit)))
		units = units || c.Unit != ""
		for i := range t.Len() {
			widths[j] = max(widths[j], runes(c.text(i)))
		}
	}
	b := bufio.NewWriter(w)
	t.line(b, widths, func(c *Column) string { return printable(c.Name) })
	if units {
		t.line(b, widths, func(c *Column) string { return printable(c.Unit) })
	}
	for i := range t.Len() {
		t.line(b, widths, func(c *Column) string { return c.text(i) })
	}
	for _, n := range t.Notes {
		_, _ = b.WriteString("note: " + printable(n) + "\n")
	}
	return b.Flush() // a bufio.Writer keeps the first error
}

// line writes one line of cells, without blanks at its end.
func (t *Table) line(b *bufio.Writer, widths []int, cell func(*Column) string) {
	var s strings.Builder
	for j, c := range t.Columns {
		if j > 0 {
			s.WriteString("  ")
		}
		v := cell(c)
		pad := strings.Repeat(" ", widths[j]-runes(v))
		if c.Kind == String {
			s.WriteString(v + pad)
		} else {
			s.WriteString(pad + v)
		}
	}
	_, _ = b.WriteString(strings.TrimRight(s.String(), " ") + "\n")
}

// text returns value i as aligned text shows it.
func (c *Column) text(i int) string {
	switch {
	case c.IsMissing(i):
		return "-"
	case c.Kind == String:
		return printable(c.Strings[i])
	case c.Kind == Int:
		return strconv.FormatInt(c.Ints[i], 10)
	}
	digits := c.Digits
	if digits <= 0 {
		digits = 6
	}
	return roundedText(c.Floats[i], digits)
}

// roundedText rounds v to significant digits and writes it without an exponent
// unless it is very large or very small.
func roundedText(v float64, digits int) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return floatText(v)
	}
	r, err := strconv.ParseFloat(strconv.FormatFloat(v, 'e', digits-1, 64), 64)
	if err != nil { // rounding up the largest floats overflows
		r = v
	}
	return floatText(r)
}

// floatText is the shortest text that reads back as exactly v; NaN, Inf and
// -Inf are words.
func floatText(v float64) string {
	switch a := math.Abs(v); {
	case math.IsInf(v, 1):
		return "Inf" // strconv would write +Inf
	case a != 0 && (a < 1e-5 || a >= 1e15):
		return strconv.FormatFloat(v, 'e', -1, 64)
	}
	return strconv.FormatFloat(v, 'f', -1, 64)
}

// printable escapes what a terminal would act on.
func printable(s string) string {
	safe := func(r rune) bool { return r == ' ' || unicode.IsGraphic(r) && r != utf8.RuneError }
	if strings.IndexFunc(s, func(r rune) bool { return !safe(r) }) < 0 {
		return s
	}
	q := strconv.QuoteToGraphic(s)
	return strings.ReplaceAll(q[1:len(q)-1], `\"`, `"`)
}

func runes(s string) int { return utf8.RuneCountInString(s) }
