package contrast

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"cistern/output"
	"cistern/output/stats"
)

// village is a population of two groups and three ages in which assets and
// consumption are random and an event takes from both.
type village struct {
	o    Options
	rows []*Rows // by block
}

const blockOf = 100

// newVillage has years −1 … 3; households of age 20 to 49 live through all of them
// but one in ten, who dies after year 1.
func newVillage(households int, weighted bool, change func(o *Options)) *village {
	v := &village{o: Options{FirstYear: -1, LastYear: 3, Groups: []string{"dockers", "clerks"}, Bands: []output.Band{{First: 20, Last: 29}, {First: 30, Last: 39}},
		Percentiles: []float64{10, 50, 90}, RunwayMonths: []float64{3, 6}, DryMonths: 5, Worst: []float64{5, 20}, Within: 0.05,
		Households: int64(households), RowsAYear: int64(households), Weighted: weighted, Workers: 1}}
	if change != nil {
		change(&v.o)
	}
	random := rand.New(rand.NewPCG(1, 2))
	for first := 0; first < households; first += blockOf {
		r := &Rows{First: int64(first), Households: min(blockOf, households-first)}
		type person struct {
			group, age   int
			assets, cost float64
		}
		people := make([]person, r.Households)
		for i := range people {
			people[i] = person{random.IntN(2), 20 + random.IntN(30), math.Exp(2 + random.NormFloat64()), math.Exp(1 + random.NormFloat64()/4)}
			if random.IntN(10) == 0 {
				people[i].assets = 0
			}
		}
		for year := -1; year <= 3; year++ {
			for i, p := range people {
				if year > 1 && i%10 == 0 {
					continue
				}
				weight := 1.0
				if weighted {
					weight = math.Pow(1.02, float64(-p.age))
				}
				k := len(r.Household)
				r.Spans = append(r.Spans, Span{Year: year, Group: p.group, Age: p.age, Weight: weight, Working: p.age < 45, From: k, To: k + 1})
				r.Household = append(r.Household, int64(first+i))
				c, a := p.cost*math.Exp(random.NormFloat64()/10), p.assets*math.Exp(random.NormFloat64()/10)
				d, b := c, a
				if year >= 0 && random.IntN(3) > 0 {
					d, b = c*(1-0.4*random.Float64()/float64(1+year)), math.Max(0, a-random.ExpFloat64())
				}
				lost := random.IntN(10) == 0
				r.Usual.add(c+0.1, c, a, lost)
				r.Event.add(d+0.05, d, b, lost || year == 0)
			}
		}
		v.rows = append(v.rows, r)
	}
	return v
}

func (w *World) add(income, consumption, assets float64, lost bool) {
	w.Income, w.Consumption, w.Assets = append(w.Income, income), append(w.Consumption, consumption), append(w.Assets, assets)
	w.Lowest, w.JobLost = append(w.Lowest, -1), append(w.JobLost, lost)
}

// describe runs all passes.
func (v *village) describe(tb testing.TB) *Contrast {
	tb.Helper()
	c, err := New(v.o)
	if err != nil {
		tb.Fatal(err)
	}
	for more := true; more; {
		var commits []func() error
		for i := len(v.rows) - 1; i >= 0; i-- { // blocks are done in any order
			commit, err := c.Add(i%v.o.Workers, v.rows[i])
			if err != nil {
				tb.Fatal(err)
			}
			commits = append(commits, commit)
		}
		for i := len(commits) - 1; i >= 0; i-- { // and committed in their own
			if err := commits[i](); err != nil {
				tb.Fatal(err)
			}
		}
		if more, err = c.EndPass(); err != nil {
			tb.Fatal(err)
		}
	}
	return c
}

func (c *Contrast) find(tb testing.TB, k Key) Figure {
	tb.Helper()
	for _, f := range c.Figures() {
		if f.Key == k {
			return f
		}
	}
	tb.Fatalf("there is no figure %+v", k)
	return Figure{}
}

// household is a household's rows by year, for recomputing by hand.
type pair struct {
	id               int64
	weight           float64
	c, d, a, b       float64 // consumption and assets, usual and under the event
	working          bool
	lost, lost2      bool
	dry, dry2        bool
	far, far2, newly bool
}

