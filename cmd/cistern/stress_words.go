package main

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"cistern/configs"
	"cistern/output"
	"cistern/output/contrast"
	"cistern/output/stats"
	"cistern/sim/stress"
)

// show prints the answer in words, the table by year, where the files are and how
// far to trust them.
func (r *stressRun) show() error {
	words := title(r.sc, r.st) + "\n"
	for _, a := range r.answers.all() {
		words += "\n" + a.who + ":\n  " + strings.Join(a.lines, "\n  ") + "\n"
	}
	if r.g.format == "table" {
		if _, err := fmt.Fprintln(r.g.stdout, words); err != nil {
			return err
		}
	}
	if err := r.g.render(r.yearTable()); err != nil {
		return err
	}
	say := r.g.say
	say("")
	if r.g.format != "table" {
		say("%s", words)
	}
	say("%d households entering life over %d years; intervals are 95 %% Monte Carlo intervals, of differences paired", r.result.Households, stress.NewEntries(r.st.Window, r.sc.LastAge-r.sc.FirstAge+1).Cohorts)
	say("files:    %s", r.folder.Dir())
	for _, w := range r.warnings {
		say("warning:  %s", w)
	}
	say("%s", caution)
	return nil
}

// answers are what a risk team asks of a stress, in words.
type answers struct {
	st      *configs.Stress
	groups  []string // of the scenario
	figures map[contrast.Key]stats.Estimate
}

func newAnswers(sc *configs.Scenario, st *configs.Stress, figures []contrast.Figure) *answers {
	a := &answers{st: st, figures: map[contrast.Key]stats.Estimate{}}
	for _, g := range sc.Groups {
		a.groups = append(a.groups, g.Name)
	}
	for _, f := range figures {
		a.figures[f.Key] = f.Estimate
	}
	return a
}

// figure returns a figure of all ages.
func (a *answers) figure(year int, world, group, variable, statistic string, level float64) stats.Estimate {
	e, ok := a.figures[contrast.Key{Year: year, World: world, Group: group, Ages: output.Everyone, Variable: variable, Statistic: statistic, Level: level}]
	if !ok {
		return stats.Estimate{Value: math.NaN(), StandardError: math.NaN(), Lower: math.NaN(), Upper: math.NaN()}
	}
	return e
}

// answer is what is said of some households.
type answer struct {
	who   string
	lines []string
}

// all answers for everybody, and for the groups that are hit where not all are.
func (a *answers) all() []answer {
	groups := []string{output.Everyone}
	if slices.Contains(a.st.Event.Groups, false) {
		for g, name := range a.groups {
			if a.st.Event.Groups[g] {
				groups = append(groups, name)
			}
		}
	}
	var list []answer
	for _, g := range groups {
		who := "All households"
		if g != output.Everyone {
			who = "Group " + g
		}
		list = append(list, answer{who, []string{a.dry(g), a.runway(g), a.consumption(g), a.recovery(g)}})
	}
	return list
}

// worst returns the year from the event's on in which a difference is worst: highest,
// or lowest if less is worse.
func (a *answers) worst(group, variable, statistic string, level float64, less bool) (year int, usual, event, gap stats.Estimate) {
	for y := 0; y <= a.st.Window.After; y++ {
		d := a.figure(y, contrast.Difference, group, variable, statistic, level)
		if y == 0 || less && d.Value < gap.Value || !less && d.Value > gap.Value {
			year, gap = y, d
		}
	}
	return year, a.figure(year, contrast.Baseline, group, variable, statistic, level), a.figure(year, contrast.Stress, group, variable, statistic, level), gap
}

func (a *answers) dry(group string) string {
	year, usual, event, gap := a.worst(group, "dry", "share", 0, false)
	last := a.st.Window.After
	newly := a.figure(last, contrast.Stress, group, "newly_dry", "share_so_far", 0)
	return fmt.Sprintf("Run dry: %s than in the baseline in %s: %s against %s. By year %d, %s (%s) have run dry in a year in which they would not have. (Dry: less than %s left to spend.)",
		points(gap), yearName(year), percent(event.Value), percent(usual.Value), last, percent(newly.Value), interval(newly, 100), plural(a.st.DryMonths, "month's consumption", "months' consumption"))
}

func (a *answers) runway(group string) string {
	s := "Runway:"
	if slices.Contains(a.st.Percentiles, 50) {
		year, usual, event, gap := a.worst(group, "runway_months", "percentile", 50, true)
		s += fmt.Sprintf(" %s months of consumption for the median household in %s, against %s: %s months %s (%s).",
			digits(event.Value), yearName(year), digits(usual.Value), digits(math.Abs(gap.Value)), which(gap.Value, "less", "more"), interval(upward(gap), 1))
	}
	months := a.st.RunwayMonths[len(a.st.RunwayMonths)/2]
	year, usual, event, gap := a.worst(group, "runway_months", "share_below", months, false)
	return s + fmt.Sprintf(" Under %s: %s in %s: %s against %s.", plural(months, "month", "months"), points(gap), yearName(year), percent(event.Value), percent(usual.Value))
}

func (a *answers) consumption(group string) string {
	year, usual, _, gap := a.worst(group, "consumption", "mean", 0, true)
	u := 100 / math.Abs(usual.Value)
	s := fmt.Sprintf("Consumption: its mean is %s %% %s in %s (%s)", digits(u*math.Abs(gap.Value)), which(gap.Value, "lower", "higher"), yearName(year), interval(upward(gap), u))
	for _, q := range a.st.Worst {
		y, _, _, e := a.worst(group, "relative_shortfall", "expected_shortfall", q, false)
		if e.Value > 0 {
			s += fmt.Sprintf("; the worst hit %g %% consume %s less than usual in %s (%s)", q, percent(e.Value), yearName(y), interval(e, 100))
		}
	}
	return s + "."
}

