package report

import (
	"fmt"
	"slices"
	"strings"

	"cistern/output/stats"
)

// takenApart shows what wealth is held for.
func takenApart(r *Run, _ *summary) Section {
	section := Section{ID: "decomposition", Title: "What wealth is held for"}
	t := r.Decomposition
	if t == nil || t.Len() == 0 {
		return section
	}
	type place struct{ group, removed, variable, statistic string }
	lines := map[place]*Series{}
	whole := map[place]stats.Estimate{}
	var groups, steps, parts []string
	note := func(list *[]string, s string) {
		if !slices.Contains(*list, s) {
			*list = append(*list, s)
		}
	}
	for i := range t.Len() {
		p := place{t.Column("group").Strings[i], t.Column("removed").Strings[i], t.Column("variable").Strings[i], t.Column("statistic").Strings[i]}
		note(&groups, p.group)
		switch p.variable {
		case "assets":
			note(&steps, p.removed)
		case "part":
			note(&parts, p.removed)
		}
		e := estimateAt(t, i)
		if age := t.Column("age"); age.IsMissing(i) {
			whole[p] = e
		} else {
			if lines[p] == nil {
				lines[p] = &Series{}
			}
			lines[p].push(float64(age.Ints[i]), e)
		}
	}
	slices.SortStableFunc(groups, func(a, b string) int { return everyoneFirst(a) - everyoneFirst(b) })
	c := Chart{ID: "assets-without", Title: "Mean wealth as its causes are removed", X: ageAxis, Y: money("mean assets", r, false),
		Caption: "Causes are removed one after the other, in this order; the same households live again on the same luck. A part depends on its place in the order."}
	var premiums []string
	for k, g := range groups {
		table := Table{ID: fmt.Sprintf("parts-%d", k), Group: g, Title: "Parts of mean wealth of " + groupName(g) + " of all ages, " + r.Currency, Note: "With Monte Carlo standard errors.", Head: []string{"held because of", "amount", "share of mean wealth"},
			Numbers: []bool{false, true, true}}
		v := View{Group: g}
		for i, s := range steps {
			name := "with all causes"
			if s != "nothing" {
				list := strings.Split(s, " + ")
				name = "without " + words(list[len(list)-1])
			}
			if line := lines[place{g, s, "assets", "mean"}]; line != nil {
				v.Series = append(v.Series, line.values().named(name, name, i))
			}
		}
		c.Views = append(c.Views, v)
		for _, p := range parts {
			amount, share := whole[place{g, p, "part", "mean"}], whole[place{g, p, "part", "share_of_mean_assets"}]
			table.Rows = append(table.Rows, []string{words(p), rounded(amount.Value, amount.StandardError) + " ± " + rounded(amount.StandardError, amount.StandardError),
				percent(share.Value, share.StandardError)})
		}
		if e, ok := whole[place{g, "income_risk", "equivalent_premium", "share_of_consumption"}]; ok {
			premiums = append(premiums, fmt.Sprintf("%s %s", groupName(g), percent(e.Value, 0)))
		}
		section.Tables = append(section.Tables, table)
	}
	if len(premiums) > 0 {
		section.Words = []string{"To be rid of income risk households would give up, at the start of life, this share of the consumption of a life without it: " + strings.Join(premiums, ", ") + "."}
	}
	section.add(c)
	return section
}

// words writes the name of a cause.
func words(cause string) string { return strings.ReplaceAll(cause, "_", " ") }
