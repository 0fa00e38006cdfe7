package report

import (
	"fmt"
	"html"
	"io"
	"strings"
)

// Figure is a chart as a file of its own.
type Figure struct {
	Name  string // of the file, with its ending
	Write func(io.Writer) error
}

// Figures returns the charts of sections as SVG and PNG files, each in the view
// that the page shows first. The files carry all they need: their title, colours for
// white paper, and letters as outlines.
func Figures(sections []Section) []Figure {
	var list []Figure
	for _, s := range sections {
		for i := range s.Charts {
			c := &s.Charts[i]
			v := &c.Views[0]
			list = append(list,
				Figure{c.ID + ".svg", func(w io.Writer) error { return writeSVG(w, c, v) }},
				Figure{c.ID + ".png", func(w io.Writer) error { return writePNG(w, c, v) }})
		}
	}
	return list
}

// margin is the white around a picture in a file.
const margin = 16.0

// heading says above a picture what it shows, in lines that fit.
func heading(c *Chart, v *View) []string {
	list := wrapped(c.Title)
	var of []string
	if v.Option != "" {
		of = append(of, v.Option)
	}
	if v.Group != "" {
		of = append(of, groupName(v.Group))
	}
	if len(of) > 0 {
		list = append(list, wrapped(strings.Join(of, ", "))...)
	}
	return list
}

// wrapped breaks a text into lines that are no wider than a chart.
func wrapped(s string) []string {
	var list []string
	line := ""
	for _, word := range strings.Fields(s) {
		if line != "" && advance(line+" "+word) > width-8 {
			list = append(list, line)
			line = ""
		}
		if line != "" {
			line += " "
		}
		line += word
	}
	return append(list, line)
}

// above is the height that a heading takes.
func above(lines []string) float64 { return float64(len(lines))*(textSize+5) + 6 }

func drawHeading(p painter, lines []string) {
	for i, line := range lines {
		p.text(point{2, float64(i)*(textSize+5) + textSize - above(lines)}, start, line, -1)
	}
}

// fileStyle is the style sheet of an SVG file.
var fileStyle = sheet()

func sheet() string {
	var b strings.Builder
	hex := func(i int) string {
		c := paint[i].ink
		return fmt.Sprintf("#%02x%02x%02x", c.R, c.G, c.B)
	}
	b.WriteString(".t{fill:#20242a;paint-order:stroke;stroke:#fff;stroke-width:3}.q{fill:#5b616b;stroke:none}.g{stroke:#dcdad3;fill:none}.a{stroke:#8d9199;fill:none}" +
		".l{fill:none;stroke-width:2.25;stroke-linejoin:round}.i{fill-opacity:.16}.w{fill-opacity:.2}")
	for i := range styles {
		fmt.Fprintf(&b, ".l%d{stroke:%s", i, hex(i))
		if len(paint[i].dash) > 0 {
			b.WriteString(";stroke-dasharray:" + strings.Trim(fmt.Sprint(paint[i].dash), "[]"))
		}
		fmt.Fprintf(&b, "}.f%d{fill:%s}", i, hex(i))
	}
	b.WriteString(".l4{stroke-width:1.25}.e{stroke-width:1.5;stroke-dasharray:none}")
	return b.String()
}

// writeSVG draws a view as an SVG file.
func writeSVG(w io.Writer, c *Chart, v *View) error {
	lines := heading(c, v)
	s := svg{letters: newLetters()}
	drawHeading(&s, lines)
	draw(&s, c, v)
	high := height + above(lines) + margin
	_, err := fmt.Fprintf(w, `<svg xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink" viewBox="%s %s %s %s" width="%s" height="%s" role="img"><title>%s</title><desc>%s</desc><style>%s</style><defs>%s</defs><rect x="%s" y="%s" width="100%%" height="100%%" fill="#fff"/>%s</svg>`+"\n",
		number(-margin/2), number(-margin/2-above(lines)), number(width+margin), number(high), number(width+margin), number(high),
		html.EscapeString(strings.Join(lines, ", ")), html.EscapeString(c.Caption), fileStyle, s.letters.outlines(), number(-margin/2), number(-margin/2-above(lines)), s.String())
	return err
}
