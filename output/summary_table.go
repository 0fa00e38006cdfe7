package output

import (
	"fmt"
	"math"
	"slices"

	"cistern/output/distribution"
	"cistern/output/stats"
)

// Table returns the tidy table of a finished summary: one row a group, age,
// variable and statistic, the groups in the order of the options and then
// "all", with the columns
//
//	group, age, variable, statistic, level, estimate, standard_error, lower, upper, households
//
// Rows without an age take all ages together: the population of all ages at a
// moment, ages weighed by survival, which the panel has of itself, and by the growth
// of births. Without groups to tell apart every row has "all".
//
// Variables and statistics:
//
//   - income, consumption, assets: mean, sd (divisor n−1), percentile (level in
//     percent, type 7 of Hyndman and Fan; the least value that the share reaches
//     where ages weigh differently), gini (with the factor n/(n−1)),
//     share_nonpositive (at or below zero);
//   - the same for everybody at an age and for all ages of a group: lorenz (what share of
//     the total the poorest level percent have), top_share (the richest level
//     percent), s80_s20 (what the richest fifth have over what the poorest have),
//     expected_shortfall (mean of the lowest level percent), hill (index of the
//     Pareto tail from the highest level percent; households says from how many);
//   - propensity, the marginal propensity to consume, to the nearest 2^-30: mean (also
//     as consumption, mean_propensity), sd, percentile;
//   - propensity_by_wealth: mean, within each fifth of assets (level, 1 the poorest;
//     households with equal assets are in one), for everybody at an age and for all ages;
//   - assets: share_at_limit, the share of households whose borrowing limit binds;
//   - precautionary_assets: mean, the mean of assets less those of the certain
//     twin, and share_of_mean_assets;
//   - wealth_to_income, assets over net income of those who have income: percentile,
//     and ratio_of_means, mean assets over mean income, of all;
//   - runway_months, for how many months assets pay for consumption, and
//     runway_income_months, for how many they stand in for net income: percentile,
//     share_below (level in months). Both are 0 without assets. With assets there is no
//     runway where consumption is not positive (which exponential and quadratic utility
//     allow), and no runway_income_months without income at all;
//   - consumption_change, by what fraction consumption changes from last year's, of
//     those who consumed a positive amount then and are not in their first year, to the
//     nearest 2^-30, and consumption_change_job_loss, of those who lose their earnings
//     this year: mean, sd, percentile, share_below (level −0.1: it falls by more than
//     10 %).
//
// A ratio beyond 10^12 counts as having no denominator. Of variables that not every
// household has, households counts those that do, and with fewer than 20 there are
// no rows.
//
// lower and upper bound a 95 % interval: order statistics for percentiles,
// Clopper–Pearson for shares of households, Student's t on the jackknife error for
// the rest, on the logarithm for sd. (The sd of a heavy tail is the hardest: among
// 400 households with lognormal income, log sd 0.5, its interval holds 93 %.)
// The standard error of a percentile is the width of its interval over
// that of a normal one with error 1. Where ages are taken together the years of a
// household are pooled, the jackknife deletes whole households, and the intervals
// of percentiles and shares are widened accordingly. What does not exist for a
// sample (the Gini coefficient where the mean is not positive, a bound beyond
// the extremes, an error from one household) is missing. A share of fewer than 20
// rows is not described on its own.
//
// Table panics before the last EndPass.
func (s *Summary) Table() *Table {
	s.mustBeDone()
	t := NewTable("summary")
	w := &summaryWriter{
		group:     t.AddString("group", "", "group of households; \"all\" for all groups together"),
		age:       t.AddInt("age", "year", "age of the household; missing for all ages together, as they are at a moment"),
		variable:  t.AddString("variable", "", "what is described; money in currency units a year, assets in currency units at the end of the year, runway in months, changes as fractions"),
		statistic: t.AddString("statistic", "", "which figure of the variable's distribution"),
		level:     t.AddFloat("level", "", "percent of households that the figure is about: at or below a percentile, the poorest (lorenz), the richest (top_share, hill), the lowest (expected_shortfall); of share_below the threshold, in months (runway) or as a fraction (change of consumption); of propensity_by_wealth the fifth of assets, 1 the poorest"),
		estimate:  t.AddFloat("estimate", "", "the figure, in the unit of the variable; gini, lorenz and shares are fractions, ratios and hill pure numbers"),
		se:        t.AddFloat("standard_error", "", "Monte Carlo standard error of the estimate"),
		lower:     t.AddFloat("lower", "", "lower end of the 95 % confidence interval"),
		upper:     t.AddFloat("upper", "", "upper end of the 95 % confidence interval"),
		count:     t.AddInt("households", "household", "number of households behind the estimate"),
	}
	for i := range s.targets {
		if s.targets[i].band < 0 {
			w.target(s, i)
		}
	}
	t.Notes = append(t.Notes, s.notes(w.bound)...)
	return t
}

