package output

import (
	"math"
	"slices"
	"strings"
	"testing"

	"cistern/output/stats"
)

// What is made of columns, value by value; NaN where a household has none (derived:
// the definitions).
func TestMadeValues(t *testing.T) {
	nan := math.NaN()
	r := &SummaryRows{
		Assets:          []float64{1200, 0, -500, 1200, 0, 600, 1e30, 300},
		Consumption:     []float64{2400, 2400, 2400, 0, -1, -2400, 1, 1200},
		Income:          []float64{1200, 0, 1200, 0, 2400, -1, 1, 3600},
		LastConsumption: []float64{2000, 2400, nan, 1200, 0, 1200, 1e-13, -5},
		JobLost:         []bool{true, false, true, true, true, false, true, true},
		Propensity:      []float64{0.5, 0.25 + 0x1p-40, 1, 0.1, 0, 0.9, 1, 1},
		TwinAssets:      []float64{200, 0, -100, 0, 0, 0, 0, 0},
	}
	r.N = len(r.Assets)
	for _, tt := range []struct {
		name string
		make func(*SummaryRows, []float64)
		want []float64
	}{
		{"runway", runway, []float64{6, 0, 0, nan, 0, nan, nan, 3}},
		{"wealth to income", wealthToIncome, []float64{1, nan, -500.0 / 1200, nan, 0, nan, nan, 1.0 / 12}},
		{"change", change, []float64{0.2, 0, nan, -1, nan, -3, nan, nan}},
		{"change at job loss", changeAtJobLoss, []float64{0.2, nan, nan, -1, nan, nan, nan, nan}},
		{"propensity", propensity, []float64{0.5, 0.25, 1, 0.1, 0, 0.9, 1, 1}},
		{"precaution", precaution, []float64{1000, 0, -400, 1200, 0, 600, 1e30, 300}},
	} {
		got := make([]float64, r.N)
		tt.make(r, got)
		for k, want := range tt.want {
			if math.IsNaN(got[k]) != math.IsNaN(want) || math.Abs(got[k]-want) > 0x1p-31 {
				t.Errorf("%s of household %d: %v, want %v", tt.name, k, got[k], want)
			}
		}
	}
	for _, x := range []float64{0, 1, -1, 0.3, -0.3, 1e-10, 1e-9, 123.456, -1e6} {
		if got := rounded(x); math.Abs(got-x) > 0x1p-31 || got*0x1p30 != math.Trunc(got*0x1p30) {
			t.Errorf("%v is rounded to %v", x, got)
		}
	}
}

// The table of buffers agrees with sorting and counting the rows, whether they are
// held or not: at an age of a group, at an age, and of all ages.
func TestBufferRowsAgainstPlain(t *testing.T) {
	w := smallTown
	for _, budget := range []int64{0, 1 << 18} {
		o := w.options()
		o.MemoryBudget = budget
		s := w.run(t, o)
		if (s.Passes() > 1) != (budget > 0) {
			t.Fatalf("budget %d: %d passes", budget, s.Passes())
		}
		table := s.Table()
		for _, v := range []struct {
			name   string
			make   func(*SummaryRows, []float64)
			scale  float64 // of values that the table has in another unit
			mean   bool
			shares []float64
		}{
			{"runway_months", runway, 1, false, o.Runway},
			{"wealth_to_income", wealthToIncome, 1, false, nil},
			{"runway_income_months", wealthToIncome, 12, false, o.Runway},
			{"consumption_change", change, 1, true, []float64{-0.05, -0.2}},
			{"consumption_change_job_loss", changeAtJobLoss, 1, true, []float64{-0.05, -0.2}},
			{"propensity", propensity, 1, true, nil},
		} {
			for _, at := range []struct {
				group string
				index int
				age   int
			}{{"clerks", 1, 30}, {Everyone, -1, 44}, {"dockers", 0, -1}, {Everyone, -1, -1}} {
				var x []float64
				for age := w.first; age <= w.last; age++ {
					if at.age < 0 || age == at.age {
						x = append(x, w.values(age, at.index, func(r *SummaryRows) []float64 {
							made := make([]float64, r.N)
							v.make(r, made)
							for k := range made {
								made[k] *= v.scale
							}
							return made
						})...)
					}
				}
				x = slices.DeleteFunc(x, math.IsNaN)
				slices.Sort(x)
				what := strings.Join([]string{v.name, at.group}, " ")
				for _, p := range o.Percentiles {
					e, n := find(t, table, at.group, at.age, v.name, "percentile", p)
					want := stats.Quantile(x, p/100, stats.Type7)
					near(t, what, e.Value, want, 1e-9*(1+math.Abs(want)))
					if at.age >= 0 && n != int64(len(x)) || n > int64(len(x)) {
						t.Errorf("%s: %d households, want %d", what, n, len(x))
					}
					if half := normalHalfWidth * e.StandardError; p == 50 && !(e.Lower <= e.Value && e.Value <= e.Upper && math.Abs(e.Upper-e.Lower-2*half) <= 1e-9*half) {
						t.Errorf("%s: interval %v to %v about %v, error %v", what, e.Lower, e.Upper, e.Value, e.StandardError)
					}
				}
				for _, threshold := range v.shares {
					e, _ := find(t, table, at.group, at.age, v.name, "share_below", threshold)
					below, _ := slices.BinarySearch(x, threshold)
					near(t, what+" share below", e.Value, float64(below)/float64(len(x)), 1e-12)
				}
				if v.mean {
					e, _ := find(t, table, at.group, at.age, v.name, "mean", 0)
					near(t, what+" mean", e.Value, stats.Mean(x), 1e-9)
				}
			}
		}
		checkByWealth(t, w, table)
	}
}

