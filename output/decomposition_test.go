package output

import (
	"math"
	"testing"
)

// Two ages, two groups, three steps: figures by hand. Parts and what remains sum to
// mean assets, whatever is pooled.
func TestDecompositionTable(t *testing.T) {
	d := &Decomposition{FirstAge: 30, Groups: []string{"dockers", "clerks"}, Removed: []string{"income_risk", "borrowing_limit"}, Growth: 0.25,
		Premium: []float64{0.1, 0.2}, Shares: []float64{0.75, 0.25}, Cells: make([][]DecompositionSums, 2)}
	for year := range d.Cells {
		for g := range 2 {
			c := DecompositionSums{Assets: make([][groupsJackknife]float64, 3)}
			for part := range groupsJackknife {
				c.Alive[part] = 2
				spread := float64(part%2*2 - 1) // ±1, to have an error
				c.Assets[0][part] = 2*float64(10+10*year+g) + spread
				c.Assets[1][part] = 2*float64(6+5*year) + spread
				c.Assets[2][part] = 2 * float64(5+5*year)
			}
			d.Cells[year] = append(d.Cells[year], c)
		}
	}
	table := d.Table()
	if err := table.Validate(); err != nil {
		t.Fatal(err)
	}
	find := func(group string, age int, removed, variable, statistic string) (value, se float64) {
		t.Helper()
		for i := range table.Len() {
			a := table.Column("age")
			if table.Column("group").Strings[i] == group && (age < 0) == a.IsMissing(i) && (age < 0 || a.Ints[i] == int64(age)) && table.Column("removed").Strings[i] == removed &&
				table.Column("variable").Strings[i] == variable && table.Column("statistic").Strings[i] == statistic {
				se = math.NaN()
				if c := table.Column("standard_error"); !c.IsMissing(i) {
					se = c.Floats[i]
				}
				return table.Column("estimate").Floats[i], se
			}
		}
		t.Fatalf("no row %s %d %s %s %s", group, age, removed, variable, statistic)
		return
	}
	for _, tt := range []struct {
		group                        string
		age                          int
		removed, variable, statistic string
		want                         float64
	}{
		{"dockers", 30, "nothing", "assets", "mean", 10},
		{"clerks", 31, "nothing", "assets", "mean", 21},
		{"clerks", 31, "income_risk", "assets", "mean", 11},
		{"clerks", 31, "income_risk + borrowing_limit", "assets", "mean", 10},
		{"all", 30, "income_risk", "part", "mean", 4.5},
		{"all", 30, "borrowing_limit", "part", "mean", 1},
		{"all", 30, "income_risk", "part", "share_of_mean_assets", 4.5 / 10.5},
		{"dockers", -1, "nothing", "assets", "mean", (10 + 20/1.25) / 1.8},
		{"all", -1, "income_risk", "equivalent_premium", "share_of_consumption", 0.125},
		{"clerks", -1, "income_risk", "equivalent_premium", "share_of_consumption", 0.2},
	} {
		if got, _ := find(tt.group, tt.age, tt.removed, tt.variable, tt.statistic); math.Abs(got-tt.want) > 1e-12 {
			t.Errorf("%+v: got %v", tt, got)
		}
	}
	all, parts, left := d.Whole()
	value := func(removed, variable string) float64 {
		x, _ := find("all", -1, removed, variable, "mean")
		return x
	}
	if all.Value != value("nothing", "assets") || len(parts) != 2 || parts[0].Value != value("income_risk", "part") || parts[1].Value != value("borrowing_limit", "part") ||
		left.Value != value("income_risk + borrowing_limit", "assets") || math.Abs(all.Value-parts[0].Value-parts[1].Value-left.Value) > 1e-12 {
		t.Errorf("the whole %v, parts %v, left %v", all, parts, left)
	}
	// The spread is in assets before and after income risk is removed, so it has no
	// part in the difference.
	if _, se := find("dockers", 30, "income_risk", "part", "mean"); se > 1e-12 {
		t.Errorf("paired error %v, want 0", se)
	}
	if _, se := find("dockers", 30, "nothing", "assets", "mean"); !(se > 0.05) {
		t.Errorf("error %v of a mean over households that differ", se)
	}
	if _, se := find("all", -1, "income_risk", "equivalent_premium", "share_of_consumption"); !math.IsNaN(se) {
		t.Errorf("the premium has a Monte Carlo error %v", se)
	}
}
