package report

import (
	"fmt"
	"html"
	"math"
	"strconv"
	"strings"
)

// styles is the number of line styles: beyond it they come again.
const styles = 5

// svg is a painter that writes SVG. Marks have classes; colours come from a style
// sheet. With letters of its own text becomes their outlines.
type svg struct {
	b       strings.Builder
	letters *letters
	rules   [2]string // paths of grid and axes, which are written as one
}

func number(x float64) string {
	return strconv.FormatFloat(math.Round(x*10)/10, 'f', -1, 64)
}

func path(p []point, closed bool) string {
	var b strings.Builder
	for i, q := range p {
		c := "L"
		if i == 0 {
			c = "M"
		}
		b.WriteString(c + number(q.x) + " " + number(q.y))
	}
	if closed {
		b.WriteString("Z")
	}
	return b.String()
}

func (s *svg) line(p []point, style int) {
	fmt.Fprintf(&s.b, `<path class="l l%d" d="%s"/>`, style%styles, path(p, false))
}

func (s *svg) area(p []point, style int, wide bool) {
	class := "i"
	if wide {
		class = "w"
	}
	fmt.Fprintf(&s.b, `<path class="%s f%d" d="%s"/>`, class, style%styles, path(p, true))
}

func (s *svg) dot(p point, style int) {
	fmt.Fprintf(&s.b, `<circle class="d f%d" cx="%s" cy="%s" r="4"/>`, style%styles, number(p.x), number(p.y))
}

func (s *svg) bar(a, b point, style int) {
	fmt.Fprintf(&s.b, `<path class="l e l%d" d="%s"/>`, style%styles, path([]point{a, b}, false))
}

func (s *svg) rule(a, b point, axis bool) {
	k := 0
	if axis {
		k = 1
	}
	s.rules[k] += path([]point{a, b}, false)
}

// String returns all marks, the rules below the others.
func (s *svg) String() string {
	var b strings.Builder
	for k, class := range []string{"g", "a"} {
		if s.rules[k] != "" {
			fmt.Fprintf(&b, `<path class="%s" d="%s"/>`, class, s.rules[k])
		}
	}
	return b.String() + s.b.String()
}

func (s *svg) text(p point, a anchor, t string, style int) {
	class := "t"
	switch {
	case style == -2:
		class = "t q"
	case style >= 0:
		class = fmt.Sprintf("t f%d", style%styles)
	}
	if s.letters != nil {
		fmt.Fprintf(&s.b, `<g class="%s">%s</g>`, class, s.letters.set(p, a, t))
		return
	}
	side := []string{"", ` text-anchor="middle"`, ` text-anchor="end"`}[a]
	fmt.Fprintf(&s.b, `<text class="%s" x="%s" y="%s"%s>%s</text>`, class, number(p.x), number(p.y), side, html.EscapeString(t))
}

// markup draws a view as an SVG element for the page.
func markup(c *Chart, v *View) (element string, b box) {
	var s svg
	b = draw(&s, c, v)
	return fmt.Sprintf(`<svg viewBox="0 0 %s %s" aria-hidden="true" focusable="false">%s<g class="cursor"></g></svg>`, number(width), number(height), s.String()), b
}
