package survey

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/parquet-go/parquet-go"

	"cistern/output"
	"cistern/output/stats"
)

// person is a row of a survey as another program might have written it: numbers of
// several widths, values missing here and there, columns that are no numbers.
type person struct {
	Person uint32              `parquet:"person"`
	Town   string              `parquet:"town,dict"`
	Sex    *string             `parquet:"sex,optional"`
	Year   int32               `parquet:"year"`
	Wealth *float64            `parquet:"wealth,optional"`
	Income float32             `parquet:"income"`
	Debts  int64               `parquet:"debts,decimal(2:18)"`
	Weight *float64            `parquet:"weight,optional"`
	Owner  bool                `parquet:"owner"`
	Asked  time.Time           `parquet:"asked,timestamp"`
	Notes  []string            `parquet:"notes,list"`
	Home   struct{ X float64 } `parquet:"home"`
}

func people(n int) []person {
	r := rand.New(rand.NewPCG(1, 2))
	list := make([]person, n)
	sexes := []string{"f", "m"}
	for i := range list {
		w, g := math.Exp(r.NormFloat64())*1000-300, float64(1+r.IntN(5))
		p := person{Person: uint32(i/2) + 3_000_000_000, Town: []string{"quay", "hill", "mill"}[r.IntN(3)], Year: int32(2020 + r.IntN(2)), Wealth: &w,
			Income: float32(r.Float64() * 100), Debts: int64(r.IntN(1000)), Weight: &g, Owner: r.IntN(2) == 0, Sex: &sexes[r.IntN(2)]}
		if r.IntN(10) == 0 {
			p.Wealth = nil
		}
		if r.IntN(10) == 0 {
			p.Sex = nil
		}
		list[i] = p
	}
	return list
}

func write[T any](t *testing.T, path string, rows []T, options ...parquet.WriterOption) string {
	t.Helper()
	if err := os.MkdirAll(filepath.Dir(path), 0o777); err != nil {
		t.Fatal(err)
	}
	if err := parquet.WriteFile(path, rows, options...); err != nil {
		t.Fatal(err)
	}
	return path
}

func describe(t *testing.T, o Options) *output.Table {
	t.Helper()
	table, err := Describe(context.Background(), o)
	if err != nil {
		t.Fatal(err)
	}
	if err := table.Validate(); err != nil {
		t.Fatal(err)
	}
	return table
}

// find returns the estimate and the rows of a figure; keys are column, value pairs.
func find(t *testing.T, table *output.Table, variable, statistic string, level float64, keys ...string) (stats.Estimate, int64) {
	t.Helper()
rows:
	for i := range table.Len() {
		if table.Column("variable").Strings[i] != variable || table.Column("statistic").Strings[i] != statistic {
			continue
		}
		if l := table.Column("level"); l.IsMissing(i) != (level == 0) || level != 0 && l.Floats[i] != level {
			continue
		}
		for k := 0; k < len(keys); k += 2 {
			c := table.Column(keys[k])
			switch {
			case c.Kind == output.String && c.Strings[i] != keys[k+1],
				c.Kind == output.Int && (c.IsMissing(i) != (keys[k+1] == "")),
				c.Kind == output.Int && keys[k+1] != "" && c.Ints[i] != int64(keys[k+1][3]-'0')+2020:
				continue rows
			}
		}
		at := func(name string) float64 {
			if c := table.Column(name); !c.IsMissing(i) {
				return c.Floats[i]
			}
			return math.NaN()
		}
		return stats.Estimate{Value: at("estimate"), StandardError: at("standard_error"), Lower: at("lower"), Upper: at("upper")}, table.Column("rows").Ints[i]
	}
	t.Fatalf("no row %s %s %v %v", variable, statistic, level, keys)
	return stats.Estimate{}, 0
}

