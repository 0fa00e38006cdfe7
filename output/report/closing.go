package report

import (
	"fmt"
	"math"

	"cistern/output"
)

// accuracy tells how far the numbers can be trusted as an answer to the model.
func accuracy(r *Run, s *summary) Section {
	section := Section{ID: "accuracy", Title: "How accurate this is"}
	if r.Households > 0 {
		words := fmt.Sprintf("The figures come from %s simulated households. Intervals and standard errors say how far they would move with other draws; "+
			"they say nothing about whether the model is right.", decimals(float64(r.Households), 0))
		if e, ok := s.at(output.Everyone, peak(s, output.Everyone), "assets", "mean", nan); ok && finite(e.StandardError) && e.Value != 0 {
			words += fmt.Sprintf(" Mean wealth at its peak is known to %s.", percent(e.StandardError/math.Abs(e.Value), e.StandardError/math.Abs(e.Value)/4))
		}
		section.Words = append(section.Words, words)
	}
	if r.AboveGrid > 0 {
		section.Words = append(section.Words, fmt.Sprintf("In %s household-years cash-on-hand lay above the top of the rule's grid, where the rule is continued along its last line.", decimals(float64(r.AboveGrid), 0)))
	} else if r.Households > 0 {
		section.Words = append(section.Words, "No simulated household left the grid on which the rule was solved.")
	}
	section.Words = append(section.Words, r.Warnings...)
	if section.Tables = eulerErrors(r.Accuracy); len(section.Tables) > 0 {
		section.Words = append(section.Words, "Euler-equation errors say by what share of consumption a household that follows the computed rule errs in a year, as a power of ten: "+
			"10^−3 is one part in a thousand. They understate the error of the rule itself, which adds up over the years ahead.")
	}
	return section
}

// eulerNames are the words of accuracy.csv as a reader understands them.
var eulerNames = map[string]string{"simulated": "where households are", "between_nodes": "between the nodes of the grid",
	"solver": "the rule's own nodes", "fine": "the continuous shock"}

// eulerErrors are the parts of accuracy.csv about all ages, a table a group.
func eulerErrors(a *output.Table) []Table {
	if a == nil {
		return nil
	}
	var groups []string
	tables := map[string]*Table{}
	for i := range a.Len() {
		if !a.Column("age").IsMissing(i) || a.Column("mean_log10").IsMissing(i) {
			continue
		}
		g := a.Column("group").Strings[i]
		t := tables[g]
		if t == nil {
			groups = append(groups, g)
			t = &Table{ID: fmt.Sprintf("euler-errors-%d", len(groups)), Group: g, Title: "Euler-equation errors of " + groupName(g) + " away from the borrowing limit",
				Head: []string{"taken", "against", "mean", "99th percentile", "largest"}, Numbers: []bool{false, false, true, true, true}}
			tables[g] = t
		}
		var row []string
		for _, c := range []string{"states", "quadrature"} {
			text := a.Column(c).Strings[i]
			if name := eulerNames[text]; name != "" {
				text = name
			}
			row = append(row, text)
		}
		for _, c := range []string{"mean_log10", "p99_log10", "max_log10"} {
			text := "–"
			if x := floatAt(a.Column(c), i); finite(x) {
				text = "10^" + decimals(x, 1)
			}
			row = append(row, text)
		}
		t.Rows = append(t.Rows, row)
	}
	var list []Table
	for _, g := range groups {
		list = append(list, *tables[g])
	}
	return list
}

// peak is the age at which mean wealth of a group is highest.
func peak(s *summary, group string) int {
	age, most := everyone, math.Inf(-1)
	for _, a := range s.ages {
		if e, ok := s.at(group, a, "assets", "mean", nan); ok && e.Value > most {
			age, most = a, e.Value
		}
	}
	return age
}

func assumptions(r *Run) Section {
	section := Section{ID: "assumptions", Title: "What is assumed"}
	if len(r.Assumptions) == 0 {
		return section
	}
	section.Words = []string{"Households know the law of their shocks and follow the best rule for it. Money is real, periods are years, there is one asset with a certain return."}
	t := Table{ID: "assumptions-table", Title: "Every setting of the scenario", Head: []string{"key", "value", "meaning"}, Numbers: []bool{false, false, false}}
	for _, a := range r.Assumptions {
		t.Rows = append(t.Rows, []string{a.Key, a.Value, a.Meaning})
	}
	section.Tables = []Table{t}
	return section
}

func provenance(r *Run) Section {
	section := Section{ID: "provenance", Title: "Where this comes from"}
	if len(r.Provenance) == 0 {
		return section
	}
	t := Table{ID: "provenance-table", Title: "Program and inputs", Head: []string{"", ""}, Numbers: []bool{false, false}}
	for _, p := range r.Provenance {
		t.Rows = append(t.Rows, p[:])
	}
	section.Words = []string{"The same scenario, seed and program give the same bytes."}
	section.Tables = []Table{t}
	return section
}