// checkByWealth recomputes the mean propensity within fifths of assets.
func checkByWealth(t *testing.T, w town, table *Table) {
	t.Helper()
	for _, age := range []int{30, -1} {
		type pair struct{ assets, mpc float64 }
		var x []pair
		for first := int64(0); first < w.households; first += w.unit {
			b := w.block(first)
			for _, sp := range b.Spans {
				for k := sp.From; k < sp.To; k++ {
					if age < 0 || int(sp.Age) == age {
						x = append(x, pair{b.Assets[k], b.Propensity[k]})
					}
				}
			}
		}
		slices.SortFunc(x, func(a, b pair) int { return int(math.Copysign(1, a.assets-b.assets)) })
		total := int64(0)
		for class := range 5 {
			from, to := (len(x)*class+4)/5, (len(x)*(class+1)+4)/5            // limits are the least values that a fifth, … reaches
			for from > 0 && from < to && x[from].assets == x[from-1].assets { // of one value all are in the lower class
				from++
			}
			for to < len(x) && x[to].assets == x[to-1].assets {
				to++
			}
			sum := 0.0
			for _, p := range x[from:max(from, to)] {
				sum += p.mpc
			}
			e, n := find(t, table, Everyone, age, "propensity_by_wealth", "mean", float64(class+1))
			near(t, "mean propensity in a fifth", e.Value, sum/float64(to-from), 1e-9)
			if age >= 0 && n != int64(to-from) || age < 0 && !(e.StandardError > 0) { // at an age of this town all have one propensity
				t.Errorf("age %d, fifth %d: %d households, want %d; error %v", age, class+1, n, to-from, e.StandardError)
			}
			total += n
		}
	}
}

// A job loss that few have is not described, nor a change in the first year; and
// the columns may be left out.
func TestBufferRowsLeftOut(t *testing.T) {
	w := town{households: 200, first: 25, last: 27, groups: []string{"dockers"}, unit: 256, mortality: 0.01}
	o := w.options()
	o.Runway, o.Falls = nil, nil
	table := w.run(t, o).Table()
	count := map[string]int{}
	for i, name := range table.Column("variable").Strings {
		if !table.Column("age").IsMissing(i) && table.Column("group").Strings[i] == "dockers" {
			count[name]++
		}
		if table.Column("statistic").Strings[i] == "share_below" {
			t.Error("a share below a threshold though none was asked for")
		}
	}
	if count["consumption_change"] != 2*11 || count["consumption_change_job_loss"] != 0 || count["runway_months"] != 3*9 {
		t.Errorf("rows at the three ages: %v", count)
	}
	s, err := NewSummary(o)
	if err != nil {
		t.Fatal(err)
	}
	rows := *w.block(0)
	rows.LastConsumption, rows.Propensity = nil, nil
	commit, err := s.Add(0, &rows)
	if err == nil {
		err = commit()
	}
	if err == nil {
		_, err = s.EndPass()
	}
	if err != nil {
		t.Fatal(err)
	}
	for _, name := range s.Table().Column("variable").Strings {
		if strings.HasPrefix(name, "consumption_change") || strings.HasPrefix(name, "propensity") {
			t.Fatalf("the table has %s", name)
		}
	}
}

func TestBufferOptions(t *testing.T) {
	for _, tt := range []struct {
		runway, falls []float64
		want          string
	}{
		{[]float64{0}, nil, "runway 0, want above 0"},
		{[]float64{3, 3}, nil, "runway 3 stands twice"},
		{nil, []float64{-5}, "fall -5, want above 0"},
		{nil, []float64{math.Inf(1)}, "fall +Inf, want above 0"},
	} {
		o := smallTown.options()
		o.Runway, o.Falls = tt.runway, tt.falls
		if _, err := NewSummary(o); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("error %v, want %q", err, tt.want)
		}
	}
}