// The figures are those of the plain values, picked by hand, whatever their type,
// the number of files, of row groups and of workers.
func TestDescribe(t *testing.T) {
	const n = 4000
	list := people(n)
	dir := t.TempDir()
	var files []string
	for k, part := range [][]person{list[:1500], list[1500:1501], list[1501:]} {
		files = append(files, write(t, filepath.Join(dir, string(rune('a'+k))+".parquet"), part, parquet.MaxRowsPerRowGroup(700)))
	}
	o := Options{Files: files, Unit: "person", By: []string{"town", "year"}, Variables: []string{"wealth", "income", "debts", "owner"}, Percentiles: []float64{50, 90}, TopShares: []float64{10}, Workers: 1}
	table := describe(t, o)
	for _, budget := range []int64{0, 1 << 14} {
		o.Workers, o.Budget = 3, budget
		other := describe(t, o)
		for _, key := range [][]string{{"quay", "2021"}, {"all", "2020"}, {"hill", ""}, {"all", ""}} {
			var wealth, income, debts []float64
			owners, rows := 0.0, 0
			for _, p := range list {
				if key[0] != "all" && p.Town != key[0] || key[1] != "" && p.Year != int32(key[1][3]-'0')+2020 {
					continue
				}
				rows++
				if p.Wealth != nil {
					wealth = append(wealth, *p.Wealth)
				}
				income = append(income, float64(p.Income))
				debts = append(debts, float64(p.Debts)*0.01)
				if p.Owner {
					owners++
				}
			}
			at := []string{"town", key[0], "year", key[1]}
			for variable, x := range map[string][]float64{"wealth": wealth, "income": income, "debts": debts} {
				slices.Sort(x)
				for _, table := range []*output.Table{table, other} {
					e, count := find(t, table, variable, "mean", 0, at...)
					if want := stats.Mean(x); math.Abs(e.Value-want) > 1e-12*want || count != int64(len(x)) {
						t.Errorf("%v: mean %s is %v of %d rows, want %v of %d", key, variable, e.Value, count, want, len(x))
					}
					if e, _ := find(t, table, variable, "percentile", 90, at...); e.Value != stats.Quantile(x, 0.9, stats.Type7) {
						t.Errorf("%v: 90th percentile of %s is %v, want %v", key, variable, e.Value, stats.Quantile(x, 0.9, stats.Type7))
					}
					want, _ := stats.TopShare(x, nil, 0.1)
					if e, _ := find(t, table, variable, "top_share", 10, at...); math.Abs(e.Value-want) > 1e-10 {
						t.Errorf("%v: top share of %s is %v, want %v", key, variable, e.Value, want)
					}
				}
			}
			if e, _ := find(t, other, "owner", "mean", 0, at...); math.Abs(e.Value-owners/float64(rows)) > 1e-12 {
				t.Errorf("%v: %v own, want %v", key, e.Value, owners/float64(rows))
			}
		}
	}
	if note := strings.Join(table.Notes, " "); !strings.Contains(note, "rows have no value of wealth") {
		t.Errorf("notes %q", note)
	}
}

// Whole weights say the same as the long form, in which a row stands as often as its
// weight; rows without a value to be told apart are left out.
func TestWeights(t *testing.T) {
	list := people(3000)
	var long []person
	for _, p := range list {
		for range int(*p.Weight) {
			long = append(long, p)
		}
	}
	dir := t.TempDir()
	o := Options{By: []string{"sex"}, Variables: []string{"wealth", "income"}, Percentiles: []float64{10, 50}, Lorenz: []float64{50}, Shortfalls: []float64{5}, Tail: 5, Workers: 2}
	o.Files = []string{write(t, filepath.Join(dir, "long.parquet"), long)}
	want := describe(t, o)
	o.Files, o.Weight = []string{write(t, filepath.Join(dir, "short.parquet"), list)}, "weight"
	got := describe(t, o)
	for _, sex := range []string{"f", "m", "all"} {
		for _, f := range []struct {
			statistic string
			level     float64
			tolerance float64
		}{{"mean", 0, 1e-12}, {"percentile", 50, 2e-3}, {"gini", 0, 1e-3}, {"lorenz", 50, 1e-10}, {"expected_shortfall", 5, 1e-10}, {"share_nonpositive", 0, 1e-12}} {
			for _, v := range o.Variables {
				g, _ := find(t, got, v, f.statistic, f.level, "sex", sex)
				w, _ := find(t, want, v, f.statistic, f.level, "sex", sex)
				if math.Abs(g.Value-w.Value) > f.tolerance*math.Max(math.Abs(w.Value), 1e-3) {
					t.Errorf("%s: %s of %s is %v with weights, %v in long form", sex, f.statistic, v, g.Value, w.Value)
				}
				if v == "wealth" && f.statistic == "mean" && !(g.StandardError > w.StandardError) {
					t.Errorf("%s: the long form is no less certain: error %v, with weights %v", sex, w.StandardError, g.StandardError)
				}
			}
		}
	}
	if !strings.Contains(strings.Join(got.Notes, " "), "rows are left out: they lack a value of a column that is told apart") {
		t.Errorf("notes %q", got.Notes)
	}
}