// pairs returns the rows of one year, group and band, by the plainest means.
func (v *village) pairs(year, group int, band *output.Band) []pair {
	var list []pair
	for _, r := range v.rows {
		far := map[int64][3]bool{}
		for _, s := range r.Spans {
			k := s.From
			p := pair{id: r.Household[k], weight: s.Weight, c: r.Usual.Consumption[k], d: r.Event.Consumption[k], a: r.Usual.Assets[k], b: r.Event.Assets[k],
				working: s.Working, lost: r.Usual.JobLost[k], lost2: r.Event.JobLost[k]}
			p.dry, p.dry2 = (p.a+1)/(p.c/12) < v.o.DryMonths, (p.b+1)/(p.d/12) < v.o.DryMonths
			if s.Year >= 0 {
				f := far[p.id]
				far[p.id] = [3]bool{f[0] || p.dry, f[1] || p.dry2, f[2] || p.dry2 && !p.dry}
			}
			f := far[p.id]
			p.far, p.far2, p.newly = f[0], f[1], f[2]
			if s.Year == year && (group < 0 || s.Group == group) && (band == nil || s.Age >= band.First && s.Age <= band.Last) {
				list = append(list, p)
			}
		}
	}
	return list
}

// byHand is a mean over pairs with the grouped jackknife, done plainly.
func byHand(list []pair, of func(p pair) (x float64, in bool)) (value, se float64) {
	mean := func(without int64) (float64, float64) {
		sum, n := 0.0, 0.0
		for _, p := range list {
			if x, in := of(p); in && p.id%64 != without {
				sum += p.weight * x
				n += p.weight
			}
		}
		return sum / n, n
	}
	value, n := mean(-1)
	var left, sizes []float64
	for g := range int64(64) {
		m, rest := mean(g)
		left, sizes = append(left, m), append(sizes, n-rest)
	}
	se, _ = stats.Jackknife(value, left, sizes)
	return value, se
}

func is(b bool) (float64, bool) { return one(b), true }

// Means, shares, differences and shortfalls with their errors, recomputed row by row
// from their definitions, with weights and without, for groups, bands and all.
func TestFiguresByHand(t *testing.T) {
	for _, weighted := range []bool{false, true} {
		v := newVillage(1500, weighted, nil)
		c := v.describe(t)
		for _, at := range []struct {
			group int
			band  *output.Band
		}{{-1, nil}, {1, nil}, {-1, &v.o.Bands[1]}, {0, &v.o.Bands[0]}} {
			group, ages := "all", "all"
			if at.group >= 0 {
				group = v.o.Groups[at.group]
			}
			if at.band != nil {
				ages = at.band.String()
			}
			for _, year := range []int{-1, 0, 1, 3} {
				list := v.pairs(year, at.group, at.band)
				check := func(world, variable, statistic string, level float64, of func(p pair) (float64, bool)) {
					t.Helper()
					f := c.find(t, Key{year, world, group, ages, variable, statistic, level})
					value, se := byHand(list, of)
					if math.Abs(f.Value-value) > 1e-10*(1+math.Abs(value)) || math.Abs(f.StandardError-se) > 1e-8*(1+se) {
						t.Errorf("weighted %v: %+v: %.10g ± %.6g, by hand %.10g ± %.6g", weighted, f.Key, f.Value, f.StandardError, value, se)
					}
					if f.Households != int64(len(list)) {
						t.Errorf("%+v: %d households, by hand %d", f.Key, f.Households, len(list))
					}
				}
				check(Baseline, "consumption", "mean", 0, func(p pair) (float64, bool) { return p.c, true })
				check(Stress, "assets", "mean", 0, func(p pair) (float64, bool) { return p.b, true })
				check(Difference, "assets", "mean", 0, func(p pair) (float64, bool) { return p.b - p.a, true })
				check(Difference, "income", "mean", 0, func(p pair) (float64, bool) { return p.d + 0.05 - p.c - 0.1, true })
				check(Difference, "consumption_shortfall", "mean", 0, func(p pair) (float64, bool) { return math.Max(0, p.c-p.d), true })
				check(Difference, "relative_shortfall", "mean", 0, func(p pair) (float64, bool) { return math.Max(0, 1-p.d/p.c), true })
				check(Baseline, "job_loss", "share", 0, func(p pair) (float64, bool) { return one(p.lost), p.working })
				check(Difference, "job_loss", "share", 0, func(p pair) (float64, bool) { return one(p.lost2) - one(p.lost), p.working })
				check(Stress, "dry", "share", 0, func(p pair) (float64, bool) { return is(p.dry2) })
				check(Difference, "dry", "share_so_far", 0, func(p pair) (float64, bool) { return one(p.far2) - one(p.far), true })
				check(Stress, "newly_dry", "share", 0, func(p pair) (float64, bool) { return is(p.dry2 && !p.dry) })
				check(Stress, "newly_dry", "share_so_far", 0, func(p pair) (float64, bool) { return is(p.newly) })
				for _, months := range v.o.RunwayMonths {
					check(Stress, "runway_months", "share_below", months, func(p pair) (float64, bool) { return is(p.b/(p.d/12) < months) })
					check(Difference, "runway_months", "share_below", months, func(p pair) (float64, bool) {
						return one(p.b/(p.d/12) < months) - one(p.a/(p.c/12) < months), true
					})
				}
				if !weighted {
					checkDistribution(t, c, list, Key{Year: year, Group: group, Ages: ages})
				}
			}
		}
	}
}

