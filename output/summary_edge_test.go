package output

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"cistern/output/distribution"
	"cistern/output/stats"
)

// one runs a panel of a single block through a summary.
func one(t testing.TB, o SummaryOptions, rows *SummaryRows) (*Summary, error) {
	t.Helper()
	s, err := NewSummary(o)
	if err != nil {
		t.Fatal(err)
	}
	for more := true; more; {
		commit, err := s.Add(0, rows)
		if err == nil && commit != nil {
			err = commit()
		}
		if err != nil {
			return s, err
		}
		if more, err = s.EndPass(); err != nil {
			return s, err
		}
	}
	return s, nil
}

// year returns n rows of one age and group with the given values.
func year(n int, of func(k int) (income, consumption, assets, twin float64)) *SummaryRows {
	r := &SummaryRows{N: n, Spans: []Span{{Age: 40, Group: 0, From: 0, To: n}}}
	for k := range n {
		i, c, a, w := of(k)
		r.Household = append(r.Household, int64(k))
		r.Income, r.Consumption = append(r.Income, i), append(r.Consumption, c)
		r.Assets, r.TwinAssets = append(r.Assets, a), append(r.TwinAssets, w)
	}
	return r
}

func yearOptions(n int) SummaryOptions {
	return SummaryOptions{FirstAge: 40, LastAge: 40, Groups: []string{"clerks"}, Households: int64(n), Percentiles: []float64{10, 50, 90}, By: []Dimension{ByAge}, Workers: 1}
}

// TestSummaryConstant: a constant has no spread, to the bit, however large it is.
func TestSummaryConstant(t *testing.T) {
	s, err := one(t, yearOptions(1000), year(1000, func(int) (float64, float64, float64, float64) { return 123456.7, 0.1, 0, 0 }))
	if err != nil {
		t.Fatal(err)
	}
	table := s.Table()
	for variable, want := range map[string]float64{"income": 123456.7, "consumption": 0.1, "assets": 0} {
		mean, _ := find(t, table, Everyone, 40, variable, "mean", 0)
		sd, _ := find(t, table, Everyone, 40, variable, "sd", 0)
		median, _ := find(t, table, Everyone, 40, variable, "percentile", 50)
		if mean.Value != want || mean.StandardError != 0 || sd.Value != 0 || median.Value != want || median.Lower != want || median.Upper != want {
			t.Errorf("%s: mean %+v, sd %+v, median %+v", variable, mean, sd, median)
		}
	}
	if g, _ := find(t, table, Everyone, 40, "assets", "gini", 0); !math.IsNaN(g.Value) {
		t.Errorf("gini of zeros is %v, want none", g.Value)
	}
	if g, _ := find(t, table, Everyone, 40, "income", "gini", 0); math.Abs(g.Value) > 1e-12 {
		t.Errorf("gini of equals is %v, want 0", g.Value)
	}
}

// TestSummaryPaired: precautionary assets have the error of the paired
// difference. derived: assets = common + own, twin = common, so the difference
// has mean 10 and the sd of own, 1, against 50 in either; 64 groups know an
// error to 9 %, four times that is allowed.
func TestSummaryPaired(t *testing.T) {
	const n = 6400
	r := rand.New(rand.NewPCG(1, 1))
	s, err := one(t, yearOptions(n), year(n, func(int) (float64, float64, float64, float64) {
		common := 100 + 50*r.NormFloat64()
		return 1, 1, common + 10 + r.NormFloat64(), common
	}))
	if err != nil {
		t.Fatal(err)
	}
	gap, _ := find(t, s.Table(), Everyone, 40, "precautionary_assets", "mean", 0)
	near(t, "precautionary assets", gap.Value, 10, 4/math.Sqrt(n))
	near(t, "its error", gap.StandardError*math.Sqrt(n), 1, 0.36)
	level, _ := find(t, s.Table(), Everyone, 40, "assets", "mean", 0)
	if gap.StandardError > level.StandardError/20 {
		t.Errorf("paired error %v, error of mean assets %v: want a fiftieth", gap.StandardError, level.StandardError)
	}
	share, _ := find(t, s.Table(), Everyone, 40, "precautionary_assets", "share_of_mean_assets", 0)
	near(t, "share", share.Value, gap.Value/level.Value, 1e-15)
	if !(share.Lower < share.Value && share.Value < share.Upper && share.StandardError > 0) {
		t.Errorf("share of mean assets has no error: %+v", share)
	}
}

