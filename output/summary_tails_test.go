package output

import (
	"bytes"
	"math"
	"slices"
	"testing"

	"cistern/output/stats"
)

// weighted returns the values of a variable at all ages, sorted, with the weight of
// each household's age.
func (w town) weighted(group int, growth float64, of func(*SummaryRows) []float64) (x, weight []float64) {
	type pair struct{ x, w float64 }
	var all []pair
	for age := w.first; age <= w.last; age++ {
		for _, v := range w.values(age, group, of) {
			all = append(all, pair{v, math.Pow(1+growth, float64(w.first-age))})
		}
	}
	slices.SortFunc(all, func(a, b pair) int {
		if a.x < b.x {
			return -1
		} else if a.x > b.x {
			return 1
		}
		return 0
	})
	for _, p := range all {
		x, weight = append(x, p.x), append(weight, p.w)
	}
	return x, weight
}

func incomeOf(r *SummaryRows) []float64 { return r.Income }
func assetsOf(r *SummaryRows) []float64 { return r.Assets }

// TestSummaryTails compares concentration and tails, at an age and for the
// population of all ages with and without growth of births, with the plain
// statistics of the sorted values.
func TestSummaryTails(t *testing.T) {
	w := smallTown
	w.limit = -500
	for _, growth := range []float64{0, 0.02, -0.03} {
		for _, budget := range []int64{0, 1 << 18} {
			o := w.options()
			o.Growth, o.MemoryBudget = growth, budget
			table := w.run(t, o).Table()
			for _, tt := range []struct{ group, age int }{{-1, 30}, {-1, -1}, {0, -1}} {
				x, weight := w.weighted(tt.group, growth, assetsOf)
				if tt.age >= 0 {
					x, weight = w.values(tt.age, tt.group, assetsOf), nil
				}
				name := Everyone
				if tt.group >= 0 {
					name = w.groups[tt.group]
				}
				equal := func(statistic string, level, want float64) {
					t.Helper()
					e, _ := find(t, table, name, tt.age, "assets", statistic, level)
					if !(math.Abs(e.Value-want) <= 1e-10*math.Abs(want)) || !(e.StandardError > 0 && e.Lower < e.Value && e.Value < e.Upper) {
						t.Errorf("growth %v, budget %d, %s, age %d: %s %v is %+v, want %v", growth, budget, name, tt.age, statistic, level, e, want)
					}
				}
				for _, p := range []float64{10, 20, 50, 90} {
					l, _ := stats.Lorenz(x, weight, p/100)
					equal("lorenz", p, l)
				}
				top, _ := stats.TopShare(x, weight, 0.01)
				equal("top_share", 1, top)
				rich, _ := stats.TopShare(x, weight, 0.2)
				poor, _ := stats.Lorenz(x, weight, 0.2)
				equal("s80_s20", 0, rich/poor)
				plain := weight
				if plain == nil {
					plain = slices.Repeat([]float64{1}, len(x))
				}
				equal("mean", 0, stats.WeightedMean(x, plain))
				if growth == 0 || tt.age >= 0 {
					equal("expected_shortfall", 5, stats.ExpectedShortfall(x, 0.05))
					alpha, _ := stats.Hill(x, int(math.Round(float64(len(x))*0.05)))
					equal("hill", 5, alpha)
				} else {
					k := 0
					u := stats.WeightedQuantile(x, weight, 0.95, stats.Type1)
					for _, v := range x {
						if v > u {
							k++
						}
					}
					alpha, _ := stats.WeightedHill(x, weight, k)
					equal("hill", 5, alpha)
					if _, n := find(t, table, name, tt.age, "assets", "hill", 5); n != int64(k) {
						t.Errorf("hill of %d rows, want %d", n, k)
					}
					if e, _ := find(t, table, name, tt.age, "assets", "percentile", 50); e.Value != stats.WeightedQuantile(x, weight, 0.5, stats.Type1) {
						t.Errorf("growth %v: median of all ages %v, want %v", growth, e.Value, stats.WeightedQuantile(x, weight, 0.5, stats.Type1))
					}
				}
				y, _ := w.weighted(tt.group, growth, incomeOf)
				if tt.age >= 0 {
					y = w.values(tt.age, tt.group, incomeOf)
				}
				if ratio, _ := find(t, table, name, tt.age, "wealth_to_income", "ratio_of_means", 0); growth == 0 || tt.age >= 0 {
					near(t, "wealth to income", ratio.Value, stats.Mean(x)/stats.Mean(y), 1e-10)
				}
				var none float64
				for i, v := range x {
					if v <= 0 {
						none += plain[i]
					}
				}
				share, _ := find(t, table, name, tt.age, "assets", "share_nonpositive", 0)
				var all float64
				for _, v := range plain {
					all += v
				}
				near(t, "share at or below zero", share.Value, none/all, 1e-12)
			}
		}
	}
}

