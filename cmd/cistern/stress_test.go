package main

import (
	"bytes"
	"context"
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"cistern/output"
	"cistern/output/stats"
)

// layoffs is an event with all parts, for the scenario port.
const layoffs = `stress: 1
title: The quay is closed
event:
  job_loss: {probability: {times: 2}, benefit_rate: 0.4, lasts: 2}
  earnings: {level: -0.05, lasts: 2, persistent: -0.05}
  return: -0.1
  cost_of_living: {jump: 0.03}
hits: {groups: [dockers]}
years: {before: 1, horizon: 6}
`

func inStressFolder(t *testing.T) {
	t.Helper()
	inFolder(t)
	if err := os.WriteFile("layoffs.yaml", []byte(layoffs), 0o666); err != nil {
		t.Fatal(err)
	}
}

// figureTable is a stress.csv by its keys.
type figureTable map[string]stats.Estimate

func readFigures(t *testing.T, file string) figureTable {
	t.Helper()
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	records, err := csv.NewReader(bytes.NewReader(text)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if got := strings.Join(records[0], ","); got != "year,world,group,ages,variable,statistic,level,estimate,standard_error,lower,upper,households" {
		t.Fatalf("columns %s", got)
	}
	number := func(s string) float64 {
		x, err := strconv.ParseFloat(s, 64)
		if err != nil {
			return math.NaN()
		}
		return x
	}
	figures := figureTable{}
	for _, r := range records[1:] {
		key := strings.Join(r[:7], " ")
		if _, twice := figures[key]; twice {
			t.Fatalf("%s stands twice", key)
		}
		figures[key] = stats.Estimate{Value: number(r[7]), StandardError: number(r[8]), Lower: number(r[9]), Upper: number(r[10])}
	}
	return figures
}

func (f figureTable) at(t *testing.T, key string) stats.Estimate {
	t.Helper()
	e, ok := f[key]
	if !ok {
		t.Fatalf("there is no figure %q", key)
	}
	return e
}

// The job: the folder is complete, its parts agree, the answer is in words first,
// and what it resolved to gives the same again.
func TestStress(t *testing.T) {
	inStressFolder(t)
	status, stdout, stderr := cistern(t, "stress", "port.yaml", "layoffs.yaml")
	if status != 0 {
		t.Fatalf("status %d: %s", status, stderr)
	}
	for _, want := range []string{"Quayside in small: The quay is closed\n", "All households:", "Group dockers:", "Run dry: ", "Runway: ", "Consumption: ", "Recovery: ", "dry_stress", "percentage points more (95 %: "} {
		if !strings.Contains(stdout, want) {
			t.Errorf("the answer has no %q:\n%s", want, stdout)
		}
	}
	if strings.Contains(stdout, "Group pilots") || strings.Index(stdout, "Run dry") > strings.Index(stdout, "dry_stress") || strings.Contains(stdout, "NaN") {
		t.Errorf("the answer is not as it should be:\n%s", stdout)
	}
	if !strings.Contains(stderr, "no personal financial advice") || !strings.Contains(filepath.ToSlash(stderr), "runs/port-layoffs") {
		t.Errorf("messages: %s", stderr)
	}
	dir := filepath.Join("runs", "port-layoffs")
	if err := output.Verify(dir); err != nil {
		t.Error(err)
	}
	run, err := output.ReadRun(dir)
	if err != nil {
		t.Fatal(err)
	}
	if run.Counts["households"] != 20000 || run.Counts["passes"] != 2 || run.Title != "Quayside in small: The quay is closed" || run.Caution == "" {
		t.Errorf("run.json: %+v", run)
	}
	figures := readFigures(t, filepath.Join(dir, "stress.csv"))
	for key, e := range figures {
		if !strings.Contains(key, " difference ") || !strings.HasSuffix(key, " mean ") {
			continue
		}
		if strings.Contains(key, "shortfall") {
			if strings.HasPrefix(key, "-1 ") != (e.Value == 0) && !strings.Contains(key, "pilots") {
				t.Errorf("%s is %v", key, e.Value)
			}
			continue
		}
		usual, event := figures.at(t, strings.Replace(key, "difference", "baseline", 1)), figures.at(t, strings.Replace(key, "difference", "stress", 1))
		if math.Abs(e.Value-event.Value+usual.Value) > 1e-6*(1+math.Abs(usual.Value)) {
			t.Errorf("%s is %v, of %v and %v", key, e.Value, event.Value, usual.Value)
		}
		unharmed := strings.Contains(key, "pilots") || strings.HasPrefix(key, "-1 ")
		if unharmed && (e.Value != 0 || e.StandardError != 0) {
			t.Errorf("%s: %+v, though nobody there is hit", key, e)
		}
	}
	if e := figures.at(t, "0 difference dockers all consumption mean "); !(e.Upper < 0 && e.Lower < e.Upper) {
		t.Errorf("consumption of dockers changes by %+v", e)
	}
	for _, want := range []string{"6 stress dockers 30-39 newly_dry share_so_far ", "0 baseline all all runway_months share_below 3", " difference all all assets years_to_recover_mean 5",
		"3 difference dockers all consumption_shortfall expected_shortfall 5", "2 difference all 40-49 assets percentile 50"} {
		figures.at(t, want)
	}
	checkStationary(t, figures)
	if status, _, stderr := cistern(t, "stress", filepath.Join(dir, "scenario.yaml"), filepath.Join(dir, "stress.yaml"), "--out", "again", "--quiet"); status != 0 || stderr != "" {
		t.Fatalf("status %d: %s", status, stderr)
	}
	sameFiles(t, dir, "again", "run.json")
	checkStressPage(t, dir)
}

// checkStressPage makes the page again and holds it against the figures.
func checkStressPage(t *testing.T, dir string) {
	t.Helper()
	if status, _, stderr := cistern(t, "report", dir, "--out", "page.html"); status != 0 {
		t.Fatal(stderr)
	}
	first, err1 := os.ReadFile(filepath.Join(dir, "report.html"))
	again, err2 := os.ReadFile("page.html")
	if err1 != nil || err2 != nil || !bytes.Equal(first, again) {
		t.Errorf("the page made again is another one: %v, %v", err1, err2)
	}
	for _, want := range []string{"Quayside in small: The quay is closed", `<p class="lead">Run dry: `, ">Group dockers</h2>\n<p>Run dry: ", "event.job_loss.probability.times", "what the usual rate is multiplied by", "no personal financial advice"} {
		if !bytes.Contains(first, []byte(want)) {
			t.Errorf("the page has no %q", want)
		}
	}
	if status, _, stderr := cistern(t, "report", dir, "panel"); status != exitUsage || !strings.Contains(stderr, "holds a stress, which is shown by itself") {
		t.Errorf("status %d: %s", status, stderr)
	}
	if err := os.WriteFile(filepath.Join(dir, "stress.yaml"), []byte("stress: 1\nevent: {return: 0}\n"), 0o666); err != nil {
		t.Fatal(err)
	}
	if status, _, stderr := cistern(t, "report", dir); status != exitFailed || !strings.Contains(stderr, "was changed after the run was written") {
		t.Errorf("status %d: %s", status, stderr)
	}
}

// checkStationary holds the baseline against a panel: without growth of births, the
// people of a year are those of all years of a panel, and so are their means and
// quantiles (derived: a stationary population), to within four standard errors of
// the difference of two independent samples.
func checkStationary(t *testing.T, figures figureTable) {
	t.Helper()
	if status, _, stderr := cistern(t, "simulate", "port.yaml", "--seed", "8", "--out", "panel", "--quiet"); status != 0 {
		t.Fatal(stderr)
	}
	type row struct {
		id             int64
		assets, income float64
	}
	var rows []row
	if err := output.ReadPanel(filepath.Join("panel", "panel"), []string{"household", "assets", "income"}, func(p *output.Table) error {
		for i, id := range p.Column("household").Ints {
			rows = append(rows, row{id, p.Column("assets").Floats[i], p.Column("income").Floats[i]})
		}
		return nil
	}); err != nil {
		t.Fatal(err)
	}
	mean := func(of func(r row) float64) (m, se float64) {
		var sums, counts [64]float64
		total, n := 0.0, 0.0
		for _, r := range rows {
			sums[r.id%64] += of(r)
			counts[r.id%64]++
			total, n = total+of(r), n+1
		}
		left := make([]float64, 64)
		for g := range left {
			left[g] = (total - sums[g]) / (n - counts[g])
		}
		se, _ = stats.Jackknife(total/n, left, counts[:])
		return total / n, se
	}
	middle := figures.at(t, "4 baseline all all assets percentile 50")
	for _, c := range []struct {
		key  string
		of   func(r row) float64
		want float64 // NaN: the mean of the panel
	}{
		{"0 baseline all all assets mean ", func(r row) float64 { return r.assets }, math.NaN()},
		{"6 baseline all all income mean ", func(r row) float64 { return r.income }, math.NaN()},
		{"", func(r row) float64 { // share at or below the median of year 4
			if r.assets <= middle.Value {
				return 1
			}
			return 0
		}, 0.5},
	} {
		m, se := mean(c.of)
		got, error2 := c.want, 0.25/13000 // of a share of one half
		if c.key != "" {
			e := figures.at(t, c.key)
			got, error2 = e.Value, e.StandardError*e.StandardError
		}
		if math.Abs(got-m) > 4*math.Sqrt(se*se+error2) {
			t.Errorf("%s: %v, in the panel %v ± %v", c.key, got, m, se)
		}
	}
}

func TestStressWorkersGiveSameBytes(t *testing.T) {
	inStressFolder(t)
	for _, w := range []string{"1", "2", "5"} {
		if status, _, stderr := cistern(t, "stress", "port.yaml", "layoffs.yaml", "--set", "population.growth=0.01", "--workers", w, "--out", "w"+w, "--quiet"); status != 0 {
			t.Fatalf("status %d: %s", status, stderr)
		}
	}
	for _, file := range []string{"stress.csv", "stress.parquet"} {
		one, err := os.ReadFile(filepath.Join("w1", file))
		if err != nil {
			t.Fatal(err)
		}
		for _, w := range []string{"w2", "w5"} {
			if other, err := os.ReadFile(filepath.Join(w, file)); err != nil || !bytes.Equal(one, other) {
				t.Errorf("%s differs with other workers (%v)", file, err)
			}
		}
	}
}

// An event that changes nothing gives differences of exactly nothing.
func TestStressOfNothing(t *testing.T) {
	inStressFolder(t)
	for _, expect := range []string{"normal", "stressed"} {
		text := "stress: 1\nevent: {job_loss: {probability: 0.05, benefit_rate: 0.5, lasts: 3}, return: [0.02, 0.02]}\nhouseholds_expect: " + expect + "\nyears: {horizon: 4}\n"
		if err := os.WriteFile("nothing.yaml", []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
		status, stdout, stderr := cistern(t, "stress", "port.yaml", "nothing.yaml", "--households", "9000", "--out", expect)
		if status != 0 {
			t.Fatal(stderr)
		}
		for _, want := range []string{"Run dry: 0 percentage points more (95 %: 0 to 0)", "mean consumption never off by more", "nobody's own assets were off by more"} {
			if !strings.Contains(stdout, want) {
				t.Errorf("%s: no %q in\n%s", expect, want, stdout)
			}
		}
		n := 0
		for key, e := range readFigures(t, filepath.Join(expect, "stress.csv")) {
			if strings.Contains(key, " difference ") && !math.IsNaN(e.Value) {
				if n++; e.Value != 0 || !(e.StandardError == 0 || math.IsNaN(e.StandardError)) {
					t.Errorf("%s: %s is %+v", expect, key, e)
				}
			}
		}
		if n < 1000 {
			t.Errorf("only %d differences", n)
		}
	}
}

func TestStressFolder(t *testing.T) {
	inStressFolder(t)
	run := func(args ...string) (int, string) {
		status, _, stderr := cistern(t, append([]string{"stress", "port.yaml", "layoffs.yaml", "--households", "3000", "--out", "r"}, args...)...)
		return status, stderr
	}
	if status, stderr := run(); status != 0 {
		t.Fatal(stderr)
	}
	if status, stderr := run(); status != exitFailed || !strings.Contains(stderr, "finished run") || !strings.Contains(stderr, "--replace") {
		t.Errorf("status %d: %s", status, stderr)
	}
	if status, stderr := run("--replace"); status != 0 {
		t.Errorf("status %d: %s", status, stderr)
	}
	// a run is not removed for an event that households could not live through
	if err := os.WriteFile("hard.yaml", []byte("stress: 1\nevent: {job_loss: {benefit_rate: 0}}\n"), 0o666); err != nil {
		t.Fatal(err)
	}
	if status, _, stderr := cistern(t, "stress", "port.yaml", "hard.yaml", "--out", "r", "--replace"); status != exitUsage {
		t.Errorf("status %d: %s", status, stderr)
	}
	if err := output.Verify("r"); err != nil {
		t.Error(err)
	}
	if err := os.Mkdir("mine", 0o777); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile("mine/letter.txt", nil, 0o666); err != nil {
		t.Fatal(err)
	}
	if status, _, stderr := cistern(t, "stress", "port.yaml", "layoffs.yaml", "--out", "mine"); status != exitFailed || !strings.Contains(stderr, "not those of a run") {
		t.Errorf("status %d: %s", status, stderr)
	}
}

// A stress that is stopped says so, and the same command runs it to the end.
func TestStressInterrupt(t *testing.T) {
	inStressFolder(t)
	args := []string{"stress", "port.yaml", "layoffs.yaml", "--households", "100000", "--out", "r"}
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	go func() {
		for ctx.Err() == nil {
			if _, err := os.Stat("r/stress.yaml"); err == nil {
				cancel()
			}
			time.Sleep(time.Millisecond)
		}
	}()
	status, stdout, stderr := cisternIn(t, ctx, args...)
	if status != exitInterrupted || stdout != "" || !strings.Contains(stderr, "the same command begins it again in r") {
		t.Fatalf("status %d\n%s\n%s", status, stdout, stderr)
	}
	if _, err := os.Stat("r/run.json"); err == nil {
		t.Error("a stopped stress is finished")
	}
	if status, stdout, stderr := cistern(t, args...); status != 0 || !strings.Contains(stdout, "Run dry") {
		t.Errorf("status %d: %s", status, stderr)
	}
	if err := output.Verify("r"); err != nil {
		t.Error(err)
	}
	if err := os.Remove("r/run.json"); err != nil { // as if it had been stopped again
		t.Fatal(err)
	}
	if err := os.WriteFile("r/.unfinished.json", []byte(`{"scenario_sha256": "x", "version": "y", "files": ["stress.yaml"]}`), 0o666); err != nil {
		t.Fatal(err)
	}
	args[4] = "5000"
	if status, _, stderr := cistern(t, args...); status != exitFailed || !strings.Contains(stderr, "unfinished run of another scenario") {
		t.Errorf("status %d: %s", status, stderr)
	}
	if status, _, stderr := cistern(t, append(args, "--replace")...); status != 0 {
		t.Errorf("status %d: %s", status, stderr)
	}
}

func TestStressCommandLine(t *testing.T) {
	inStressFolder(t)
	for name, text := range map[string]string{
		"wrong.yaml": "stress: 1\nevent: {job_loss: {probabilty: 1}}\nhits: {groups: [clerks]}\n",
		"hard.yaml":  "stress: 1\n\nevent: {job_loss: {benefit_rate: 0}}\n",
		"empty.yaml": "",
	} {
		if err := os.WriteFile(name, []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	for _, tt := range []struct {
		args   string
		status int
		stdout string
		stderr string
	}{
		{"stress", 2, "", "takes a scenario and a stress, not 0 arguments"},
		{"stress port.yaml", 2, "", "takes a scenario and a stress, not 1 arguments"},
		{"stress port.yaml nowhere.yaml", 2, "", "nowhere.yaml: cannot be read"},
		{"stress port.yaml harbour-closur", 2, "", "did you mean harbour-closure?"},
		{"stress nowhere.yaml layoffs.yaml", 2, "", "nowhere.yaml: cannot be read"},
		{"stress port.yaml wrong.yaml", 2, "", "wrong.yaml:2:20: event.job_loss.probabilty: is not a key of the format; allowed here: probability, benefit_rate, lasts; did you mean probability?"},
		{"stress port.yaml wrong.yaml", 2, "", "wrong.yaml:3:17: hits.groups[0]: is clerks, want each of dockers or pilots at most once"},
		{"stress port.yaml hard.yaml --out hard", 2, "", "hard.yaml:3:8: event: in year 0 of the event a household of group dockers aged 54 can be left with cash-on-hand 0"},
		{"stress port.yaml empty.yaml", 2, "", "empty.yaml:1:1: event: is missing"},
		{"stress port.yaml layoffs.yaml --households 4000000000 --set population.growth=0.01", 2, "", "households: is 4000000000: the stress would need about"},
		{"stress port.yaml layoffs.yaml --households 500 --out small --format csv --quiet", 0, "year,dry,dry_stress", ""},
		{"stress port.yaml layoffs.yaml --households 500 --out json --format json", 0, `"dry_stress"`, "Run dry: "},
		{"stresses", 0, "price-shock", ""},
		{"stresses harbour-closure", 0, "hits:\n  groups: [dockers]\n", ""},
		{"stresses nosuch", 2, "", "is not a built-in stress"},
		{"schema stress", 0, `"cistern stress, format 1"`, ""},
		{"schema other", 2, "", `there is no format "other"`},
		{"__complete stress quayside p", 0, "price-shock", ""},
		{"__complete stress q", 0, "quayside-patience", ""},
		{"stress --help", 0, "harbour-closure", ""},
	} {
		t.Run(tt.args, func(t *testing.T) {
			status, stdout, stderr := cistern(t, strings.Fields(tt.args)...)
			if status != tt.status || !strings.Contains(stdout, tt.stdout) || !strings.Contains(stderr, tt.stderr) {
				t.Errorf("status %d, want %d\nstdout: %.300s\nwant %q\nstderr: %s\nwant %q", status, tt.status, stdout, tt.stdout, stderr, tt.stderr)
			}
			if status == exitUsage && stdout != "" {
				t.Errorf("a mistake is answered on standard output: %s", stdout)
			}
		})
	}
	for _, left := range []string{"runs", "hard"} {
		if _, err := os.Stat(left); err == nil {
			t.Errorf("a refused stress left %s", left)
		}
	}
}

func TestStressWords(t *testing.T) {
	e := func(value, lower, upper float64) stats.Estimate {
		return stats.Estimate{Value: value, Lower: lower, Upper: upper}
	}
	for _, tt := range [][2]string{
		{points(e(0.0138, 0.0117, 0.016)), "1.38 percentage points more (95 %: 1.17 to 1.60)"},
		{points(e(-0.02, -0.03, 0.01)), "2.00 percentage points fewer (95 %: -1.00 to 3.00)"},
		{percent(0.12345), "12.3 %"}, {percent(0), "0 %"}, {digits(0.00012345), "0.000123"}, {digits(12345), "12345"}, {digits(-17.72), "-17.7"},
		{plural(1, "month", "months"), "1 month"}, {plural(0.25, "month", "months"), "0.25 months"}, {yearName(0), "the event's year"}, {yearName(3), "year 3"},
	} {
		if tt[0] != tt[1] {
			t.Errorf("got %q, want %q", tt[0], tt[1])
		}
	}
	if slices.Contains([]string{fmt.Sprint(upward(e(0, 0, 0)))}, fmt.Sprint(e(math.Copysign(0, -1), 0, 0))) {
		t.Error("a negative nothing")
	}
}