// notes says what a reader of the table must know of this run.
func (s *Summary) notes(bound float64) []string {
	var notes []string
	if len(s.o.Lorenz)+len(s.o.TopShares)+len(s.o.Shortfalls) > 0 || s.o.Tail > 0 {
		notes = append(notes, fmt.Sprintf("Lorenz ordinates, top shares, s80_s20, expected shortfalls and tail indices are left out where the share they are about has fewer than %d rows, and at single ages of single groups.", leastRows))
	}
	if s.o.Growth != 0 {
		notes = append(notes, fmt.Sprintf("Where ages are taken together, a household of age a weighs (1 + %v)^-(a - %d): births grow by that much a year.", s.o.Growth, s.o.FirstAge))
	}
	if bound > 0 {
		notes = append(notes, fmt.Sprintf("Gini coefficients come from binned values and are at most %.1g off; their errors, and by how much pooled years widen intervals of percentiles, come from a sample of %d household-years.", bound, s.study.Sampled()))
	}
	return notes
}

// variable returns the place of a variable, −1 if it is not there.
func (s *Summary) variable(key string) int {
	return slices.IndexFunc(s.variables, func(v summaryVariable) bool { return v.key == key })
}

func (s *Summary) mustBeDone() {
	if !s.done {
		panic("output: summary is not finished")
	}
}

func (s *Summary) groupName(t *target) string {
	if t.group < 0 {
		return Everyone
	}
	return s.o.Groups[t.group]
}

// noLevel is the level of a statistic that has none.
var noLevel = math.NaN()

// leastRows is how many rows a share must have to be described on its own.
const leastRows = 20

// summaryWriter appends rows to the columns of the table.
type summaryWriter struct {
	group, age, variable, statistic, level, estimate, se, lower, upper, count *Column

	households int64
	of         *target
	name       string
	bound      float64 // of all Gini coefficients so far
}

// target appends the rows of one target.
func (w *summaryWriter) target(s *Summary, i int) {
	t := &s.targets[i]
	r := s.study.Target(i)
	if r.Rows() == 0 {
		return
	}
	w.of, w.households, w.name = t, s.households(t), s.groupName(t)
	for v := range s.variables {
		w.distribution(s, t, r, v)
	}
	w.byWealth(s, t, r)
	for _, q := range summaryRatios {
		if of, by := s.variable(q.of), s.variable(q.by); of >= 0 && by >= 0 {
			w.row(q.name, q.statistic, noLevel, r.Ratio(of, by))
		}
	}
}

// byWealth appends the mean propensity to consume in every class of assets.
func (w *summaryWriter) byWealth(s *Summary, t *target, r *distribution.Result) {
	assets, propensity := s.variable("assets"), s.variable("propensity")
	if propensity < 0 || t.wants(&s.variables[assets])&distribution.Classes == 0 || r.Values(assets) < wealthClasses*leastRows {
		return
	}
	all := w.households
	for class := range wealthClasses {
		if w.households = min(all, r.RowsIn(assets, class)); w.households > 0 {
			w.row("propensity_by_wealth", "mean", float64(class+1), r.MeanIn(assets, class, 0))
		}
	}
	w.households = all
}

