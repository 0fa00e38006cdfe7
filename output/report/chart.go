package report

import "math"

// Chart is a figure in one or several views, of which the page shows one.
type Chart struct {
	ID      string // letters, digits and hyphens; also the name of its files
	Title   string // what it shows, in a line
	Caption string // how to read it
	X, Y    Axis
	Choice  string // what a reader chooses beside the group, such as "Variable"; empty: nothing
	Views   []View
}

// Axis says what an axis measures.
type Axis struct {
	Label   string // with the unit
	Zero    bool   // the axis includes 0
	Share   bool   // values are fractions, written as per cent
	Integer bool   // ticks stand at whole numbers, such as ages
}

// View is one picture of a chart.
type View struct {
	Group  string // the group it is about; empty: about none
	Option string // the choice it answers
	YLabel string // of the y axis; empty: the chart's
	Series []Series
}

// Series is a line, a band, or both.
type Series struct {
	Name  string
	Label string    // written beside the line; empty: none
	X, Y  []float64 // Y nil: a band alone
	Lower []float64 // of the band or interval; nil: none
	Upper []float64
	Style int  // place among the line styles, from 0
	Wide  bool // the band is a range of households, not an interval of an estimate
	Dots  bool // a dot with an error bar at every X, no line
}

// empty reports whether a view has nothing to show.
func (v *View) empty() bool {
	for i := range v.Series {
		s := &v.Series[i]
		for k := range s.X {
			if s.Y != nil && finite(s.Y[k]) || s.Y == nil && finite(s.Lower[k]) && finite(s.Upper[k]) {
				return false
			}
		}
	}
	return true
}

// dotted reports whether a view has dots alone.
func (v *View) dotted() bool {
	for i := range v.Series {
		if !v.Series[i].Dots {
			return false
		}
	}
	return true
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }

// extent returns the range of all values of a view.
func (v *View) extent() (x0, x1, y0, y1 float64) {
	x0, y0 = math.Inf(1), math.Inf(1)
	x1, y1 = math.Inf(-1), math.Inf(-1)
	for i := range v.Series {
		s := &v.Series[i]
		for k, x := range s.X {
			x0, x1 = math.Min(x0, x), math.Max(x1, x)
			for _, of := range [][]float64{s.Y, s.Lower, s.Upper} {
				if of != nil && finite(of[k]) {
					y0, y1 = math.Min(y0, of[k]), math.Max(y1, of[k])
				}
			}
		}
	}
	return x0, x1, y0, y1
}
