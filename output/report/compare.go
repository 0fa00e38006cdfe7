package report

import (
	"errors"
	"fmt"
	"slices"
	"strings"
)

// Compare makes the page about one run, or about several side by side: what they
// say of the same variable in one chart, the settings in which they differ, and the
// accuracy of each.
func Compare(runs []*Run) (*Page, error) {
	switch len(runs) {
	case 0:
		return nil, errors.New("report: no run")
	case 1:
		return single(runs[0]), nil
	}
	if len(runs) > styles-1 {
		return nil, fmt.Errorf("report: %d runs side by side, want at most %d: more lines cannot be told apart", len(runs), styles-1)
	}
	p := &Page{Title: "Runs side by side", Caution: runs[0].Caution}
	seen := map[string]int{}
	var summaries []*summary
	for _, r := range runs {
		if seen[r.Name]++; seen[r.Name] > 1 {
			r.Name = fmt.Sprintf("%s (%d)", r.Name, seen[r.Name])
		}
		if r.Currency != runs[0].Currency {
			return nil, fmt.Errorf("report: %s counts in %s, %s in %s: their money cannot stand in one chart", runs[0].Name, runs[0].Currency, r.Name, r.Currency)
		}
		s := readSummary(r.Summary)
		summaries = append(summaries, s)
		for _, g := range s.groups {
			if !slices.Contains(p.Groups, g) {
				p.Groups = append(p.Groups, g)
			}
		}
		p.Lead = append(p.Lead, r.Name+": "+strings.Join(Lead(r)[:min(1, len(Lead(r)))], ""))
	}
	for _, s := range []Section{keySection(runs, summaries, p.Groups), differences(runs), sideBySide(runs, summaries, p.Groups)} {
		if len(s.Charts)+len(s.Tables) > 0 {
			p.Sections = append(p.Sections, s)
		}
	}
	for i, r := range runs {
		for _, s := range []Section{accuracy(r, summaries[i]), assumptions(r), provenance(r)} {
			s.ID = fmt.Sprintf("%s-%d", s.ID, i+1)
			s.Title += ": " + r.Name
			for k := range s.Tables {
				s.Tables[k].ID = fmt.Sprintf("%s-%d", s.Tables[k].ID, i+1)
			}
			if len(s.Words)+len(s.Tables) > 0 {
				p.Sections = append(p.Sections, s)
			}
		}
	}
	return p, nil
}

func single(r *Run) *Page {
	p := &Page{Title: r.Title, Subtitle: Subtitle(r), Lead: Lead(r), Sections: Sections(r), Caution: r.Caution}
	if r.Summary != nil {
		p.Groups = readSummary(r.Summary).groups
	}
	return p
}

// compared are the figures by age that runs are compared in.
var compared = []struct {
	id, title, variable, statistic string
	level                          float64
	share, yearly                  bool
}{
	{"mean-assets", "Mean wealth", "assets", "mean", nan, false, false},
	{"median-assets", "Median wealth", "assets", "percentile", 50, false, false},
	{"mean-consumption", "Mean consumption", "consumption", "mean", nan, false, true},
	{"mean-income", "Mean net income", "income", "mean", nan, false, true},
	{"precautionary", "Mean precautionary wealth", "precautionary_assets", "mean", nan, false, false},
	{"share-at-limit", "Households at the borrowing limit", "assets", "share_at_limit", nan, true, false},
	{"runway-below-three", "Households with a runway under three months", "runway_months", "share_below", 3, true, false},
}

