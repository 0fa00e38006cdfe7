package survey

import (
	"fmt"
	"math"

	"cistern/output"
	"cistern/output/distribution"
	"cistern/output/stats"
)

// writer appends rows to the columns of the table.
type writer struct {
	by                                                        []*output.Column
	variable, statistic, level, estimate, se, lower, upper, n *output.Column
}

// table turns the finished study into the tidy table.
func (l *layout) table(s *distribution.Study, c *cells, targets [][]distribution.Cell, keys [][]*value, gone []int64) *output.Table {
	t := output.NewTable("survey")
	w := &writer{}
	for i, name := range l.o.By {
		if c.kinds[i] == output.String {
			w.by = append(w.by, t.AddString(name, "", "told apart; \""+output.Everyone+"\" for all together"))
		} else {
			w.by = append(w.by, t.AddInt(name, "", "told apart; missing for all together"))
		}
	}
	w.variable = t.AddString("variable", "", "column that is described")
	w.statistic = t.AddString("statistic", "", "which figure of the variable's distribution")
	w.level = t.AddFloat("level", "percent", "share of rows that the figure is about: at or below a percentile, the poorest (lorenz), the richest (top_share, hill), the lowest (expected_shortfall)")
	w.estimate = t.AddFloat("estimate", "", "the figure, in the unit of the variable; gini, lorenz and shares are fractions")
	w.se = t.AddFloat("standard_error", "", "standard error of the estimate")
	w.lower = t.AddFloat("lower", "", "lower end of the 95 % confidence interval")
	w.upper = t.AddFloat("upper", "", "upper end of the 95 % confidence interval")
	w.n = t.AddInt("rows", "row", "number of rows behind the figure")
	bound := 0.0
	for i := range targets {
		r := s.Target(i)
		for v, name := range l.variables {
			for _, f := range r.Figures(v) {
				w.row(keys[i], name, f.Statistic, f.Level, f.Estimate, f.Rows)
			}
			w.row(keys[i], name, "share_nonpositive", math.NaN(), r.Share(v, 0), r.Values(v))
			bound = max(bound, r.GiniBound(v))
		}
	}
	if c.left > 0 {
		t.Notes = append(t.Notes, fmt.Sprintf("%d rows are left out: they lack a value of a column that is told apart.", c.left))
	}
	for v, n := range gone {
		if n > 0 {
			t.Notes = append(t.Notes, fmt.Sprintf("%d rows have no value of %s and do not count in its figures.", n, l.variables[v]))
		}
	}
	if l.o.Weight != "" {
		t.Notes = append(t.Notes, "Rows are weighed by "+l.o.Weight+", taken as sampling weights: percentiles are the least value that the share of weights reaches.")
	}
	if bound > 0 {
		t.Notes = append(t.Notes, fmt.Sprintf("Gini coefficients come from binned values and are at most %.1g off; their errors, and by how much units with several rows widen intervals of percentiles, come from a sample of %d rows.", bound, s.Sampled()))
	}
	return t
}

func (w *writer) row(key []*value, variable, statistic string, level float64, e stats.Estimate, n int64) {
	for i, c := range w.by {
		switch v := key[i]; {
		case v == nil && c.Kind == output.String:
			c.AppendString(output.Everyone)
		case v == nil:
			c.AppendMissing()
		case c.Kind == output.String:
			c.AppendString(v.text)
		default:
			c.AppendInt(v.number)
		}
	}
	w.variable.AppendString(variable)
	w.statistic.AppendString(statistic)
	for _, x := range []struct {
		c *output.Column
		v float64
	}{{w.level, level}, {w.estimate, e.Value}, {w.se, e.StandardError}, {w.lower, e.Lower}, {w.upper, e.Upper}} {
		if math.IsNaN(x.v) {
			x.c.AppendMissing()
		} else {
			x.c.AppendFloat(x.v)
		}
	}
	w.n.AppendInt(n)
}
