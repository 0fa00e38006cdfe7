package report

import (
	"math"
	"slices"
	"strings"
)

// Size of a chart, in the units that text is measured in.
const (
	width    = 400.0
	height   = 272.0
	textSize = 13.0
)

// point is a place on a chart, y downwards.
type point struct{ x, y float64 }

// anchor says which end of a text stands at its place.
type anchor int

const (
	start anchor = iota
	middle
	end
)

// painter puts marks on a medium.
type painter interface {
	line(p []point, style int)
	area(p []point, style int, wide bool)
	dot(p point, style int)
	bar(a, b point, style int)
	rule(a, b point, axis bool)
	text(p point, a anchor, s string, style int) // style −1: plain, −2: quiet
}

// box is where the values of a view lie on the chart.
type box struct{ x, y scale }

// advance estimates the width of a text: ours are set in a sans-serif type.
func advance(s string) float64 {
	w := 0.0
	for _, r := range s {
		switch {
		case strings.ContainsRune(" ,.'iljtfI|:", r):
			w += 0.3
		case strings.ContainsRune("mwMW%−", r):
			w += 0.86
		default:
			w += 0.6
		}
	}
	return w * textSize
}

// draw puts a view of a chart on a painter and returns where its values lie.
func draw(p painter, c *Chart, v *View) box {
	x0, x1, y0, y1 := v.extent()
	if v.dotted() { // dots stand clear of the axis
		x0, x1 = x0-0.5, x1+0.5
	}
	b := box{x: newScale(x0, x1, c.X, 6), y: newScale(y0, y1, c.Y, 5)}
	left := 0.0
	for _, t := range b.y.ticks {
		left = math.Max(left, advance(b.y.tick(t, c.Y)))
	}
	b.y.from, b.y.to = height-42, 26
	right := 14.0
	if n := len(b.x.ticks); n > 0 { // the last tick's number stands half beyond the axis
		right = math.Max(right, advance(b.x.tick(b.x.ticks[n-1], c.X))/2)
	}
	b.x.from, b.x.to = left+12, width-right
	names := besideLines(v, &b)
	if names == nil {
		b.y.to += drawLegend(p, v)
	}
	drawAxes(p, c, v, &b)
	for i := range v.Series {
		drawBand(p, &v.Series[i], &b)
	}
	for i := range v.Series {
		drawLine(p, &v.Series[i], &b)
	}
	for _, n := range names {
		p.text(point{n.left, n.bottom - textSize*0.25}, start, n.text, n.style)
	}
	return b
}

// drawLegend names the lines above the picture, each after a piece of it, and
// returns the height that takes.
func drawLegend(p painter, v *View) float64 {
	const sample, gap = 24.0, 12.0
	x, y := 2.0, 32.0
	for i := range v.Series {
		s := &v.Series[i]
		if s.Label == "" {
			continue
		}
		wide := sample + 6 + advance(s.Label)
		if x > 2 && x+wide > width {
			x, y = 2, y+textSize+5
		}
		p.line([]point{{x, y - textSize*0.35}, {x + sample, y - textSize*0.35}}, s.Style)
		p.text(point{x + sample + 6, y}, start, s.Label, s.Style)
		x += wide + gap
	}
	return y - 32 + 20
}

func drawAxes(p painter, c *Chart, v *View, b *box) {
	for _, t := range b.y.ticks {
		y := b.y.at(t)
		p.rule(point{b.x.from, y}, point{b.x.to, y}, t == 0)
		p.text(point{b.x.from - 7, y + textSize*0.35}, end, b.y.tick(t, c.Y), -2)
	}
	p.rule(point{b.x.from, b.y.from}, point{b.x.to, b.y.from}, true)
	for _, t := range b.x.ticks {
		x := b.x.at(t)
		p.rule(point{x, b.y.from}, point{x, b.y.from + 4}, true)
		p.text(point{x, b.y.from + 18}, middle, b.x.tick(t, c.X), -2)
	}
	p.text(point{(b.x.from + b.x.to) / 2, height - 6}, middle, c.X.Label, -2)
	label := c.Y.Label
	if v.YLabel != "" {
		label = v.YLabel
	}
	p.text(point{2, 13}, start, label, -2)
}

// hair is the height of a band that its line hides.
const hair = 2.0

func drawBand(p painter, s *Series, b *box) {
	if s.Lower == nil || s.Dots || s.Y != nil && s.thickest(b) < hair {
		return
	}
	var up, down []point
	flush := func() {
		if len(up) > 1 {
			slices.Reverse(down)
			p.area(append(up, down...), s.Style, s.Wide)
		}
		up, down = nil, nil
	}
	for k, x := range s.X {
		if !finite(s.Lower[k]) || !finite(s.Upper[k]) {
			flush()
			continue
		}
		up = append(up, point{b.x.at(x), b.y.at(s.Upper[k])})
		down = append(down, point{b.x.at(x), b.y.at(s.Lower[k])})
	}
	flush()
}

// thickest is the height of a band where it is highest.
func (s *Series) thickest(b *box) float64 {
	most := 0.0
	for k := range s.X {
		if finite(s.Lower[k]) && finite(s.Upper[k]) {
			most = math.Max(most, b.y.at(s.Lower[k])-b.y.at(s.Upper[k]))
		}
	}
	return most
}

func drawLine(p painter, s *Series, b *box) {
	if s.Y == nil {
		return
	}
	var line []point
	flush := func() {
		if len(line) > 1 {
			p.line(line, s.Style)
		}
		line = nil
	}
	for k, x := range s.X {
		if !finite(s.Y[k]) {
			flush()
			continue
		}
		at := point{b.x.at(x), b.y.at(s.Y[k])}
		if !s.Dots {
			line = append(line, at)
			continue
		}
		if s.Lower != nil && finite(s.Lower[k]) && finite(s.Upper[k]) {
			p.bar(point{at.x, b.y.at(s.Lower[k])}, point{at.x, b.y.at(s.Upper[k])}, s.Style)
		}
		p.dot(at, s.Style)
	}
	flush()
}
