package report

import (
	"fmt"
	"math"
	"slices"
	"strconv"

	"cistern/output"
)

var nan = math.NaN()

// groupName is what a reader sees of a group.
func groupName(g string) string {
	if g == output.Everyone {
		return "all households"
	}
	return g
}

var ageAxis = Axis{Label: "age", Integer: true}

func money(what string, r *Run, yearly bool) Axis {
	unit := r.Currency
	if yearly {
		unit += " a year"
	}
	return Axis{Label: what + " (" + unit + ")", Zero: true}
}

// wealth shows how unequal wealth, consumption and income are at every age.
func wealth(r *Run, s *summary) Section {
	section := Section{ID: "wealth", Title: "Wealth over life"}
	c := Chart{ID: "wealth-by-age", Title: "How far apart households of one age are", Choice: "Variable", X: ageAxis, Y: money("assets", r, false)}
	var bands []string
	for _, v := range []string{"assets", "consumption", "income"} {
		all := s.levelsOf(v, "percentile")
		for _, g := range s.groups {
			view := View{Group: g, Option: v, YLabel: money(v, r, v != "assets").Label}
			for i := range len(all) / 2 { // pairs around the median, the widest first
				low, high := all[i], all[len(all)-1-i]
				if math.Abs(low+high-100) > 1e-9 || low != 5 && low != 10 && low != 25 {
					continue
				}
				if low == 5 && slices.Contains(all, 10) {
					continue
				}
				name := fmt.Sprintf("%s to %s percentile", ordinal(low), ordinal(high))
				view.Series = append(view.Series, s.ranged(g, v, "percentile", low, high).named(name, "", 0))
				if !slices.Contains(bands, name) {
					bands = append(bands, name)
				}
			}
			view.Series = append(view.Series, s.byAge(g, v, "percentile", 50).values().named("median", "median", 0))
			if mean := s.byAge(g, v, "mean", nan); len(mean.X) > 0 {
				view.Series = append(view.Series, mean.values().named("mean", "mean", 1))
			}
			c.Views = append(c.Views, view)
		}
	}
	switch len(bands) {
	case 1:
		c.Caption = "The band reaches from the " + bands[0] + ". "
	case 2:
		c.Caption = "The light band reaches from the " + bands[0] + ", the dark one from the " + bands[1] + ". "
	}
	c.Caption += "Of every age those count who are still alive."
	section.add(c)
	share := Chart{ID: "at-the-limit", Title: "Households at the borrowing limit", X: ageAxis, Y: Axis{Label: "share of households", Share: true, Zero: true},
		Caption: "Those at the limit consume all they have: a change of their income is a change of their consumption. The band is the 95 % interval."}
	for _, g := range s.groups {
		share.Views = append(share.Views, View{Group: g, Series: []Series{s.byAge(g, "assets", "share_at_limit", nan).named("share at the limit", "", 0)}})
	}
	section.add(share)
	return section
}

func ordinal(p float64) string {
	s := strconv.FormatFloat(p, 'f', -1, 64)
	last := s[len(s)-1]
	switch {
	case len(s) > 1 && s[len(s)-2] == '1':
	case last == '1':
		return s + "st"
	case last == '2':
		return s + "nd"
	case last == '3':
		return s + "rd"
	}
	return s + "th"
}