// Rows of one unit are alike: an error that leaves out whole units says so.
func TestUnits(t *testing.T) {
	type row struct {
		ID int64
		X  float64
	}
	var rows []row
	r := rand.New(rand.NewPCG(5, 5))
	for i := range 2000 {
		x := r.NormFloat64()
		for range 4 {
			rows = append(rows, row{int64(i), x})
		}
	}
	file := write(t, filepath.Join(t.TempDir(), "x.parquet"), rows)
	alike, _ := find(t, describe(t, Options{Files: []string{file}, Unit: "ID", Variables: []string{"X"}, Percentiles: []float64{50}}), "X", "mean", 0)
	apart, _ := find(t, describe(t, Options{Files: []string{file}, Variables: []string{"X"}, Percentiles: []float64{50}}), "X", "mean", 0)
	if ratio := alike.StandardError / apart.StandardError; ratio < 1.6 || ratio > 2.4 { // derived: √4, known to 13 %
		t.Errorf("errors with and without units differ by %v, want about 2", ratio)
	}
}

func TestRefused(t *testing.T) {
	dir := t.TempDir()
	file := write(t, filepath.Join(dir, "a.parquet"), people(50))
	bad := people(50)
	nan, below := math.NaN(), -1.0
	bad[20].Wealth, bad[30].Weight, bad[40].Weight = &nan, &below, nil
	broken := write(t, filepath.Join(dir, "b.parquet"), bad)
	type other struct{ Wealth string }
	foreign := write(t, filepath.Join(dir, "c.parquet"), []other{{"a lot"}})
	empty := write(t, filepath.Join(dir, "d.parquet"), people(0))
	torn := filepath.Join(dir, "e.parquet")
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(torn, text[:len(text)/2], 0o666); err != nil {
		t.Fatal(err)
	}
	for _, tt := range []struct {
		name string
		o    Options
		want string
	}{
		{"missing column", Options{Files: []string{file}, Variables: []string{"welth"}}, "column welth is not there; it has person, town"},
		{"text", Options{Files: []string{file}, Variables: []string{"town"}}, "column town is text, want numbers"},
		{"time", Options{Files: []string{file}, Variables: []string{"asked"}}, "column asked is a time"},
		{"nested", Options{Files: []string{file}, Variables: []string{"home"}}, "column home is nested"},
		{"fractions apart", Options{Files: []string{file}, By: []string{"income"}}, "column income has fractions"},
		{"unit with fractions", Options{Files: []string{file}, Unit: "income"}, "column income has fractions"},
		{"apart twice", Options{Files: []string{file}, By: []string{"town", "town"}}, "told apart twice"},
		{"name of ours", Options{Files: []string{file}, By: []string{"rows"}}, "column of that name itself"},
		{"too many apart", Options{Files: []string{file}, By: []string{"town", "sex", "year", "owner", "person"}}, "want at most 4"},
		{"described twice", Options{Files: []string{file}, Variables: []string{"wealth", "wealth"}}, "described twice"},
		{"no number", Options{Files: []string{broken}, Variables: []string{"wealth"}}, "b.parquet: column wealth is NaN in row 21"},
		{"negative weight", Options{Files: []string{broken}, Variables: []string{"income"}, Weight: "weight"}, "column weight"},
		{"another file", Options{Files: []string{file, foreign}, Variables: []string{"wealth"}}, "c.parquet: column wealth is not there"},
		{"nothing", Options{Files: []string{empty}, Variables: []string{"wealth"}}, "no rows"},
		{"torn file", Options{Files: []string{torn}}, "e.parquet"},
		{"no file", Options{Files: []string{filepath.Join(dir, "f.parquet")}}, "f.parquet"},
		{"percentile", Options{Files: []string{file}, Percentiles: []float64{100}}, "percentiles is 100"},
		{"level twice", Options{Files: []string{file}, Lorenz: []float64{5, 5}}, "lorenz has 5 twice"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			if _, err := Describe(context.Background(), tt.o); err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("got %v, want %q", err, tt.want)
			}
		})
	}
	ctx, cancel := context.WithCancelCause(context.Background())
	ctrlC := errors.New("stopped")
	cancel(ctrlC)
	if _, err := Describe(ctx, Options{Files: []string{file}, Workers: 2}); !errors.Is(err, ctrlC) {
		t.Errorf("stopped: %v", err)
	}
}
