package report

import (
	"image/color"
	"io"
	"sync"

	xfont "golang.org/x/image/font"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/font/liberation"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/vgimg"
)

// paint is the colour of a line style on white paper, and how its line is dashed.
var paint = [styles]struct {
	ink  color.NRGBA
	dash []vg.Length
}{
	{ink: color.NRGBA{0x1b, 0x4f, 0x8f, 0xff}},
	{ink: color.NRGBA{0xa8, 0x48, 0x0f, 0xff}, dash: []vg.Length{7, 4}},
	{ink: color.NRGBA{0x2a, 0x6f, 0x51, 0xff}, dash: []vg.Length{2, 4}},
	{ink: color.NRGBA{0x7a, 0x35, 0x80, 0xff}, dash: []vg.Length{10, 4, 2, 4}},
	{ink: color.NRGBA{0x66, 0x6a, 0x70, 0xff}},
}

var (
	ink   = color.NRGBA{0x20, 0x24, 0x2a, 0xff}
	quiet = color.NRGBA{0x5b, 0x61, 0x6b, 0xff}
	grid  = color.NRGBA{0xdc, 0xda, 0xd3, 0xff}
	axis  = color.NRGBA{0x8d, 0x91, 0x99, 0xff}
)

// typeface is the type of the files, which carry it with them.
var typeface = sync.OnceValue(func() font.Face {
	return font.NewCache(liberation.Collection()).Lookup(font.Font{Typeface: "Liberation", Variant: "Sans", Weight: xfont.WeightNormal}, textSize)
})

// raster is a painter on pixels, bottom below the origin of a chart.
type raster struct {
	c      *vgimg.Canvas
	bottom float64
}

// at turns a place around: the origin of pixels is at the bottom.
func (r raster) at(p point) vg.Point {
	return vg.Point{X: vg.Length(p.x), Y: vg.Length(r.bottom - p.y)}
}

func (r raster) path(p []point) vg.Path {
	var path vg.Path
	for i, q := range p {
		if i == 0 {
			path.Move(r.at(q))
		} else {
			path.Line(r.at(q))
		}
	}
	return path
}

func (r raster) stroke(p []point, ink color.Color, width vg.Length, dash []vg.Length) {
	r.c.SetColor(ink)
	r.c.SetLineWidth(width)
	r.c.SetLineDash(dash, 0)
	r.c.Stroke(r.path(p))
}

func (r raster) line(p []point, style int) {
	width := vg.Length(2.25)
	if style%styles == styles-1 {
		width = 1.25
	}
	r.stroke(p, paint[style%styles].ink, width, paint[style%styles].dash)
}

func (r raster) area(p []point, style int, wide bool) {
	c := paint[style%styles].ink
	c.A = 41
	if wide {
		c.A = 51
	}
	r.c.SetColor(c)
	path := r.path(p)
	path.Close()
	r.c.Fill(path)
}

func (r raster) dot(p point, style int) {
	r.c.SetColor(paint[style%styles].ink)
	var path vg.Path
	at := r.at(p)
	path.Move(vg.Point{X: at.X + 4, Y: at.Y})
	path.Arc(at, 4, 0, 6.283185307179586)
	path.Close()
	r.c.Fill(path)
}

func (r raster) bar(a, b point, style int) {
	r.stroke([]point{a, b}, paint[style%styles].ink, 1.5, nil)
}

func (r raster) rule(a, b point, isAxis bool) {
	c := grid
	if isAxis {
		c = axis
	}
	r.stroke([]point{a, b}, c, 1, nil)
}

func (r raster) text(p point, a anchor, s string, style int) {
	face := typeface()
	at := r.at(p)
	switch a {
	case middle:
		at.X -= face.Width(s) / 2
	case end:
		at.X -= face.Width(s)
	}
	if style >= 0 { // a rim of paper around the name of a line
		r.c.SetColor(color.White)
		for _, d := range []vg.Point{{X: 1}, {X: -1}, {Y: 1}, {Y: -1}, {X: 0.7, Y: 0.7}, {X: 0.7, Y: -0.7}, {X: -0.7, Y: 0.7}, {X: -0.7, Y: -0.7}} {
			r.c.FillString(face, at.Add(d), s)
		}
	}
	switch {
	case style >= 0:
		r.c.SetColor(paint[style%styles].ink)
	case style == -2:
		r.c.SetColor(quiet)
	default:
		r.c.SetColor(ink)
	}
	r.c.FillString(face, at, s)
}

// dpi is how fine a picture is: more than twice as fine as a screen, for paper.
const dpi = 168

// writePNG draws a view as a PNG file.
func writePNG(w io.Writer, c *Chart, v *View) error {
	lines := heading(c, v)
	h := height + above(lines) + margin
	canvas := vgimg.NewWith(vgimg.UseWH(vg.Length(width+margin), vg.Length(h)), vgimg.UseDPI(dpi), vgimg.UseBackgroundColor(color.White))
	canvas.Translate(vg.Point{X: margin / 2})
	r := raster{canvas, height + margin/2}
	drawHeading(r, lines)
	draw(r, c, v)
	_, err := vgimg.PngCanvas{Canvas: canvas}.WriteTo(w)
	return err
}