// precaution shows the part of wealth that is held because income is risky.
func precaution(r *Run, s *summary) Section {
	section := Section{ID: "precaution", Title: "Wealth held because income is risky"}
	c := Chart{ID: "precautionary", Title: "Mean wealth, and what it would be with certain income", X: ageAxis, Y: money("mean assets", r, false),
		Caption: "The certain twin of a household has the same mean income, life and death, and no income shocks. The gap is the precautionary part."}
	part := Chart{ID: "precautionary-share", Title: "The precautionary part of mean wealth", X: ageAxis, Y: Axis{Label: "share of mean assets", Share: true, Zero: true},
		Caption: "The band is the 95 % interval; households and their twins meet the same luck, so the difference is known better than either."}
	for _, g := range s.groups {
		mean, gap := s.byAge(g, "assets", "mean", nan), s.byAge(g, "precautionary_assets", "mean", nan)
		if len(gap.X) == 0 || len(mean.X) != len(gap.X) {
			continue
		}
		twin := Series{X: mean.X}
		for i := range mean.Y {
			twin.Y = append(twin.Y, mean.Y[i]-gap.Y[i])
		}
		c.Views = append(c.Views, View{Group: g, Series: []Series{mean.named("with risk", "with risk", 0), twin.named("certain twin", "certain twin", 1)}})
		share := s.byAge(g, "precautionary_assets", "share_of_mean_assets", nan)
		part.Views = append(part.Views, View{Group: g, Series: []Series{share.named("precautionary share", "", 0)}})
	}
	section.add(c)
	section.add(part)
	return section
}

// flows shows mean income and consumption.
func flows(r *Run, s *summary) Section {
	section := Section{ID: "flows", Title: "Income and consumption"}
	c := Chart{ID: "income-and-consumption", Title: "Mean net income and consumption", X: ageAxis, Y: money("mean", r, true),
		Caption: "Where consumption lies below income households save, where it lies above they live on what they saved. Bands are 95 % intervals."}
	spread := Chart{ID: "inequality-by-age", Title: "Inequality within an age", X: ageAxis, Y: Axis{Label: "Gini coefficient", Zero: true},
		Caption: "0 is equality; 1 is all in one hand. Bands are 95 % intervals."}
	for _, g := range s.groups {
		c.Views = append(c.Views, View{Group: g, Series: []Series{
			s.byAge(g, "income", "mean", nan).named("income", "income", 1), s.byAge(g, "consumption", "mean", nan).named("consumption", "consumption", 0)}})
		v := View{Group: g}
		for i, name := range []string{"consumption", "income", "assets"} {
			if line := s.byAge(g, name, "gini", nan); len(line.X) > 0 {
				v.Series = append(v.Series, within(line, 0, 1.2).named(name, name, i))
			}
		}
		spread.Views = append(spread.Views, v)
	}
	section.add(c)
	section.add(spread)
	return section
}

// within drops the points of a line that lie outside a range: a Gini coefficient of
// next to nothing tells nothing.
func within(s Series, low, high float64) Series {
	var out Series
	for i, y := range s.Y {
		if y >= low && y <= high {
			out.X, out.Y = append(out.X, s.X[i]), append(out.Y, y)
			out.Lower, out.Upper = append(out.Lower, s.Lower[i]), append(out.Upper, min(s.Upper[i], high))
		}
	}
	return out
}

// concentration shows the Lorenz curves of the whole population.
func concentration(_ *Run, s *summary) Section {
	section := Section{ID: "concentration", Title: "Who holds how much"}
	c := Chart{ID: "lorenz", Title: "Lorenz curves of the whole population", X: Axis{Label: "poorest share of households", Share: true, Zero: true},
		Y: Axis{Label: "their share of the total", Share: true, Zero: true}, Caption: "The further a curve hangs below the straight line, the more unequal. Each variable is ordered by itself."}
	for _, g := range s.groups {
		t := Table{ID: "concentration-" + slug(g, s.groups), Group: g, Title: "Concentration among " + groupName(g) + " of all ages", Note: "With Monte Carlo standard errors.",
			Head: []string{"variable", "Gini", "top 10 %", "top 1 %", "top 0.1 %", "S80/S20"}, Numbers: []bool{false, true, true, true, true, true}}
		view := View{Group: g, Series: []Series{{Name: "equality", Label: "equality", X: []float64{0, 1}, Y: []float64{0, 1}, Style: 4}}}
		for i, v := range []string{"consumption", "income", "assets"} {
			line := Series{X: []float64{0}, Y: []float64{0}, Lower: []float64{0}, Upper: []float64{0}}
			for _, p := range s.levelsOf(v, "lorenz") {
				if e, ok := s.at(g, everyone, v, "lorenz", p); ok {
					line.X, line.Y = append(line.X, p/100), append(line.Y, e.Value)
					line.Lower, line.Upper = append(line.Lower, e.Lower), append(line.Upper, e.Upper)
				}
			}
			if len(line.X) == 1 {
				continue
			}
			line.X, line.Y = append(line.X, 1), append(line.Y, 1)
			line.Lower, line.Upper = append(line.Lower, 1), append(line.Upper, 1)
			view.Series = append(view.Series, line.named(v, v, i))
			row := []string{v, s.cell(g, everyone, v, "gini", nan, false)}
			for _, top := range []float64{10, 1, 0.1} {
				row = append(row, s.cell(g, everyone, v, "top_share", top, true))
			}
			t.Rows = append(t.Rows, append(row, s.cell(g, everyone, v, "s80_s20", nan, false)))
		}
		if len(view.Series) > 1 {
			c.Views = append(c.Views, view)
		}
		if len(t.Rows) > 0 {
			section.Tables = append(section.Tables, t)
		}
	}
	section.add(c)
	return section
}

