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
// that the page shows first. The files carry all they need: colours for white paper,
// and PNG its type.
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

// fileStyle is the style sheet of an SVG file.
var fileStyle = sheet()

func sheet() string {
	var b strings.Builder
	hex := func(i int) string {
		c := paint[i].ink
		return fmt.Sprintf("#%02x%02x%02x", c.R, c.G, c.B)
	}
	b.WriteString(`.t{font:13px "Liberation Sans",Arial,sans-serif;fill:#20242a}.q{fill:#5b616b}.g{stroke:#dcdad3;fill:none}.a{stroke:#8d9199;fill:none}` +
		`.l{fill:none;stroke-width:2.25;stroke-linejoin:round}.i{fill-opacity:.16}.w{fill-opacity:.2}`)
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
	var s svg
	draw(&s, c, v)
	title := c.Title
	for _, of := range []string{v.Option, v.Group} {
		if of != "" {
			title += ", " + groupName(of)
		}
	}
	_, err := fmt.Fprintf(w, `<svg xmlns="http://www.w3.org/2000/svg" viewBox="%s %s %s %s" width="%s" height="%s" role="img"><title>%s</title><desc>%s</desc><style>%s</style><rect x="%s" y="%s" width="100%%" height="100%%" fill="#fff"/>%s</svg>`+"\n",
		number(-margin/2), number(-margin/2), number(width+margin), number(height+margin), number(width+margin), number(height+margin),
		html.EscapeString(title), html.EscapeString(c.Caption), fileStyle, number(-margin/2), number(-margin/2), s.b.String())
	return err
}