// TestSummaryClosedForms: derived: lognormal(0, σ) mean exp(σ²/2), Gini
// 2Φ(σ/√2) − 1, quantiles exp(σz); normal(100, 15) for assets. Four standard
// errors, as the summary states them, are allowed.
func TestSummaryClosedForms(t *testing.T) {
	const n, sigma = 20000, 0.7
	for _, budget := range []int64{0, 1 << 16} {
		r := rand.New(rand.NewPCG(9, 9))
		o := yearOptions(n)
		o.MemoryBudget = budget
		s, err := one(t, o, year(n, func(int) (float64, float64, float64, float64) {
			return math.Exp(sigma * r.NormFloat64()), 1, 100 + 15*r.NormFloat64(), 0
		}))
		if err != nil {
			t.Fatal(err)
		}
		if several := s.Passes() > 1; several != (budget > 0) {
			t.Errorf("budget %d: %d passes", budget, s.Passes())
		}
		for _, tt := range []struct {
			variable, statistic string
			level, want         float64
		}{
			{"income", "mean", 0, math.Exp(sigma * sigma / 2)},
			{"income", "gini", 0, math.Erf(sigma / 2)},
			{"income", "percentile", 10, math.Exp(-1.2815515655446004 * sigma)},
			{"income", "percentile", 50, 1},
			{"assets", "mean", 0, 100},
			{"assets", "sd", 0, 15},
			{"assets", "percentile", 90, 100 + 15*1.2815515655446004},
			{"assets", "gini", 0, 0.15 / math.Sqrt(math.Pi)},
		} {
			e, _ := find(t, s.Table(), Everyone, 40, tt.variable, tt.statistic, tt.level)
			near(t, fmt.Sprintf("%s %s %v", tt.variable, tt.statistic, tt.level), e.Value, tt.want, 4*e.StandardError)
			if !(e.StandardError > 0 && e.Lower < e.Value && e.Value < e.Upper) || e.StandardError > 0.03*tt.want {
				t.Errorf("%s %s: %+v is no useful interval", tt.variable, tt.statistic, e)
			}
		}
	}
}

// TestSummaryCovers repeats small panels: the 95 % intervals of the table hold
// the truth in 95 % of them, within 1.5 percentage points; those of percentiles
// are exact or wider. Two ages of the same households are pooled, so rows are
// not independent. derived: income is lognormal with the household's own level
// and consumption normal.
func TestSummaryCovers(t *testing.T) {
	if testing.Short() {
		t.Skip("many small panels")
	}
	const panels, n, sigma = 2000, 400, 0.5
	mean := math.Exp(sigma * sigma / 2)
	truth := map[string]float64{"mean": mean, "gini": math.Erf(sigma / 2), "percentile": 1,
		"sd": 2, "share_at_limit": 0.2}
	for _, pooled := range []bool{false, true} {
		hits := map[string]int{}
		for panel := range panels {
			r := rand.New(rand.NewPCG(11, uint64(panel)))
			o := yearOptions(n)
			o.Percentiles = []float64{50}
			rows := year(n, func(int) (float64, float64, float64, float64) {
				return math.Exp(sigma * r.NormFloat64()), 10 + 2*r.NormFloat64(), 1, 1
			})
			for range n {
				rows.AtLimit = append(rows.AtLimit, r.Float64() < 0.2)
			}
			age := 40
			if pooled {
				o.LastAge, o.By, age = 41, nil, -1
				rows.N *= 2
				rows.Spans = append(rows.Spans, Span{Age: 41, Group: 0, From: n, To: 2 * n})
				rows.Household = append(rows.Household, rows.Household...)
				rows.Income, rows.Consumption = append(rows.Income, rows.Income...), append(rows.Consumption, rows.Consumption...)
				rows.Assets, rows.TwinAssets = append(rows.Assets, rows.Assets...), append(rows.TwinAssets, rows.TwinAssets...)
				rows.AtLimit = append(rows.AtLimit, rows.AtLimit...)
			}
			s, err := one(t, o, rows)
			if err != nil {
				t.Fatal(err)
			}
			table := s.Table()
			for statistic, want := range truth {
				variable := "income"
				switch statistic {
				case "sd":
					variable = "consumption"
				case "share_at_limit":
					variable = "assets"
				}
				if e, _ := find(t, table, Everyone, age, variable, statistic, 0); e.Lower <= want && want <= e.Upper {
					hits[statistic]++
				}
			}
		}
		for statistic := range truth {
			rate := float64(hits[statistic]) / panels
			t.Logf("pooled %v, %s: %.3f", pooled, statistic, rate)
			most := 0.965
			if statistic == "percentile" || statistic == "share_at_limit" {
				most = 0.98 // whole ranks and numbers: 95 % or more
			}
			if rate < 0.935 || rate > most {
				t.Errorf("coverage of %s, pooled %v = %v, want 0.935 to %v", statistic, pooled, rate, most)
			}
		}
	}
}

