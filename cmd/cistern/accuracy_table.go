package main

import (
	"fmt"
	"math"
	"slices"

	"cistern/output"
)

// pool gathers the cells that fit: t or group −1 means all.
func (a *accuracy) pool(place, quadrature, group, t int) errorList {
	var all errorList
	for c, l := range a.cells {
		if c.place == place && c.quadrature == quadrature && (group < 0 || c.group == group) && (t < 0 || c.t == t) {
			all.join(l)
		}
	}
	slices.Sort(all.errors) // whatever order the map gave
	return all
}

// stats returns mean, 99th percentile and maximum of sorted errors.
func (l *errorList) stats() (mean, p99, most float64) {
	n := len(l.errors)
	for _, e := range l.errors {
		mean += e
	}
	return mean / float64(n), l.errors[min(n*99/100, n-1)], l.errors[n-1]
}

// table is accuracy.csv: log10 errors by group and age, with rows for all groups
// and all ages together.
func (a *accuracy) table(years int) *output.Table {
	t := output.NewTable("accuracy")
	t.Notes = append(t.Notes, "Euler-equation errors: log10 of the share of consumption by which a household that follows the rule errs in a year. "+
		"They understate the error of the rule itself, which adds up over the years ahead.")
	where := t.AddString("states", "", "simulated states, or points half-way between the nodes of the rule")
	how := t.AddString("quadrature", "", "expectations by the solver's own nodes, or by a much finer quadrature of the shock that is simulated")
	group := t.AddString("group", "", "group of households")
	age := t.AddInt("age", "year", "age; empty for all ages")
	count := t.AddInt("judged", "", "states judged, away from the limit")
	limit := t.AddInt("at_limit", "", "states at the borrowing limit, where the equation is an inequality")
	mean := t.AddFloat("mean_log10", "", "log10 of the mean error away from the limit")
	p99 := t.AddFloat("p99_log10", "", "log10 of the 99th percentile")
	most := t.AddFloat("max_log10", "", "log10 of the maximum")
	violation := t.AddFloat("limit_max_log10", "", "log10 of the largest violation of the inequality at the limit; empty if there is none")
	for place := range places {
		for q := range quadratures {
			for g := -1; g < len(a.groups); g++ {
				for year := -1; year < years; year++ {
					l := a.pool(place, q, g, year)
					if len(l.errors) == 0 && l.atLimit == 0 {
						continue
					}
					where.AppendString(places[place])
					how.AppendString(quadratures[q])
					if g < 0 {
						group.AppendString(output.Everyone)
					} else {
						group.AppendString(a.groups[g])
					}
					if year < 0 {
						age.AppendMissing()
					} else {
						age.AppendInt(int64(a.firstAge + year))
					}
					count.AppendInt(int64(len(l.errors)))
					limit.AppendInt(int64(l.atLimit))
					appendErrors(l, mean, p99, most, violation)
				}
			}
		}
	}
	return t
}

func appendErrors(l errorList, mean, p99, most, violation *output.Column) {
	if len(l.errors) == 0 {
		mean.AppendMissing()
		p99.AppendMissing()
		most.AppendMissing()
	} else {
		a, b, c := l.stats()
		appendLog10(mean, a)
		appendLog10(p99, b)
		appendLog10(most, c)
	}
	appendLog10(violation, l.limit)
}

// appendLog10 appends log10 x, or nothing for an error of exactly 0.
func appendLog10(c *output.Column, x float64) {
	if x == 0 {
		c.AppendMissing()
		return
	}
	c.AppendFloat(math.Log10(x))
}

// sentence says how accurate the rule was, in a line.
func (a *accuracy) sentence() string {
	own, fine := a.pool(0, 0, -1, -1), a.pool(0, 1, -1, -1)
	if len(own.errors) == 0 || len(fine.errors) == 0 {
		return "no simulated state away from the limit was judged"
	}
	m1, _, x1 := own.stats()
	m2, p2, _ := fine.stats()
	return fmt.Sprintf("Euler-equation errors at simulated states: mean 10^%.1f, maximum 10^%.1f of consumption; against the continuous shock mean 10^%.1f, 99th percentile 10^%.1f. "+
		"They understate the error of the rule itself.", math.Log10(m1), math.Log10(x1), math.Log10(m2), math.Log10(p2))
}

// rulesSentence is sentence for rules that were judged without a panel.
func (a *accuracy) rulesSentence() string {
	l := a.pool(1, 0, -1, -1)
	if len(l.errors) == 0 {
		return "no point away from the limit was judged"
	}
	mean, _, most := l.stats()
	return fmt.Sprintf("Euler-equation errors half-way between nodes: mean 10^%.1f, maximum 10^%.1f of consumption. They understate the error of the rule itself.",
		math.Log10(mean), math.Log10(most))
}