// TestSummaryThinTails: a share of fewer than 20 households is not described, nor is
// a tail of a group at an age.
func TestSummaryThinTails(t *testing.T) {
	w := smallTown
	table := w.run(t, w.options()).Table()
	count := map[string]int{}
	for i := range table.Len() {
		age, households := table.Column("age"), table.Column("households").Ints[i]
		statistic, level := table.Column("statistic").Strings[i], table.Column("level").Floats[i]
		switch statistic {
		case "lorenz", "top_share", "s80_s20", "expected_shortfall":
			if !age.IsMissing(i) && (table.Column("group").Strings[i] != Everyone || float64(households)*min(level, 100-level) < 2000 && level > 0) {
				t.Errorf("%s %v of %d households of %s", statistic, level, households, table.Column("group").Strings[i])
			}
		case "hill":
			if households < 20 {
				t.Errorf("hill of %d households", households)
			}
		}
		count[statistic]++
	}
	// derived: all ages of three groups and of everybody have every figure: 4 targets,
	// 3 variables. Everybody at one of 20 ages has those of 1 % where 2000 live.
	if count["s80_s20"] != 3*(4+20) || count["lorenz"] != 4*3*(4+20) || count["top_share"] <= 3*(4+4+20) || count["ratio_of_means"] != 4*21 {
		t.Errorf("rows: %v", count)
	}
}

// TestSummaryGrowth: derived: of two ages with incomes 1 and 3 and as many
// households, births that grow by 25 % a year leave 0.8 of the older for each of the
// younger: mean (1 + 0.8·3)/1.8, share of the younger 1/1.8.
func TestSummaryGrowth(t *testing.T) {
	rows := year(2000, func(k int) (float64, float64, float64, float64) { return 1, 1, 1, 1 })
	for k := 1000; k < 2000; k++ {
		rows.Income[k], rows.Assets[k], rows.Household[k] = 3, 0, int64(k-1000)
	}
	rows.Spans = []Span{{Age: 40, From: 0, To: 1000}, {Age: 41, From: 1000, To: 2000}}
	o := yearOptions(1000)
	o.LastAge, o.Growth = 41, 0.25
	o.Bands = []Band{{40, 41}}
	s, err := one(t, o, rows)
	if err != nil {
		t.Fatal(err)
	}
	mean, n := find(t, s.Table(), Everyone, -1, "income", "mean", 0)
	near(t, "mean", mean.Value, 3.4/1.8, 1e-14)
	if n != 1000 {
		t.Errorf("%d households, want 1000", n)
	}
	none, _ := find(t, s.Table(), Everyone, -1, "assets", "share_nonpositive", 0)
	near(t, "share without assets", none.Value, 0.8/1.8, 1e-14)
	if b := s.Bands(); b[0].MeanAssets.Value != 1-none.Value {
		t.Errorf("mean assets of the band %v, want %v", b[0].MeanAssets.Value, 1-none.Value)
	}
	var text bytes.Buffer
	if err := s.Table().WriteText(&text); err != nil || !bytes.Contains(text.Bytes(), []byte("(1 + 0.25)^-(a - 40)")) {
		t.Errorf("no word of the weights: %v", err)
	}
}