func (a *answers) recovery(group string) string {
	level := 100 * a.st.Within
	when := func(variable, statistic string) string {
		e := a.figure(contrast.NoYear, contrast.Difference, group, variable, statistic, level)
		switch {
		case math.IsNaN(e.Value):
			return fmt.Sprintf("not within %d years", a.st.Window.After)
		case e.Value == 0:
			return "never off by more"
		case math.IsNaN(e.Upper):
			return fmt.Sprintf("from year %g on (95 %%: %g or later)", e.Value, e.Lower)
		}
		return fmt.Sprintf("from year %g on (95 %%: %g to %g)", e.Value, e.Lower, e.Upper)
	}
	affected := a.figure(contrast.NoYear, contrast.Difference, group, "assets", "share_affected", level)
	s := fmt.Sprintf("Recovery: within %g %% of the baseline, mean consumption %s, mean assets %s", level, when("consumption", "years_to_recover_mean"), when("assets", "years_to_recover_mean"))
	if !(affected.Value > 0) {
		return s + "; nobody's own assets were off by more."
	}
	s += fmt.Sprintf(". %s of households' own assets were off by more; ", percent(affected.Value))
	if half := a.figure(contrast.NoYear, contrast.Difference, group, "assets", "household_years_to_recover_median", level); !math.IsNaN(half.Value) {
		return s + fmt.Sprintf("half of these are back by year %g.", half.Value)
	}
	return s + fmt.Sprintf("less than half of these are back within %d years.", a.st.Window.After)
}

func yearName(year int) string {
	if year == 0 {
		return "the event's year"
	}
	return fmt.Sprintf("year %d", year)
}

func plural(x float64, one, many string) string {
	if x == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%g %s", x, many)
}

// which chooses by the sign of a difference.
func which(x float64, below, above string) string {
	if x < 0 {
		return below
	}
	return above
}

// upward turns a fall into a rise, so that words say which it is.
func upward(e stats.Estimate) stats.Estimate {
	if e.Value < 0 {
		e.Value, e.Lower, e.Upper = -e.Value, 0-e.Upper, 0-e.Lower
	}
	return e
}

// digits writes three significant digits.
func digits(x float64) string {
	if x == 0 || math.IsNaN(x) || math.IsInf(x, 0) {
		return fmt.Sprint(x)
	}
	return fmt.Sprintf("%.*f", max(0, 2-int(math.Floor(math.Log10(math.Abs(x))))), x)
}

func percent(x float64) string { return digits(100*x) + " %" }

// interval says the ends of an interval in another unit.
func interval(e stats.Estimate, unit float64) string {
	return fmt.Sprintf("95 %%: %s to %s", digits(unit*e.Lower), digits(unit*e.Upper))
}

// points says a difference of shares in percentage points.
func points(e stats.Estimate) string {
	return fmt.Sprintf("%s percentage points %s (%s)", digits(100*math.Abs(e.Value)), which(e.Value, "fewer", "more"), interval(upward(e), 100))
}

// yearTable is what is printed, year by year, of all households.
func (r *stressRun) yearTable() *output.Table {
	t := output.NewTable("stress by year")
	year := t.AddInt("year", "year", "calendar year counted from the event's")
	type column struct {
		c                          *output.Column
		world, variable, statistic string
		level                      float64
		se                         bool
	}
	var columns []column
	add := func(name, unit, meaning, world, variable, statistic string, level float64, se bool) {
		c := t.AddFloat(name, unit, meaning)
		if c.Digits = 5; unit == "fraction" || unit == "month" || se {
			c.Digits = 3
		}
		columns = append(columns, column{c, world, variable, statistic, level, se})
	}
	money := r.sc.Currency
	add("dry", "fraction", "share of households that are dry in the baseline", contrast.Baseline, "dry", "share", 0, false)
	add("dry_stress", "fraction", "the same under the stress", contrast.Stress, "dry", "share", 0, false)
	add("dry_error", "fraction", "Monte Carlo standard error of the difference, paired", contrast.Difference, "dry", "share", 0, true)
	if slices.Contains(r.st.Percentiles, 50) {
		add("runway", "month", "median of the months of consumption that assets last, baseline", contrast.Baseline, "runway_months", "percentile", 50, false)
		add("runway_stress", "month", "the same under the stress", contrast.Stress, "runway_months", "percentile", 50, false)
		add("runway_error", "month", "Monte Carlo standard error of the difference, paired", contrast.Difference, "runway_months", "percentile", 50, true)
	}
	add("consumption", money+" a year", "mean consumption in the baseline", contrast.Baseline, "consumption", "mean", 0, false)
	add("consumption_change", money+" a year", "difference under the stress", contrast.Difference, "consumption", "mean", 0, false)
	add("consumption_error", money+" a year", "its Monte Carlo standard error, paired", contrast.Difference, "consumption", "mean", 0, true)
	add("assets", money, "mean assets at the end of the year in the baseline", contrast.Baseline, "assets", "mean", 0, false)
	add("assets_change", money, "difference under the stress", contrast.Difference, "assets", "mean", 0, false)
	add("assets_error", money, "its Monte Carlo standard error, paired", contrast.Difference, "assets", "mean", 0, true)
	for y := -r.st.Window.Before; y <= r.st.Window.After; y++ {
		year.AppendInt(int64(y))
		for _, c := range columns {
			e := r.answers.figure(y, c.world, output.Everyone, c.variable, c.statistic, c.level)
			x := e.Value
			if c.se {
				x = e.StandardError
			}
			if math.IsNaN(x) {
				c.c.AppendMissing()
			} else {
				c.c.AppendFloat(x)
			}
		}
	}
	return t
}