// TestSummaryDimensions: without age the years are pooled, without group only
// everybody is there; bands hold what the ages hold.
func TestSummaryDimensions(t *testing.T) {
	w := smallTown
	o := w.options()
	for _, tt := range []struct {
		by           []Dimension
		groups, ages int
	}{{nil, 1, 0}, {[]Dimension{ByAge}, 1, 20}, {[]Dimension{ByGroup}, 4, 0}, {[]Dimension{ByGroup, ByAge}, 4, 20}} {
		o.By = tt.by
		table := w.run(t, o).Table()
		groups, ages := map[string]bool{}, map[int64]bool{}
		for i := range table.Len() {
			groups[table.Column("group").Strings[i]] = true
			if a := table.Column("age"); !a.IsMissing(i) {
				ages[a.Ints[i]] = true
			}
		}
		if len(groups) != tt.groups || len(ages) != tt.ages || !groups[Everyone] {
			t.Errorf("by %v: %d groups and %d ages, want %d and %d", tt.by, len(groups), len(ages), tt.groups, tt.ages)
		}
	}
}

// TestBands compares a band with the plain statistics of its household-years.
func TestBands(t *testing.T) {
	w := smallTown
	s := w.run(t, w.options())
	bands := s.Bands()
	if len(bands) != 4*2 {
		t.Fatalf("%d bands, want 2 of 4 groups", len(bands))
	}
	b := bands[len(bands)-1] // everybody, 35-44
	var held, spent []float64
	for age := 35; age <= 44; age++ {
		held = append(held, w.values(age, -1, func(r *SummaryRows) []float64 { return r.Assets })...)
		spent = append(spent, w.values(age, -1, func(r *SummaryRows) []float64 { return r.Consumption })...)
	}
	slices.Sort(held)
	if b.Band.String() != "35-44" || b.Group != Everyone || b.Years != int64(len(held)) {
		t.Fatalf("band %v of %s with %d years, want 35-44 of all with %d", b.Band, b.Group, b.Years, len(held))
	}
	if n := len(w.values(35, -1, func(r *SummaryRows) []float64 { return r.Assets })); b.Households != int64(n) {
		t.Errorf("%d households, want %d", b.Households, n)
	}
	if want := stats.Quantile(held, 0.5, stats.Type7); b.MedianAssets.Value != want {
		t.Errorf("median %v, want %v", b.MedianAssets.Value, want)
	}
	near(t, "mean assets", b.MeanAssets.Value, stats.Mean(held), 1e-9*stats.Mean(held))
	near(t, "mean consumption", b.Consumption.Value, stats.Mean(spent), 1e-9*stats.Mean(spent))
	// derived: a household's consumption is nearly the same every year, so ten
	// years tell little more than one: errors far above those of independent rows.
	if naive := stats.SD(spent) / math.Sqrt(float64(len(spent))); b.Consumption.StandardError < 2*naive {
		t.Errorf("error of mean consumption %v, of independent rows %v: years of a household are alike", b.Consumption.StandardError, naive)
	}
	table := s.BandTable(Everyone, "crown")
	if err := table.Validate(); err != nil || table.Len() != 2 || table.Column("ages").Strings[1] != "35-44" {
		t.Errorf("table of %d bands: %v", table.Len(), err)
	}
	if got := table.Column("precautionary_error").Floats[1]; got != b.Precautionary.StandardError || !(got > 0) {
		t.Errorf("precautionary error %v, want %v", got, b.Precautionary.StandardError)
	}
}

// TestSummaryRefuses: what the simulation or a caller can get wrong is an error.
func TestSummaryRefuses(t *testing.T) {
	good := func() *SummaryRows {
		return year(10, func(k int) (float64, float64, float64, float64) { return 1, 2, float64(k), 4 })
	}
	for name, tt := range map[string]struct {
		spoil func(*SummaryRows)
		want  string
	}{
		"nan":         {func(r *SummaryRows) { r.Assets[3] = math.NaN() }, "not finite"},
		"infinite":    {func(r *SummaryRows) { r.Income[9] = math.Inf(1) }, "not finite"},
		"nan twin":    {func(r *SummaryRows) { r.TwinAssets[0] = math.NaN() }, "not finite"},
		"age":         {func(r *SummaryRows) { r.Spans[0].Age = 41 }, "age 41"},
		"group":       {func(r *SummaryRows) { r.Spans[0].Group = 1 }, "group 1"},
		"short":       {func(r *SummaryRows) { r.Consumption = r.Consumption[:9] }, "consumption has 9 rows"},
		"short limit": {func(r *SummaryRows) { r.AtLimit = make([]bool, 3) }, "at_limit has 3 rows"},
		"gap":         {func(r *SummaryRows) { r.Spans[0].From = 1 }, "follows row 0"},
		"uncovered":   {func(r *SummaryRows) { r.Spans[0].To = 9 }, "cover 9 rows of 10"},
	} {
		for _, budget := range []int64{0, 64} {
			rows := good()
			tt.spoil(rows)
			o := yearOptions(10)
			o.MemoryBudget = budget
			s, err := one(t, o, rows)
			if err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("%s: error %v, want one about %q", name, err, tt.want)
			}
			if _, err2 := s.Add(0, good()); err2 == nil {
				t.Errorf("%s: the summary goes on after an error", name)
			}
		}
	}
}