// distribution appends what the target wants of a variable.
func (w *summaryWriter) distribution(s *Summary, t *target, r *distribution.Result, v int) {
	of := &s.variables[v]
	row := func(statistic string, level float64, e stats.Estimate) { w.row(of.name, statistic, level, e) }
	if of.flags != nil {
		row(of.mean, noLevel, r.Proportion(v))
		return
	}
	if of.gaps {
		if r.Values(v) < leastRows {
			return
		}
		all := w.households
		w.households = min(all, r.Values(v))
		defer func() { w.households = all }()
	}
	if of.mean != "" {
		row(of.mean, noLevel, r.Mean(v))
	}
	if of.repeats[0] != "" {
		w.row(of.repeats[0], of.repeats[1], noLevel, r.Mean(v))
	}
	wants := t.wants(of)
	if wants&distribution.Percentiles != 0 {
		if of.mean != "" {
			row("sd", noLevel, r.SD(v))
		}
		for k, p := range s.o.Percentiles {
			row("percentile", p, r.Percentile(v, k))
		}
	}
	if of.also != nil {
		row = func(statistic string, level float64, e stats.Estimate) { w.row(of.also.name, statistic, level, e) }
		for k, p := range s.o.Percentiles {
			if wants&distribution.Percentiles != 0 {
				row("percentile", p, of.also.estimate(r.Percentile(v, k)))
			}
		}
	}
	if wants&distribution.Gini != 0 {
		row("gini", noLevel, r.Gini(v))
		w.bound = max(w.bound, r.GiniBound(v))
	}
	if of.shares != nil {
		for k, share := range of.shares(&s.o) {
			row(share.statistic, share.level, r.Share(v, k))
		}
	}
	enough := func(percent float64) bool { return float64(r.Values(v))*percent/100 >= leastRows }
	if wants&distribution.Concentration != 0 {
		for k, p := range s.o.Lorenz {
			if enough(min(p, 100-p)) {
				row("lorenz", p, r.Lorenz(v, k))
			}
		}
		for k, p := range s.o.TopShares {
			if enough(p) {
				row("top_share", p, r.TopShare(v, k))
			}
		}
		if enough(20) {
			row("s80_s20", noLevel, r.QuintileRatio(v))
		}
	}
	if wants&distribution.Shortfall != 0 {
		for k, p := range s.o.Shortfalls {
			if enough(p) {
				row("expected_shortfall", p, r.Shortfall(v, k))
			}
		}
	}
	if wants&distribution.Tail != 0 && s.o.Tail > 0 && enough(s.o.Tail) {
		alpha, rows := r.Hill(v, 0)
		households := w.households
		w.households = rows
		row("hill", s.o.Tail, alpha)
		w.households = households
	}
}

// estimate is the image of a percentile.
func (i *summaryImage) estimate(e stats.Estimate) stats.Estimate {
	e.Value, e.Lower, e.Upper = i.of(e.Value), i.of(e.Lower), i.of(e.Upper)
	e.StandardError = (e.Upper - e.Lower) / (2 * normalHalfWidth)
	return e
}

// normalHalfWidth is half the width of a 95 % interval of the normal distribution in
// standard errors.
const normalHalfWidth = 1.959963984540054

func (w *summaryWriter) row(variable, statistic string, level float64, e stats.Estimate) {
	w.group.AppendString(w.name)
	if !w.of.whole {
		w.age.AppendInt(int64(w.of.first))
	} else {
		w.age.AppendMissing()
	}
	w.variable.AppendString(variable)
	w.statistic.AppendString(statistic)
	appendKnown(w.level, level)
	appendKnown(w.estimate, e.Value)
	appendKnown(w.se, e.StandardError)
	appendKnown(w.lower, e.Lower)
	appendKnown(w.upper, e.Upper)
	w.count.AppendInt(w.households)
}

// appendKnown adds a value, or its absence where it is NaN.
func appendKnown(c *Column, v float64) {
	if math.IsNaN(v) {
		c.AppendMissing()
	} else {
		c.AppendFloat(v)
	}
}
