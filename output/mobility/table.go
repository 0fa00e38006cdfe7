package mobility

import (
	"math"

	"cistern/output"
	"cistern/output/stats"
)

// Table returns what finished studies found as a tidy table: one row a pair of
// ages, group and figure, the groups in their order and then "all", with the columns
//
//	group, from_age, to_age, quantiles, from_quantile, to_quantile, statistic,
//	estimate, standard_error, lower, upper, households
//
// Statistics are probability, of being in to_quantile at to_age for a household in
// from_quantile at from_age, and shorrocks, the index of the whole matrix. lower and
// upper bound a 95 % interval: Student's t on the jackknife error for the index,
// Clopper–Pearson with the number of households that the error implies for
// probabilities. What no household shows is missing.
func Table(studies []*Study) *output.Table {
	t := output.NewTable("mobility")
	group := t.AddString("group", "", "group of households; \"all\" for all groups together")
	from := t.AddInt("from_age", "year", "first age")
	to := t.AddInt("to_age", "year", "second age")
	quantiles := t.AddInt("quantiles", "", "number of quantile classes of assets; classes are those of the group, among households alive at both ages")
	fromClass := t.AddInt("from_quantile", "", "class at the end of the year at from_age, 1 the poorest; households with equal assets are in one class")
	toClass := t.AddInt("to_quantile", "", "class at the end of the year at to_age")
	statistic := t.AddString("statistic", "", "probability of to_quantile given from_quantile; shorrocks: (classes − trace)/(classes − 1) of the matrix, 0 where nobody moves, 1 where the second class does not depend on the first")
	estimate := t.AddFloat("estimate", "fraction", "the figure")
	se := t.AddFloat("standard_error", "fraction", "Monte Carlo standard error of the estimate")
	lower := t.AddFloat("lower", "fraction", "lower end of the 95 % confidence interval")
	upper := t.AddFloat("upper", "fraction", "upper end of the 95 % confidence interval")
	count := t.AddInt("households", "household", "households behind the estimate: those in from_quantile, or all")
	for _, s := range studies {
		for i, m := range s.Matrices() {
			if m.Households == 0 {
				continue
			}
			name := output.Everyone
			if i < len(s.o.Groups) {
				name = s.o.Groups[i]
			}
			row := func(what string, e stats.Estimate, households int64) {
				group.AppendString(name)
				from.AppendInt(int64(s.o.FromAge))
				to.AppendInt(int64(s.o.ToAge))
				quantiles.AppendInt(int64(s.o.Quantiles))
				statistic.AppendString(what)
				known(estimate, e.Value)
				known(se, e.StandardError)
				known(lower, e.Lower)
				known(upper, e.Upper)
				count.AppendInt(households)
			}
			for a, probabilities := range m.Probability {
				for b, e := range probabilities {
					fromClass.AppendInt(int64(a + 1))
					toClass.AppendInt(int64(b + 1))
					row("probability", e, m.From[a])
				}
			}
			fromClass.AppendMissing()
			toClass.AppendMissing()
			row("shorrocks", m.Shorrocks, m.Households)
		}
	}
	return t
}

// known adds a value, or its absence where it is NaN.
func known(c *output.Column, v float64) {
	if math.IsNaN(v) {
		c.AppendMissing()
	} else {
		c.AppendFloat(v)
	}
}