// TestSummaryOtherRows: later passes over other rows are noticed.
func TestSummaryOtherRows(t *testing.T) {
	o := yearOptions(2000)
	o.MemoryBudget = 1 << 14
	s, err := NewSummary(o)
	if err != nil {
		t.Fatal(err)
	}
	shift := 0.0
	for more := true; more; shift++ {
		commit, err := s.Add(0, year(2000, func(k int) (float64, float64, float64, float64) { return 1, 2, 1000*shift + float64(k), 4 }))
		if err == nil && commit != nil {
			err = commit()
		}
		if err == nil {
			more, err = s.EndPass()
		}
		if err != nil {
			if !errors.Is(err, distribution.ErrPassesDiffer) {
				t.Errorf("error %v, want %v", err, distribution.ErrPassesDiffer)
			}
			return
		}
	}
	t.Error("other rows went unnoticed")
}

func TestSummaryOptions(t *testing.T) {
	bad := SummaryOptions{FirstAge: 30, LastAge: 20, Groups: []string{"all"}, Percentiles: []float64{0, 50, 50, math.NaN()},
		By: []Dimension{ByAge, ByAge, 7}, Bands: []Band{{10, 5}}, MemoryBudget: -1}
	err := bad.Validate()
	if err == nil {
		t.Fatal("accepted")
	}
	for _, want := range []string{"ages 30 to 20", `called "all"`, "households is 0", "percentile 0", "percentile 50 stands twice",
		"percentile NaN", "by age", "by Dimension(7)", "age band 10-5", "workers is 0", "budget of -1"} {
		if !strings.Contains(err.Error(), want) {
			t.Errorf("no word of %q in: %v", want, err)
		}
	}
	if bands := DefaultBands(25, 100); len(bands) != 8 || bands[0].String() != "25-34" || bands[7].String() != "95-100" {
		t.Errorf("default bands %v", bands)
	}
}

// TestSummaryOrder: sums depend on the order of blocks, so commits out of order
// are refused.
func TestSummaryOrder(t *testing.T) {
	w := smallTown
	s, err := NewSummary(w.options())
	if err != nil {
		t.Fatal(err)
	}
	first, err1 := s.Add(0, w.block(0))
	second, err2 := s.Add(0, w.block(w.unit))
	if err1 != nil || err2 != nil {
		t.Fatal(err1, err2)
	}
	if err := second(); err != nil {
		t.Fatal(err)
	}
	if err := first(); err == nil || !strings.Contains(err.Error(), "committed after") {
		t.Errorf("commits out of order: %v", err)
	}
}

// TestSummaryMethod: whether values are held does not depend on the workers.
func TestSummaryMethod(t *testing.T) {
	w := smallTown
	w.households = 1
	rows := w.block(0)
	o := w.options()
	o.MemoryBudget = 1 << 20
	held := func(workers int, households int64) bool {
		o.Workers, o.Households = workers, households
		s, err := NewSummary(o)
		if err != nil {
			t.Fatal(err)
		}
		commit, err := s.Add(0, rows)
		if err != nil {
			t.Fatal(err)
		}
		if err := commit(); err != nil {
			t.Fatal(err)
		}
		more, err := s.EndPass()
		if err != nil {
			t.Fatal(err)
		}
		return !more
	}
	if !held(1, 100) || held(1, 10000) {
		t.Fatal("the budget does not decide between 100 and 10000 households")
	}
	for households := int64(100); households < 10000; households += 100 {
		if held(1, households) != held(64, households) {
			t.Errorf("%d households: held by one worker %v, by 64 %v", households, held(1, households), held(64, households))
		}
	}
}

// TestSummaryColumns: an optional column is in all blocks or in none.
func TestSummaryColumns(t *testing.T) {
	w := smallTown
	s, err := NewSummary(w.options())
	if err != nil {
		t.Fatal(err)
	}
	if _, err := s.Add(0, w.block(0)); err != nil {
		t.Fatal(err)
	}
	rows := *w.block(w.unit)
	rows.TwinAssets = nil
	if _, err := s.Add(0, &rows); err == nil || !strings.Contains(err.Error(), "some blocks only") {
		t.Errorf("twins in one block of two: %v", err)
	}
}