// checkDistribution recomputes percentiles and expected shortfalls of equal weights
// from sorted rows.
func checkDistribution(t *testing.T, c *Contrast, list []pair, k Key) {
	t.Helper()
	sorted := func(of func(p pair) float64) []float64 {
		var x []float64
		for _, p := range list {
			x = append(x, of(p))
		}
		slices.Sort(x)
		return x
	}
	for _, v := range []struct {
		name         string
		usual, event func(p pair) float64
	}{{"assets", func(p pair) float64 { return p.a }, func(p pair) float64 { return p.b }},
		{"consumption", func(p pair) float64 { return p.c }, func(p pair) float64 { return p.d }},
		{"runway_months", func(p pair) float64 { return 12 * p.a / p.c }, func(p pair) float64 { return 12 * p.b / p.d }}} {
		for _, level := range []float64{10, 50, 90} {
			k.Variable, k.Statistic, k.Level = v.name, "percentile", level
			a, b := stats.Quantile(sorted(v.usual), level/100, stats.Type7), stats.Quantile(sorted(v.event), level/100, stats.Type7)
			for world, want := range map[string]float64{Baseline: a, Stress: b, Difference: b - a} {
				k.World = world
				if f := c.find(t, k); math.Abs(f.Value-want) > 1e-12*(1+math.Abs(want)) {
					t.Errorf("%+v: %.12g, by hand %.12g", k, f.Value, want)
				}
			}
		}
	}
	falls := sorted(func(p pair) float64 { return p.d - p.c })
	k.World, k.Variable, k.Statistic, k.Level = Difference, "consumption_shortfall", "expected_shortfall", 20
	if f, want := c.find(t, k), -stats.ExpectedShortfall(falls, 0.2); math.Abs(f.Value-want) > 1e-10 || !(f.Lower <= f.Value && f.Value <= f.Upper) {
		t.Errorf("%+v: %+v, by hand %.12g", k, f.Estimate, want)
	}
}

