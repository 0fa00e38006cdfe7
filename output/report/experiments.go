package report

import (
	"fmt"
	"math"
	"slices"

	"cistern/output"
	"cistern/output/stats"
)

// mobility shows where households of each quantile are at a later age.
func mobility(r *Run, _ *summary) Section {
	section := Section{ID: "mobility", Title: "Who stays, who moves"}
	t := r.Mobility
	if t == nil || t.Len() == 0 {
		return section
	}
	type matrix struct {
		group               string
		from, to, quantiles int64
	}
	cells := map[matrix]map[[2]int64]stats.Estimate{}
	index := map[matrix]stats.Estimate{}
	var order []matrix
	for i := range t.Len() {
		m := matrix{t.Column("group").Strings[i], t.Column("from_age").Ints[i], t.Column("to_age").Ints[i], t.Column("quantiles").Ints[i]}
		if cells[m] == nil {
			cells[m] = map[[2]int64]stats.Estimate{}
			order = append(order, m)
		}
		e := estimateAt(t, i)
		if t.Column("from_quantile").IsMissing(i) {
			index[m] = e
			continue
		}
		cells[m][[2]int64{t.Column("from_quantile").Ints[i], t.Column("to_quantile").Ints[i]}] = e
	}
	for k, m := range order {
		table := Table{ID: fmt.Sprintf("mobility-%d", k), Group: m.group, Head: []string{"from class"}, Numbers: []bool{true},
			Title: fmt.Sprintf("Classes of %s at age %d, and at age %d", groupName(m.group), m.from, m.to)}
		for to := range m.quantiles {
			table.Head, table.Numbers = append(table.Head, fmt.Sprintf("to %d", to+1)), append(table.Numbers, true)
		}
		for from := range m.quantiles {
			row := []string{fmt.Sprint(from + 1)}
			for to := range m.quantiles {
				e := cells[m][[2]int64{from + 1, to + 1}]
				row = append(row, percent(e.Value, e.StandardError))
			}
			table.Rows = append(table.Rows, row)
		}
		if e, ok := index[m]; ok {
			table.Note = fmt.Sprintf("Shorrocks index %s ± %s; 0: nobody moves, 1: the start does not matter.", rounded(e.Value, e.StandardError), rounded(e.StandardError, e.StandardError))
		}
		section.Tables = append(section.Tables, table)
	}
	section.Words = []string{"A row shows where the households of a class are later. Classes are quantiles of assets at each age among households alive at both, the poorest first."}
	return section
}

func estimateAt(t *output.Table, i int) stats.Estimate {
	return stats.Estimate{Value: floatAt(t.Column("estimate"), i), StandardError: floatAt(t.Column("standard_error"), i),
		Lower: floatAt(t.Column("lower"), i), Upper: floatAt(t.Column("upper"), i)}
}

// transferred shows what becomes of an unexpected transfer.
func transferred(r *Run, _ *summary) Section {
	section := Section{ID: "transfer", Title: "What becomes of an unexpected transfer"}
	t := r.Transfer
	if t == nil || t.Len() == 0 {
		return section
	}
	by := Chart{ID: "transfer-by-wealth", Title: "Share consumed in the year it arrives, by wealth", X: Axis{Label: "fifth of households by assets, poorest first", Integer: true},
		Y: Axis{Label: "share of the transfer", Share: true, Zero: true}, Choice: "Age at receipt", Caption: "The same households with the same luck, with and without the transfer. Bars are 95 % intervals."}
	after := Chart{ID: "transfer-to-date", Title: "Share consumed to date", X: Axis{Label: "years since the transfer", Integer: true}, Y: by.Y, Choice: by.Choice,
		Caption: "All wealth classes together; the band is the 95 % interval."}
	type view struct{ group, option string }
	points, lines := map[view]*Series{}, map[view]*Series{}
	var order []view
	for i := range t.Len() {
		statistic := t.Column("statistic").Strings[i]
		first, year := statistic == "share_of_transfer", t.Column("years_since")
		if t.Column("variable").Strings[i] != "consumption" || year.IsMissing(i) || !first && statistic != "share_to_date" {
			continue
		}
		v := view{t.Column("group").Strings[i], ages(t, i)}
		if points[v] == nil {
			points[v], lines[v] = &Series{Name: "consumed", Dots: true}, &Series{Name: "consumed to date"}
			order = append(order, v)
		}
		fifth := t.Column("wealth_fifth")
		switch {
		case first && year.Ints[i] == 0 && !fifth.IsMissing(i):
			points[v].push(float64(fifth.Ints[i]), estimateAt(t, i))
		case !first && fifth.IsMissing(i):
			lines[v].push(float64(year.Ints[i]), estimateAt(t, i))
		}
	}
	slices.SortStableFunc(order, func(a, b view) int { return everyoneFirst(a.group) - everyoneFirst(b.group) })
	for _, v := range order {
		by.Views = append(by.Views, View{Group: v.group, Option: v.option, Series: []Series{*points[v]}})
		after.Views = append(after.Views, View{Group: v.group, Option: v.option, Series: []Series{*lines[v]}})
	}
	section.add(by)
	section.add(after)
	return section
}

func everyoneFirst(group string) int {
	if group == output.Everyone {
		return 0
	}
	return 1
}

// ages names the band of ages of row i.
func ages(t *output.Table, i int) string {
	first, last := t.Column("first_age"), t.Column("last_age")
	switch {
	case first.IsMissing(i):
		return "all ages"
	case first.Ints[i] == last.Ints[i]:
		return fmt.Sprint(first.Ints[i])
	}
	return fmt.Sprintf("%d to %d", first.Ints[i], last.Ints[i])
}

// push appends a point with its interval.
func (s *Series) push(x float64, e stats.Estimate) {
	if math.IsNaN(e.Value) {
		return
	}
	s.X, s.Y = append(s.X, x), append(s.Y, e.Value)
	s.Lower, s.Upper = append(s.Lower, e.Lower), append(s.Upper, e.Upper)
}
