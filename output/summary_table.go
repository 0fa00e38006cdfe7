package output

import (
	"fmt"
	"math"

	"cistern/output/stats"
)

// Table returns the tidy table of a finished summary: one row a group, age,
// variable and statistic, the groups in the order of the options and then
// "all", with the columns
//
//	group, age, variable, statistic, level, estimate, standard_error, lower, upper, households
//
// Variables and statistics:
//
//   - income, consumption, assets: mean, sd (divisor n−1), percentile (level in
//     percent, type 7 of Hyndman and Fan), gini (with the factor n/(n−1));
//   - consumption: mean_propensity, the mean marginal propensity to consume;
//   - assets: share_at_limit, the share of households whose borrowing limit binds;
//   - precautionary_assets: mean, the mean of assets less those of the certain
//     twin, and share_of_mean_assets.
//
// lower and upper bound a 95 % interval: order statistics for percentiles,
// Clopper–Pearson for share_at_limit, Student's t on the jackknife error for the
// rest, on the logarithm for sd. (The sd of a heavy tail is the hardest: among
// 400 households with lognormal income, log sd 0.5, its interval holds 93 %.)
// The standard error of a percentile is the width of its interval over
// that of a normal one with error 1. Rows without group or age where the table
// does not tell them apart have "all" and no age; there the years of a household
// are pooled, the jackknife deletes whole households, and the intervals of
// percentiles and shares are widened accordingly. What does not exist for a
// sample (the Gini coefficient where the mean is not positive, a bound beyond
// the extremes, an error from one household) is missing.
//
// Table panics before the last EndPass.
func (s *Summary) Table() *Table {
	s.mustBeDone()
	t := NewTable("summary")
	w := &summaryWriter{
		group:     t.AddString("group", "", "group of households; \"all\" for all groups together"),
		age:       t.AddInt("age", "year", "age of the household"),
		variable:  t.AddString("variable", "", "what is described; money in currency units a year, assets in currency units at the end of the year"),
		statistic: t.AddString("statistic", "", "which figure of the variable's distribution"),
		level:     t.AddFloat("level", "percent", "share of households at or below a percentile"),
		estimate:  t.AddFloat("estimate", "", "the figure, in the unit of the variable; gini and shares are fractions"),
		se:        t.AddFloat("standard_error", "", "Monte Carlo standard error of the estimate"),
		lower:     t.AddFloat("lower", "", "lower end of the 95 % confidence interval"),
		upper:     t.AddFloat("upper", "", "upper end of the 95 % confidence interval"),
		count:     t.AddInt("households", "household", "number of households behind the estimate"),
	}
	var bound float64
	for i := range s.targets {
		tg := &s.targets[i]
		if tg.band >= 0 {
			continue
		}
		if s.rows(i) == 0 {
			continue
		}
		w.target(s, i)
		for v := range variables {
			bound = max(bound, s.results[i*variables+v].giniBound)
		}
	}
	if bound > 0 {
		t.Notes = append(t.Notes, fmt.Sprintf("Gini coefficients come from binned values and are at most %.1g off; their errors, and by how much pooled years widen intervals of percentiles, come from the first %d households.", bound, s.sampled))
	}
	return t
}

func (s *Summary) mustBeDone() {
	if !s.done {
		panic("output: summary is not finished")
	}
}

// summaryWriter appends rows to the columns of the table.
type summaryWriter struct {
	group, age, variable, statistic, level, estimate, se, lower, upper, count *Column

	households int64
	of         *target
	name       string
}

// target appends the rows of one target.
func (w *summaryWriter) target(s *Summary, i int) {
	t := &s.targets[i]
	w.of, w.households, w.name = t, s.households(t), s.groupName(t)
	sums := s.pool(t)
	for v := range variables {
		name := variableNames[v]
		w.row(name, "mean", math.NaN(), sums.mean(v))
		w.row(name, "sd", math.NaN(), sums.sd(v))
		r := &s.results[i*variables+v]
		for k, p := range t.percentiles(&s.o, v) {
			w.row(name, "percentile", p, r.quantiles[k].value)
		}
		w.row(name, "gini", math.NaN(), r.gini)
		if v == consumption && s.seen.propensity {
			w.row(name, "mean_propensity", math.NaN(), sums.meanPropensity())
		}
		if v == assets && s.seen.atLimit {
			w.row(name, "share_at_limit", math.NaN(), sums.shareAtLimit(t.independent()))
		}
	}
	if s.seen.twin {
		w.row("precautionary_assets", "mean", math.NaN(), sums.precautionary())
		w.row("precautionary_assets", "share_of_mean_assets", math.NaN(), sums.precautionaryShare())
	}
}

func (s *Summary) groupName(t *target) string {
	if t.group < 0 {
		return Everyone
	}
	return s.o.Groups[t.group]
}

func (w *summaryWriter) row(variable, statistic string, level float64, e stats.Estimate) {
	w.group.AppendString(w.name)
	if w.of.independent() {
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
