package report

import (
	"bytes"
	"crypto/sha256"
	_ "embed"
	"encoding/base64"
	"errors"
	"fmt"
	"html/template"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"
)

//go:embed page.html
var pageText string

//go:embed page.css
var styleSheet string

//go:embed page.js
var script string

var page = template.Must(template.New("page").Funcs(template.FuncMap{"bound": bound}).Parse(pageText))

// bound keeps a number and its per cent sign on one line.
func bound(s string) string { return strings.ReplaceAll(s, " %", "\u00a0%") }

// MostBytes is the size that a page keeps below: views of the groups named last are
// left out, with a word about it, where there are too many.
const MostBytes = 1_400_000

// Page is what a reader gets.
type Page struct {
	Title    string
	Subtitle string // what the results come from, in a line
	Lead     []string
	Sections []Section
	Caution  string
	Groups   []string // to choose from, the first shown; none: nothing to choose
}

// Write renders the page. It is the same bytes for the same content.
func (p *Page) Write(w io.Writer) error {
	groups := p.Groups
	for {
		text, err := p.render(groups)
		if err != nil {
			return err
		}
		if len(text) <= MostBytes || len(groups) <= 1 {
			if len(text) > MostBytes {
				return fmt.Errorf("report: the page takes %d bytes, more than %d", len(text), MostBytes)
			}
			_, err = w.Write(text)
			return err
		}
		groups = groups[:max(1, min(len(groups)-1, len(groups)*MostBytes/len(text)))]
	}
}

// pageData is what the template is given.
type pageData struct {
	*Page
	Policy   string // Content-Security-Policy
	Style    template.CSS
	Script   template.JS
	Groups   []groupChoice
	Left     int // groups left out
	Sections []sectionData
	Data     []chartData
}

type groupChoice struct{ Name, Shown string }

type sectionData struct {
	Section
	Charts  []chartData
	Tables  []tableData
	Options []string // of its tables
}

// tableData is a table of a section, hidden where the page first shows another.
type tableData struct {
	Table
	Hidden bool
}

// chartData is a chart as the page and its script see it.
type chartData struct {
	Chart   `json:"-"`
	ID      string     `json:"id"`
	X       axisData   `json:"x"`
	Y       axisData   `json:"y"`
	Views   []viewData `json:"views"`
	Options []string   `json:"-"`
	Table   Table      `json:"-"` // of the first view
}

type axisData struct {
	Label string `json:"label"`
	Share bool   `json:"share,omitempty"`
}

type viewData struct {
	Group  string        `json:"group"`
	Option string        `json:"option"`
	Box    [8]float64    `json:"box"` // x: low, high, from, to; y: the same
	Series []seriesData  `json:"series"`
	SVG    template.HTML `json:"-"`
	First  bool          `json:"-"`
}

type seriesData struct {
	Name  string  `json:"name"`
	X     numbers `json:"x,omitempty"` // left out where it is that of the first series
	Y     numbers `json:"y,omitempty"`
	Lower numbers `json:"lower,omitempty"`
	Upper numbers `json:"upper,omitempty"`
	Wide  bool    `json:"wide,omitempty"`
	Style int     `json:"style"`
}

// numbers are written with nine digits, what is no number as null.
type numbers []float64

// MarshalJSON implements json.Marshaler.
func (n numbers) MarshalJSON() ([]byte, error) {
	var b strings.Builder
	b.WriteByte('[')
	for i, x := range n {
		if i > 0 {
			b.WriteByte(',')
		}
		if finite(x) {
			b.WriteString(strconv.FormatFloat(x, 'g', 9, 64))
		} else {
			b.WriteString("null")
		}
	}
	b.WriteByte(']')
	return []byte(b.String()), nil
}

func (p *Page) render(groups []string) ([]byte, error) {
	if err := p.check(); err != nil {
		return nil, err
	}
	d := pageData{Page: p, Style: template.CSS(styleSheet), Script: template.JS(script), Left: len(p.Groups) - len(groups)}
	d.Policy = fmt.Sprintf("default-src 'none'; style-src 'sha256-%s'; script-src 'sha256-%s'; base-uri 'none'; form-action 'none'", digest(styleSheet), digest(script))
	for _, g := range groups {
		d.Groups = append(d.Groups, groupChoice{g, groupName(g)})
	}
	for _, s := range p.Sections {
		section := sectionData{Section: s}
		for _, t := range s.Tables {
			if t.Group != "" && !slices.Contains(groups, t.Group) {
				continue
			}
			if t.Option != "" && !slices.Contains(section.Options, t.Option) {
				section.Options = append(section.Options, t.Option)
			}
			section.Tables = append(section.Tables, tableData{t, t.Option != "" && t.Option != section.Options[0]})
		}
		for i := range s.Charts {
			c := newChartData(&s.Charts[i], groups)
			if len(c.Views) > 0 {
				section.Charts = append(section.Charts, c)
				d.Data = append(d.Data, c)
			}
		}
		d.Sections = append(d.Sections, section)
	}
	var b bytes.Buffer
	err := page.Execute(&b, d)
	return b.Bytes(), err
}