// The error of a difference of percentiles, recomputed from the errors of the two
// and the correlation of the indicators (package comment), every household weighed
// by the square of its weight as variances are.
func TestPercentileGapByHand(t *testing.T) {
	for _, weighted := range []bool{false, true} {
		v := newVillage(1500, weighted, nil)
		c := v.describe(t)
		k := Key{Year: 1, Group: "all", Ages: "all", Variable: "assets", Statistic: "percentile", Level: 90}
		at := func(world string) Figure { k.World = world; return c.find(t, k) }
		usual, event, gap := at(Baseline), at(Stress), at(Difference)
		var cross, a, b float64
		for _, p := range v.pairs(1, -1, nil) {
			i, j := one(p.a <= usual.Value)-0.9, one(p.b <= event.Value)-0.9
			cross, a, b = cross+p.weight*p.weight*i*j, a+p.weight*p.weight*i*i, b+p.weight*p.weight*j*j
		}
		s, r := usual.StandardError, event.StandardError
		want := math.Sqrt(s*s + r*r - 2*cross/math.Sqrt(a*b)*s*r)
		if math.Abs(gap.StandardError-want) > 1e-9*want || math.Abs(gap.Upper-gap.Value-1.959963984540054*want) > 1e-9 || !(want < s) {
			t.Errorf("weighted %v: error %.10g, by hand %.10g; of the two %.3g and %.3g", weighted, gap.StandardError, want, s, r)
		}
	}
}

// Recoveries of mean and median, recomputed from the figures of every year from the
// event's on, and shares of households from what happened to each.
func TestRecoveriesByHand(t *testing.T) {
	v := newVillage(1500, false, func(o *Options) { o.Within = 0.08 })
	c := v.describe(t)
	for _, tt := range []struct {
		statistic string
		of        Key
	}{{"years_to_recover_mean", Key{Statistic: "mean"}}, {"years_to_recover_median", Key{Statistic: "percentile", Level: 50}}} {
		k := tt.of
		k.Group, k.Ages, k.Variable = "clerks", "30-39", "consumption"
		want := 4.0
		for k.Year = 3; k.Year >= 0; k.Year-- {
			k.World = Difference
			gap := c.find(t, k)
			k.World = Baseline
			if math.Abs(gap.Value) > 0.08*c.find(t, k).Value {
				break
			}
			want = float64(k.Year)
		}
		got := c.find(t, Key{NoYear, Difference, "clerks", "30-39", "consumption", tt.statistic, 8})
		if got.Value != want || want == 0 || want == 4 || !(got.Lower <= want && got.Upper >= want) {
			t.Errorf("%s: %+v, by hand %v", tt.statistic, got.Estimate, want)
		}
	}
	there, ever := 0.0, 0.0
	outside := map[int64]bool{}
	for year := 0; year <= 3; year++ {
		for _, p := range v.pairs(year, -1, nil) {
			if year == 0 {
				there++
			}
			outside[p.id] = outside[p.id] || math.Abs(p.b-p.a) > 0.08*math.Max(p.a, p.c)
		}
	}
	for _, o := range outside {
		ever += one(o)
	}
	if f := c.find(t, Key{NoYear, Difference, "all", "all", "assets", "share_affected", 8}); math.Abs(f.Value-ever/there) > 1e-12 || f.Households != int64(there) {
		t.Errorf("share affected %+v, by hand %v of %v", f, ever, there)
	}
}

// The same figures to the bit, whatever the number of workers and however many lots
// the years are described in.
func TestLotsAndWorkersDoNotMatter(t *testing.T) {
	for _, weighted := range []bool{false, true} {
		want := newVillage(1000, weighted, nil).describe(t)
		got := newVillage(1000, weighted, func(o *Options) { o.Workers, o.Budget = 3, 2*1000*o.bytesPerRow() }).describe(t)
		if want.Passes() != 3 || got.Passes() != 7 {
			t.Errorf("%d and %d passes, want 3 and 7: those made and one", want.Passes(), got.Passes())
		}
		if a, b := fmt.Sprint(want.Figures()), fmt.Sprint(got.Figures()); a != b {
			t.Error("three lots give other figures than one")
		}
	}
}

