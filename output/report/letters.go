package report

import (
	"fmt"
	"maps"
	"slices"
	"strings"

	"golang.org/x/image/font/sfnt"
	"golang.org/x/image/math/fixed"
)

// letters are the outlines that the texts of a picture are set in.
type letters struct {
	used   map[sfnt.GlyphIndex]string
	buffer sfnt.Buffer
}

func newLetters() *letters { return &letters{used: map[sfnt.GlyphIndex]string{}} }

// set writes a text as references to outlines.
func (l *letters) set(p point, a anchor, text string) string {
	f := (*sfnt.Font)(typeface().Face)
	var at []float64
	var glyphs []sfnt.GlyphIndex
	x := 0.0
	for _, r := range text {
		g, err := f.GlyphIndex(&l.buffer, r)
		if err != nil {
			g = 0 // the outline of what the type has not
		}
		at, glyphs = append(at, x), append(glyphs, g)
		if step, err := f.GlyphAdvance(&l.buffer, g, fixed.I(textSize), 0); err == nil {
			x += float64(step) / 64
		}
		if _, ok := l.used[g]; !ok {
			l.used[g] = l.outline(f, g)
		}
	}
	left := p.x - x*[]float64{0, 0.5, 1}[a]
	var b strings.Builder
	for i, g := range glyphs {
		if l.used[g] != "" {
			fmt.Fprintf(&b, `<use xlink:href="#g%d" x="%s" y="%s"/>`, g, number(left+at[i]), number(p.y))
		}
	}
	return b.String()
}

// outline is the path of a letter; empty for a space.
func (l *letters) outline(f *sfnt.Font, g sfnt.GlyphIndex) string {
	segments, err := f.LoadGlyph(&l.buffer, g, fixed.I(textSize), nil)
	if err != nil {
		return ""
	}
	var b strings.Builder
	for _, s := range segments {
		op, n := "M", 1
		switch s.Op {
		case sfnt.SegmentOpLineTo:
			op = "L"
		case sfnt.SegmentOpQuadTo:
			op, n = "Q", 2
		case sfnt.SegmentOpCubeTo:
			op, n = "C", 3
		}
		b.WriteString(op)
		for i, q := range s.Args[:n] {
			if i > 0 {
				b.WriteByte(' ')
			}
			fmt.Fprintf(&b, "%.4g %.4g", float64(q.X)/64, float64(q.Y)/64)
		}
	}
	return b.String()
}

// outlines defines the letters that were used.
func (l *letters) outlines() string {
	var b strings.Builder
	for _, g := range slices.Sorted(maps.Keys(l.used)) {
		if d := l.used[g]; d != "" {
			fmt.Fprintf(&b, `<path id="g%d" d="%s"/>`, g, d)
		}
	}
	return b.String()
}