// cell writes a figure with its standard error.
func (s *summary) cell(group string, age int, variable, statistic string, level float64, share bool) string {
	e, ok := s.at(group, age, variable, statistic, level)
	if !ok {
		return "–"
	}
	a := Axis{Share: share}
	if !finite(e.StandardError) {
		return a.value(e.Value, nan)
	}
	return a.value(e.Value, e.StandardError) + " ± " + a.value(e.StandardError, e.StandardError)
}

// percentiles tells the percentiles with their intervals, of the whole population
// and at some ages.
func percentiles(r *Run, s *summary) Section {
	section := Section{ID: "percentiles", Title: "Percentiles", Choice: "Age", Words: []string{
		"Under each percentile stands the 95 % interval that the number of simulated households leaves."}}
	variables := []string{"assets", "consumption", "income"}
	levels := s.levelsOf("assets", "percentile")
	for _, g := range s.groups {
		for _, a := range append([]int{everyone}, s.ages...) {
			if a != everyone && a%10 != 0 {
				continue
			}
			t := Table{Title: "Percentiles of " + groupName(g) + ", " + ageOf(a), Group: g, Option: ageOf(a), Head: []string{"percentile", "assets, " + r.Currency}, Numbers: []bool{false, true, true, true}}
			for _, v := range variables[1:] {
				t.Head = append(t.Head, v+", "+r.Currency+" a year")
			}
			for _, p := range levels {
				row, known := []string{ordinal(p)}, false
				for _, v := range variables {
					text := s.ranging(g, a, v, p)
					row, known = append(row, text), known || text != "–"
				}
				if known {
					t.Rows = append(t.Rows, row)
				}
			}
			if len(t.Rows) > 0 {
				t.ID = fmt.Sprintf("percentiles-%s-%d", slug(g, s.groups), a-everyone)
				section.Tables = append(section.Tables, t)
			}
		}
	}
	return section
}

// ranging writes a percentile with its interval below it.
func (s *summary) ranging(group string, age int, variable string, level float64) string {
	e, ok := s.at(group, age, variable, "percentile", level)
	if !ok {
		return "–"
	}
	text := rounded(e.Value, e.StandardError)
	if finite(e.Lower) && finite(e.Upper) {
		text += "\n" + rounded(e.Lower, e.StandardError) + " to " + rounded(e.Upper, e.StandardError)
	}
	return text
}

// ageOf names an age.
func ageOf(a int) string {
	if a == everyone {
		return "all ages"
	}
	return fmt.Sprintf("age %d", a)
}

// slug is a group's name in an id: its place, since a name may be anything.
func slug(g string, groups []string) string { return fmt.Sprint(slices.Index(groups, g)) }

