package interop

import (
	"context"
	"database/sql"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"cistern/output"
	"cistern/output/survey"
)

// odd is a survey as another engine writes it: numbers of many kinds, values that
// are missing, columns that are none of ours.
const odd = `select
	(i // 3)::uinteger as person,
	case when i %% 97 = 0 then null else ['quay', 'hill', 'mill'][1 + i %% 3] end as town,
	(2020 + i %% 4)::smallint as year,
	case when hash(i) %% 11 = 0 then null else exp(2 * (hash(i, 1) %% 1000003 / 1000003.0) ^ 3) * 1000 - 1500 end as wealth,
	(hash(i, 2) %% 100000 / 7.0)::float as income,
	(hash(i, 3) %% 1000000)::decimal(12, 2) / 4 as debts,
	(hash(i, 4) %% 250)::utinyint as boats,
	hash(i, 5) %% 2 = 0 as owner,
	(1 + hash(i, 6) %% 5)::double as weight,
	date '2020-01-01' + (i %% 100)::integer as asked,
	[i, i + 1] as list, {'a': i} as nested
	from range(%d) t(i)`

// Figures of files that another engine wrote are those that it finds itself: whole
// files and partitions, many row groups, one worker or several, values in memory or
// not.
func TestSurveyOfForeignFiles(t *testing.T) {
	db := open(t)
	dir := t.TempDir()
	run := func(format string, args ...any) {
		t.Helper()
		if _, err := db.Exec(fmt.Sprintf(format, args...)); err != nil {
			t.Fatal(err)
		}
	}
	source := fmt.Sprintf(odd, 60000)
	whole := filepath.Join(dir, "whole.parquet")
	run("copy (%s) to '%s' (format parquet, row_group_size 5000)", source, whole)
	parts := filepath.Join(dir, "parts")
	run("copy (select *, year as kept from (%s)) to '%s' (format parquet, partition_by (year))", source, parts)
	var files []string
	for _, match := range []string{"*/*.parquet"} {
		found, err := filepath.Glob(filepath.Join(parts, match))
		if err != nil || len(found) < 4 {
			t.Fatalf("%d files, %v", len(found), err)
		}
		files = found
	}
	for name, o := range map[string]survey.Options{
		"whole":       {Files: []string{whole}, By: []string{"town", "year"}, Unit: "person"},
		"in passes":   {Files: []string{whole}, By: []string{"town", "year"}, Workers: 3, Budget: 1 << 16},
		"partitioned": {Files: files, By: []string{"town", "kept"}, Workers: 2},
	} {
		o.Variables, o.Percentiles = []string{"wealth", "income", "debts", "boats", "owner"}, []float64{1, 50, 99.9}
		table, err := survey.Describe(context.Background(), o)
		if err != nil {
			t.Fatal(name, err)
		}
		path := filepath.Join(dir, "figures.parquet")
		if err := output.WriteFile(path, table.WriteParquet); err != nil {
			t.Fatal(err)
		}
		for _, v := range o.Variables {
			for statistic, own := range map[string]string{
				"s.statistic = 'mean'":                          "avg(%s)",
				"s.statistic = 'sd'":                            "stddev_samp(%s)",
				"s.statistic = 'percentile' and s.level = 1":    "quantile_cont(%s, 0.01)",
				"s.statistic = 'percentile' and s.level = 50":   "quantile_cont(%s, 0.5)",
				"s.statistic = 'percentile' and s.level = 99.9": "quantile_cont(%s, 0.999)",
				"s.statistic = 'share_nonpositive'":             "avg(case when %s is null then null when %s <= 0 then 1.0 else 0.0 end)",
			} {
				of := fmt.Sprintf("%s::double", v)
				own = strings.ReplaceAll(own, "%s", of)
				q := fmt.Sprintf(`with own as (select coalesce(town, 'gone') as town, year, %s as x, count(%s) as n from read_parquet('%s') group by all)
					select count(*), coalesce(max(abs(o.x - s.estimate) / (1 + abs(o.x))), 0), coalesce(max(abs(o.n - s.rows)), 0) from own o join read_parquet('%s') s
					on s.town = o.town and s.%s = o.year where s.variable = '%s' and %s`, own, v, whole, path, o.By[1], v, statistic)
				var cells, miscounted int64
				var worst float64
				if err := db.QueryRow(q).Scan(&cells, &worst, &miscounted); err != nil {
					t.Fatal(q, err)
				}
				if cells != 12 || worst > 1e-12 || miscounted != 0 {
					t.Errorf("%s, %s, %s: %d cells compared, off by up to %.1e, rows by %d", name, v, statistic, cells, worst, miscounted)
				}
			}
		}
	}
}