func sideBySide(runs []*Run, summaries []*summary, groups []string) Section {
	section := Section{ID: "side-by-side", Title: "What the runs say", Words: []string{
		"Bands are 95 % intervals of each run by itself. Runs with the same seed meet the same luck: what differs between them is known better than the bands suggest."}}
	for _, f := range compared {
		c := Chart{ID: f.id, Title: f.title, X: ageAxis, Y: Axis{Label: "share of households", Share: true, Zero: true}}
		if !f.share {
			c.Y = money("amount", runs[0], f.yearly)
		}
		for _, g := range groups {
			v := View{Group: g}
			for i, s := range summaries {
				if line := s.byAge(g, f.variable, f.statistic, f.level); len(line.X) > 0 {
					v.Series = append(v.Series, line.named(runs[i].Name, runs[i].Name, i))
				}
			}
			c.Views = append(c.Views, v)
		}
		section.add(c)
	}
	return section
}

// keySection holds the key figures of every group.
func keySection(runs []*Run, summaries []*summary, groups []string) Section {
	section := Section{ID: "key-figures", Title: "Key figures"}
	for k, g := range groups {
		if t := keyFigures(runs, summaries, g); len(t.Rows) > 0 {
			t.ID = fmt.Sprintf("key-figures-%d", k+1)
			section.Tables = append(section.Tables, t)
		}
	}
	return section
}

// keyFigures holds the figures of all ages, and those at the age of the highest
// wealth, beside each other.
func keyFigures(runs []*Run, summaries []*summary, group string) Table {
	t := Table{Group: group, Title: "Of " + groupName(group), Note: "With Monte Carlo standard errors.", Head: []string{""}, Numbers: []bool{false}}
	for _, r := range runs {
		t.Head, t.Numbers = append(t.Head, r.Name), append(t.Numbers, true)
	}
	add := func(name string, cell func(s *summary) string) {
		row, known := []string{name}, false
		for _, s := range summaries {
			text := cell(s)
			row, known = append(row, text), known || text != "–"
		}
		if known {
			t.Rows = append(t.Rows, row)
		}
	}
	figure := func(name string, at func(s *summary) int, variable, statistic string, level float64, share bool) {
		add(name, func(s *summary) string { return s.cell(group, at(s), variable, statistic, level, share) })
	}
	highest := func(s *summary) int { return peak(s, group) }
	all := func(*summary) int { return everyone }
	money := ", " + runs[0].Currency
	add("age of the highest mean wealth", func(s *summary) string {
		if a := peak(s, group); a != everyone {
			return fmt.Sprint(a)
		}
		return "–"
	})
	figure("mean wealth at that age"+money, highest, "assets", "mean", nan, false)
	figure("median wealth at that age"+money, highest, "assets", "percentile", 50, false)
	figure("precautionary part at that age"+money, highest, "precautionary_assets", "mean", nan, false)
	figure("share of it in mean wealth", highest, "precautionary_assets", "share_of_mean_assets", nan, true)
	figure("mean consumption, all ages"+money+" a year", all, "consumption", "mean", nan, false)
	figure("Gini coefficient of assets, all ages", all, "assets", "gini", nan, false)
	figure("at the borrowing limit, all ages", all, "assets", "share_at_limit", nan, true)
	figure("runway under three months, all ages", all, "runway_months", "share_below", 3, true)
	return t
}

// differences lists the settings in which runs differ.
func differences(runs []*Run) Section {
	section := Section{ID: "differences", Title: "In what the runs differ"}
	t := Table{ID: "differences-table", Title: "Settings that are not the same in all runs", Head: []string{"key"}, Numbers: []bool{false}}
	values := map[string][]string{}
	var keys []string
	for i, r := range runs {
		t.Head, t.Numbers = append(t.Head, r.Name), append(t.Numbers, false)
		for _, a := range r.Assumptions {
			if values[a.Key] == nil {
				keys = append(keys, a.Key)
				values[a.Key] = slices.Repeat([]string{"–"}, len(runs))
			}
			values[a.Key][i] = a.Value
		}
	}
	for _, k := range keys {
		if v := values[k]; len(slices.Compact(slices.Clone(v))) > 1 {
			t.Rows = append(t.Rows, append([]string{k}, v...))
		}
	}
	if len(t.Rows) > 0 {
		section.Tables = []Table{t}
	}
	return section
}