// An event that changes nothing: every difference is exactly 0 with an error of
// exactly 0, nothing is newly dry and nobody needs to recover.
func TestNoDifference(t *testing.T) {
	for _, weighted := range []bool{false, true} {
		v := newVillage(800, weighted, nil)
		for _, r := range v.rows {
			r.Event = r.Usual
		}
		n := 0
		for _, f := range v.describe(t).Figures() {
			switch {
			case f.Statistic == "household_share_recovered" || f.Statistic == "household_years_to_recover_median":
				if !math.IsNaN(f.Value) {
					t.Errorf("%+v: %v of nobody", f.Key, f.Value)
				}
			case f.World == Difference:
				if n++; f.Value != 0 || f.StandardError != 0 && !math.IsNaN(f.StandardError) || math.Signbit(f.Value) {
					t.Errorf("%+v: %+v", f.Key, f.Estimate)
				}
				if math.IsNaN(f.StandardError) != strings.HasPrefix(f.Statistic, "years_to_recover") {
					t.Errorf("%+v: error %v", f.Key, f.StandardError)
				}
			case f.Variable == "newly_dry" && f.Value != 0:
				t.Errorf("%+v: %v", f.Key, f.Value)
			}
		}
		if n < 500 {
			t.Errorf("only %d differences", n)
		}
	}
}

// The interval of a difference of percentiles holds the true difference in about
// 95 % of repeated samples, and its error is the spread of the estimates, whether
// the two worlds hang together closely, loosely or not at all. True percentiles:
// normal law. Tolerances: 4 binomial standard errors of 2000 repetitions, 2 % for
// an interval that comes from order statistics of 400 households.
func TestCoverageOfPercentileDifferences(t *testing.T) {
	if testing.Short() {
		t.Skip("thousands of samples")
	}
	const repetitions, households = 2000, 400
	for _, rho := range []float64{0, 0.7, 0.99} {
		random := rand.New(rand.NewPCG(7, 9))
		levels := []float64{10, 50, 90}
		hits := make([]float64, len(levels))
		var se, square, mean [3]float64
		for range repetitions {
			v := &village{o: Options{Groups: []string{"g"}, Percentiles: levels, DryMonths: 1, Within: 0.1, Households: households, RowsAYear: households, Workers: 1}}
			r := &Rows{Households: households, Spans: []Span{{Weight: 1, To: households}}}
			for i := range households {
				x := random.NormFloat64()
				r.Household = append(r.Household, int64(i))
				r.Usual.add(1, 1, x, false)
				r.Event.add(1, 1, 0.8*(rho*x+math.Sqrt(1-rho*rho)*random.NormFloat64())-1, false)
			}
			v.rows = []*Rows{r}
			c := v.describe(t)
			for k, z := range []float64{-1.2815515655446004, 0, 1.2815515655446004} {
				e := c.results[0][0].gaps[0][k]
				true_ := -0.2*z - 1
				if e.Lower <= true_ && true_ <= e.Upper {
					hits[k]++
				}
				se[k] += e.StandardError
				mean[k] += e.Value
				square[k] += e.Value * e.Value
			}
		}
		for k, level := range levels {
			coverage := hits[k] / repetitions
			spread := math.Sqrt(square[k]/repetitions - mean[k]*mean[k]/repetitions/repetitions)
			ratio := se[k] / repetitions / spread
			t.Logf("correlation %v, percentile %v: coverage %.3f, mean error over spread %.3f", rho, level, coverage, ratio)
			if math.Abs(coverage-0.95) > 4*math.Sqrt(0.95*0.05/repetitions)+0.02 || math.Abs(ratio-1) > 0.15 {
				t.Errorf("correlation %v, percentile %v: coverage %.3f, mean error over spread %.3f", rho, level, coverage, ratio)
			}
		}
	}
}

func TestOptionFaults(t *testing.T) {
	_, err := New(Options{FirstYear: 1, LastYear: 2, Groups: []string{"all"}, Bands: []output.Band{{First: 20, Last: 30}, {First: 30, Last: 40}},
		Percentiles: []float64{100}, RunwayMonths: []float64{3, 3}, Worst: []float64{0}, Within: math.NaN()})
	for _, want := range []string{"years 1 to 2", `none called "all"`, "ages 30-40", "percentile 100", "runway 3", "worst share 0", "dry runway 0", "nearness NaN", "0 households"} {
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("error %v has no %q", err, want)
		}
	}
}

// What is read from a table is what went in.
func TestReadTable(t *testing.T) {
	c := newVillage(300, false, nil).describe(t)
	if a, b := fmt.Sprint(ReadTable(c.Table())), fmt.Sprint(c.Figures()); a != b {
		t.Error("the figures read are not those written")
	}
}