// Weighted means and quantiles are those that the other engine's queries give:
// quantiles the least value at which the weights up to it reach their share.
func TestSurveyWeights(t *testing.T) {
	db := open(t)
	path := filepath.Join(t.TempDir(), "whole.parquet")
	if _, err := db.Exec(fmt.Sprintf("copy (%s) to '%s' (format parquet, row_group_size 4000)", fmt.Sprintf(odd, 20000), path)); err != nil {
		t.Fatal(err)
	}
	table, err := survey.Describe(context.Background(), survey.Options{Files: []string{path}, Weight: "weight", Variables: []string{"income"}, Percentiles: []float64{10, 50, 95}, Workers: 2})
	if err != nil {
		t.Fatal(err)
	}
	for i := range table.Len() {
		q := ""
		switch statistic, level := table.Column("statistic").Strings[i], table.Column("level").Floats[i]; statistic {
		case "mean":
			q = "select sum(income::double * weight) / sum(weight) from read_parquet('%s')"
		case "percentile":
			q = fmt.Sprintf("select min(x) from (select income::double as x, sum(weight) over (order by income) as up, sum(weight) over () as whole from read_parquet('%%s')) where up >= %v * whole / 100", level)
		default:
			continue
		}
		if want, got := scalar[float64](t, db, fmt.Sprintf(q, path)), table.Column("estimate").Floats[i]; math.Abs(got-want) > 1e-12*math.Abs(want) {
			t.Errorf("%s: %v, want %v", q, got, want)
		}
	}
}

// BenchmarkSurvey describes a column of a large file and has the other engine find
// the same percentiles in it, two threads each, in one run. CISTERN_BENCH_ROWS sets
// the rows (default two million; 100 million take 2 GB on disk and a few minutes).
// Besides percentiles ours are mean, standard deviation, Gini coefficient, Lorenz
// curve and all errors.
func BenchmarkSurvey(b *testing.B) {
	rows := 2_000_000
	if s := os.Getenv("CISTERN_BENCH_ROWS"); s != "" {
		var err error
		if rows, err = strconv.Atoi(s); err != nil {
			b.Fatal(err)
		}
	}
	db, err := sql.Open("duckdb", "")
	if err != nil {
		b.Fatal(err)
	}
	defer func() { _ = db.Close() }()
	path := filepath.Join(b.TempDir(), "large.parquet")
	if _, err := db.Exec(fmt.Sprintf(`copy (select i // 50 as household, (25 + i %% 50)::integer as age,
		exp(1.5 * sqrt(-2 * ln((1 + hash(i) %% 1000000007) / 1000000008.0)) * cos(6.283185307179586 * (hash(i, 1) %% 1000000007) / 1000000007.0)) * 1000 as assets
		from range(%d) t(i)) to '%s' (format parquet, row_group_size 122880)`, rows, path)); err != nil {
		b.Fatal(err)
	}
	if _, err := db.Exec("set threads = 2"); err != nil {
		b.Fatal(err)
	}
	const percentiles = "[0.01, 0.05, 0.1, 0.25, 0.5, 0.75, 0.9, 0.95, 0.99, 0.999]"
	report := func(b *testing.B, start time.Time) {
		b.ReportMetric(float64(rows)*float64(b.N)/time.Since(start).Seconds()/1e6, "Mrows/s")
	}
	b.Run("ours", func(b *testing.B) {
		start := time.Now()
		for b.Loop() {
			_, err := survey.Describe(context.Background(), survey.Options{Files: []string{path}, Unit: "household", Variables: []string{"assets"},
				Percentiles: []float64{1, 5, 10, 25, 50, 75, 90, 95, 99, 99.9}, Lorenz: []float64{50}, Workers: 2})
			if err != nil {
				b.Fatal(err)
			}
		}
		report(b, start)
		var usage syscall.Rusage
		if syscall.Getrusage(syscall.RUSAGE_SELF, &usage) == nil {
			b.ReportMetric(float64(usage.Maxrss)/1024, "peakMB") // of the whole process, the other engine's file making included
		}
	})
	b.Run("theirs", func(b *testing.B) {
		start := time.Now()
		for b.Loop() {
			var n int
			if err := db.QueryRow(fmt.Sprintf("select len(quantile_cont(assets, %s)) from read_parquet('%s')", percentiles, path)).Scan(&n); err != nil || n != 10 {
				b.Fatal(n, err)
			}
		}
		report(b, start)
	})
}
