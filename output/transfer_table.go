package output

import (
	"math"

	"cistern/output/stats"
)

// Table returns the responses as a tidy table: one row a group, band of ages at
// receipt, fifth of wealth at receipt, figure and year since, with the columns
//
//	group, first_age, last_age, wealth_fifth, variable, statistic, years_since,
//	estimate, standard_error, lower, upper, households
//
// Groups come in their order and then "all", bands ascending and then all ages
// together (no first_age and last_age), fifths ascending and then all (no
// wealth_fifth). Variables and statistics:
//
//   - consumption: share_of_transfer, consumed in the year; share_to_date, consumed
//     from receipt to the year; mean_propensity, the mean marginal propensity to
//     consume in the year of receipt, of the rule, without the transfer: what
//     share_of_transfer comes to where the transfer is small;
//   - assets: share_of_transfer, more assets at the end of the year;
//   - transfer: share_of_mean_income, the amount over mean net income in the year of
//     receipt; of a bill share_unable, of households whose cash-on-hand and credit
//     do not reach to pay it, which are left out of all other rows.
//
// Where ages are taken together, they weigh as in the population of all ages at a
// moment: by survival, and by the growth of births.
//
// Shares are of the amount; the dead consume and hold nothing. lower and upper
// bound a 95 % interval, Student's t on the jackknife error (share_unable:
// Clopper–Pearson with the effective number of households).
func (t *Transfer) Table() *Table {
	table := NewTable("transfer")
	w := &transferWriter{
		group:     table.AddString("group", "", "group of households; \"all\" for all groups together"),
		first:     table.AddInt("first_age", "year", "youngest age at receipt of the band; missing for all ages"),
		last:      table.AddInt("last_age", "year", "oldest age at receipt of the band; missing for all ages"),
		class:     table.AddInt("wealth_fifth", "", "fifth of the distribution of assets, 1 the poorest, among households of the band of all groups as they enter the year of receipt; households with equal assets are in one fifth; missing for all; with all ages, the fifth of one's own band"),
		variable:  table.AddString("variable", "", "what is described"),
		statistic: table.AddString("statistic", "", "which figure of it; shares are fractions of the transfer unless the name says of what"),
		since:     table.AddInt("years_since", "year", "years since the transfer; 0 in the year of receipt"),
		estimate:  table.AddFloat("estimate", "fraction", "the figure; the dead consume and hold nothing"),
		se:        table.AddFloat("standard_error", "fraction", "Monte Carlo standard error of the estimate, paired: the same luck with the transfer and without"),
		lower:     table.AddFloat("lower", "fraction", "lower end of the 95 % confidence interval"),
		upper:     table.AddFloat("upper", "fraction", "upper end of the 95 % confidence interval"),
		count:     table.AddInt("households", "household", "households behind the estimate, each once for every age at which it receives"),
	}
	all := func(n int) []int { return append(seq(n), -1) }
	for _, group := range all(len(t.Groups)) {
		for _, band := range all(len(t.Bands)) {
			for _, class := range all(t.Classes) {
				w.response(t, band, group, class)
			}
		}
	}
	return table
}

type transferWriter struct {
	group, first, last, class, variable, statistic, since, estimate, se, lower, upper, count *Column
}

func (w *transferWriter) response(t *Transfer, band, group, class int) {
	r := t.Response(band, group, class)
	row := func(variable, statistic string, since int, e stats.Estimate) {
		name := Everyone
		if group >= 0 {
			name = t.Groups[group]
		}
		w.group.AppendString(name)
		if band < 0 {
			w.first.AppendMissing()
			w.last.AppendMissing()
		} else {
			w.first.AppendInt(int64(t.Bands[band].First))
			w.last.AppendInt(int64(t.Bands[band].Last))
		}
		if class < 0 {
			w.class.AppendMissing()
		} else {
			w.class.AppendInt(int64(class + 1))
		}
		w.variable.AppendString(variable)
		w.statistic.AppendString(statistic)
		w.since.AppendInt(int64(since))
		appendKnown(w.estimate, e.Value)
		appendKnown(w.se, e.StandardError)
		appendKnown(w.lower, e.Lower)
		appendKnown(w.upper, e.Upper)
		w.count.AppendInt(r.Receipts)
	}
	if t.Amount < 0 && !math.IsNaN(r.Unable.Value) {
		row("transfer", "share_unable", 0, r.Unable)
	}
	if r.Receipts == 0 {
		return
	}
	row("transfer", "share_of_mean_income", 0, r.OfIncome)
	row("consumption", "mean_propensity", 0, r.Propensity)
	for y := range r.Consumed {
		row("consumption", "share_of_transfer", y, r.Consumed[y])
		row("consumption", "share_to_date", y, r.Cumulated[y])
		row("assets", "share_of_transfer", y, r.Held[y])
	}
}