// runway tells for how long households could go on from what they have.
func runway(_ *Run, s *summary) Section {
	section := Section{ID: "runway", Title: "Runway"}
	c := Chart{ID: "runway-below", Title: "Households that could not go on for long without income", X: ageAxis, Y: Axis{Label: "share of households", Share: true, Zero: true},
		Caption: "Runway is assets over monthly consumption: for how many months they would last at the present rate. Bands are 95 % intervals."}
	m := Chart{ID: "runway-median", Title: "Runway of the middle household", X: ageAxis, Y: Axis{Label: "months", Zero: true}, Caption: "The band reaches from the 25th to the 75th percentile."}
	for _, g := range s.groups {
		var v View
		v.Group = g
		for i, months := range s.levelsOf("runway_months", "share_below") {
			label := fmt.Sprintf("under %s months", strconv.FormatFloat(months, 'g', -1, 64))
			if months == 1 {
				label = "under 1 month"
			}
			if line := s.byAge(g, "runway_months", "share_below", months); len(line.X) > 0 {
				v.Series = append(v.Series, line.named(label, label, i))
			}
		}
		c.Views = append(c.Views, v)
		line := s.byAge(g, "runway_months", "percentile", 50).values()
		m.Views = append(m.Views, View{Group: g, Series: []Series{s.ranged(g, "runway_months", "percentile", 25, 75).named("middle half", "", 0), line.named("median", "", 0)}})
	}
	section.add(c)
	section.add(m)
	return section
}

// falls shows how often consumption falls from one year to the next.
func falls(_ *Run, s *summary) Section {
	section := Section{ID: "falls", Title: "When consumption falls"}
	for _, f := range []struct{ id, variable, title, caption string }{
		{"falls-by-age", "consumption_change", "Households whose consumption falls from one year to the next", "By more than so much. Bands are 95 % intervals."},
		{"falls-at-job-loss", "consumption_change_job_loss", "The same among those who lose their job in the year", "The fewer lose it at an age, the wider the 95 % interval."},
	} {
		c := Chart{ID: f.id, Title: f.title, X: ageAxis, Y: Axis{Label: "share of households", Share: true, Zero: true}, Caption: f.caption}
		for _, g := range s.groups {
			v := View{Group: g}
			levels := slices.DeleteFunc(slices.Clone(s.levelsOf(f.variable, "share_below")), func(l float64) bool { return l >= 0 })
			slices.Reverse(levels)
			for i, l := range levels {
				name := "by over " + strconv.FormatFloat(math.Round(-1e4*l)/100, 'g', -1, 64) + " %"
				if line := s.byAge(g, f.variable, "share_below", l); len(line.X) > 0 {
					v.Series = append(v.Series, line.named(name, name, i))
				}
			}
			c.Views = append(c.Views, v)
		}
		section.add(c)
	}
	return section
}

// propensity shows what households do with a little more.
func propensity(_ *Run, s *summary) Section {
	section := Section{ID: "propensity", Title: "What a little more would be spent on"}
	c := Chart{ID: "propensity-by-age", Title: "Marginal propensity to consume by age", X: ageAxis, Y: Axis{Label: "of each extra unit, spent this year", Share: true, Zero: true},
		Caption: "The mean over households of the slope of their consumption rule."}
	f := Chart{ID: "propensity-by-wealth", Title: "Marginal propensity to consume by wealth", X: Axis{Label: "fifth of households by assets, poorest first", Integer: true},
		Y: Axis{Label: "of each extra unit, spent this year", Share: true, Zero: true}, Caption: "Means within fifths of the whole population, with 95 % intervals."}
	for _, g := range s.groups {
		line := s.byAge(g, "propensity", "mean", nan)
		if len(line.X) == 0 {
			line = s.byAge(g, "consumption", "mean_propensity", nan)
		}
		c.Views = append(c.Views, View{Group: g, Series: []Series{line.named("propensity", "", 0)}})
		points := Series{Name: "propensity", Dots: true}
		for _, l := range s.levelsOf("propensity_by_wealth", "mean") {
			if e, ok := s.at(g, everyone, "propensity_by_wealth", "mean", l); ok {
				points.X, points.Y = append(points.X, l), append(points.Y, e.Value)
				points.Lower, points.Upper = append(points.Lower, e.Lower), append(points.Upper, e.Upper)
			}
		}
		f.Views = append(f.Views, View{Group: g, Series: []Series{points}})
	}
	section.add(c)
	section.add(f)
	return section
}