// check sees to it that ids are what they must be: they are used as they are.
func (p *Page) check() error {
	seen := map[string]bool{}
	var errs []error
	id := func(s string) {
		if s == "" || strings.Trim(s, "abcdefghijklmnopqrstuvwxyz0123456789-") != "" || seen[s] {
			errs = append(errs, fmt.Errorf("report: id %q: want small letters, digits and hyphens, each once", s))
		}
		seen[s] = true
	}
	for _, s := range p.Sections {
		id(s.ID)
		for _, c := range s.Charts {
			id(c.ID)
		}
		for _, t := range s.Tables {
			id(t.ID)
			for _, row := range t.Rows {
				if len(row) != len(t.Head) || len(t.Numbers) != len(t.Head) {
					errs = append(errs, fmt.Errorf("report: table %s: rows, heads and alignments differ in number", t.ID))
					break
				}
			}
		}
	}
	return errors.Join(errs...)
}

func digest(s string) string {
	h := sha256.Sum256([]byte(s))
	return base64.StdEncoding.EncodeToString(h[:])
}

func newChartData(c *Chart, groups []string) chartData {
	d := chartData{Chart: *c, ID: c.ID, X: axisData{c.X.Label, c.X.Share}, Y: axisData{c.Y.Label, c.Y.Share}}
	for i := range c.Views {
		v := &c.Views[i]
		if v.Group != "" && !slices.Contains(groups, v.Group) {
			continue
		}
		if v.Option != "" && !slices.Contains(d.Options, v.Option) {
			d.Options = append(d.Options, v.Option)
		}
		if len(d.Views) == 0 {
			d.Table = viewTable(c, v)
		}
		element, b := markup(c, v)
		view := viewData{Group: v.Group, Option: v.Option, SVG: template.HTML(element), First: len(d.Views) == 0,
			Box: [8]float64{b.x.low, b.x.high, b.x.from, b.x.to, b.y.low, b.y.high, b.y.from, b.y.to}}
		for _, s := range v.Series {
			data := seriesData{s.Name, s.X, s.Y, s.Lower, s.Upper, s.Wide, s.Style % styles}
			if len(view.Series) > 0 && slices.Equal(s.X, v.Series[0].X) {
				data.X = nil
			}
			view.Series = append(view.Series, data)
		}
		d.Views = append(d.Views, view)
	}
	return d
}

// viewTable is the table behind a view: a row an X, columns by series.
func viewTable(c *Chart, v *View) Table {
	t := Table{ID: c.ID + "-table", Title: c.Title, Head: []string{c.X.Label}, Numbers: []bool{true}}
	var xs []float64
	for i := range v.Series {
		s := &v.Series[i]
		for _, x := range s.X {
			if !slices.Contains(xs, x) {
				xs = append(xs, x)
			}
		}
		t.Head = append(t.Head, s.columns()...)
	}
	slices.Sort(xs)
	for range len(t.Head) - 1 {
		t.Numbers = append(t.Numbers, true)
	}
	for _, x := range xs {
		row := []string{c.X.value(x, math.NaN())}
		if c.X.Integer {
			row[0] = decimals(x, 0)
		}
		for i := range v.Series {
			row = append(row, v.Series[i].cells(x, c.Y)...)
		}
		t.Rows = append(t.Rows, row)
	}
	return t
}

// columns are the heads of a series in a table.
func (s *Series) columns() []string {
	switch {
	case s.Y == nil:
		return []string{s.Name + ", from", s.Name + ", to"}
	case s.Lower == nil:
		return []string{s.Name}
	}
	return []string{s.Name, s.Name + ", 95 % from", s.Name + ", to"}
}

func (s *Series) cells(x float64, a Axis) []string {
	k := slices.Index(s.X, x)
	at := func(of []float64) string {
		if k < 0 {
			return "–"
		}
		return a.value(of[k], math.NaN())
	}
	switch {
	case s.Y == nil:
		return []string{at(s.Lower), at(s.Upper)}
	case s.Lower == nil:
		return []string{at(s.Y)}
	}
	return []string{at(s.Y), at(s.Lower), at(s.Upper)}
}
