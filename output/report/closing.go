package report

import (
	"fmt"
	"math"
	"slices"

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
	if t := eulerErrors(r.Accuracy); len(t.Rows) > 0 {
		section.Words = append(section.Words, "Euler-equation errors: by what share of consumption a household that follows the computed rule errs in a year, as a power of ten. "+
			"They understate the error of the rule itself, which adds up over the years ahead.")
		section.Tables = append(section.Tables, t)
	}
	return section
}

// eulerErrors is the part of accuracy.csv about all ages.
func eulerErrors(a *output.Table) Table {
	t := Table{ID: "euler-errors", Title: "Euler-equation errors away from the borrowing limit", Head: []string{"states", "expectations by", "group", "mean", "99th percentile", "largest"},
		Numbers: []bool{false, false, false, true, true, true}}
	if a == nil {
		return t
	}
	for i := range a.Len() {
		if !a.Column("age").IsMissing(i) || a.Column("mean_log10").IsMissing(i) {
			continue
		}
		row := []string{a.Column("states").Strings[i], a.Column("quadrature").Strings[i], groupName(a.Column("group").Strings[i])}
		for _, c := range []string{"mean_log10", "p99_log10", "max_log10"} {
			text := "–"
			if x := floatAt(a.Column(c), i); finite(x) {
				text = "10^" + decimals(x, 1)
			}
			row = append(row, text)
		}
		t.Rows = append(t.Rows, row)
	}
	return t
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

// Lead returns the answer in words: what the results say first.
func Lead(r *Run) []string {
	s := readSummary(r.Summary)
	all := output.Everyone
	age := peak(s, all)
	if age == everyone {
		return nil
	}
	var words []string
	mean, _ := s.at(all, age, "assets", "mean", nan)
	text := fmt.Sprintf("Wealth is highest at age %d: %s %s on average (95 %% interval %s to %s)", age, rounded(mean.Value, mean.StandardError), r.Currency,
		rounded(mean.Lower, mean.StandardError), rounded(mean.Upper, mean.StandardError))
	if median, ok := s.at(all, age, "assets", "percentile", 50); ok {
		text += fmt.Sprintf(", and %s for the household in the middle", rounded(median.Value, median.StandardError))
	}
	words = append(words, text+".")
	if gap, ok := s.at(all, age, "precautionary_assets", "mean", nan); ok {
		share, _ := s.at(all, age, "precautionary_assets", "share_of_mean_assets", nan)
		words = append(words, fmt.Sprintf("Of that mean, %s %s (standard error %s), or %s, is held because income is risky: so much less the same households would hold if every income came at its mean.",
			rounded(gap.Value, gap.StandardError), r.Currency, rounded(gap.StandardError, gap.StandardError), percent(share.Value, share.StandardError)))
	}
	words = append(words, fragile(s)...)
	return words
}

// fragile says how many households are close to the edge.
func fragile(s *summary) []string {
	all := output.Everyone
	var words []string
	if e, ok := s.at(all, everyone, "runway_months", "share_below", 3); ok {
		words = append(words, fmt.Sprintf("%s of all households could live for less than three months on what they have (95 %% interval %s to %s).",
			percent(e.Value, e.StandardError), percent(e.Lower, e.StandardError), percent(e.Upper, e.StandardError)))
	}
	worst, at := 0.0, everyone
	for _, a := range s.ages {
		if a >= s.ages[0]+35 {
			break
		}
		if e, ok := s.at(all, a, "assets", "share_at_limit", nan); ok && e.Value > worst {
			worst, at = e.Value, a
		}
	}
	if at != everyone {
		e, _ := s.at(all, at, "assets", "share_at_limit", nan)
		words = append(words, fmt.Sprintf("Among the young the borrowing limit binds most often at age %d, for %s of households.", at, percent(e.Value, e.StandardError)))
	}
	return slices.Clip(words)
}
