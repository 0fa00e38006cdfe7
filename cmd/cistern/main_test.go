package main

import (
	"bytes"
	"context"
	"encoding/csv"
	"encoding/json"
	"errors"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"cistern/output"
)

// The test binary is the program itself when this variable is set, so that a test
// can send it signals.
const asProgram = "CISTERN_TEST_AS_PROGRAM"

func TestMain(m *testing.M) {
	if os.Getenv(asProgram) != "" {
		main()
	}
	os.Exit(m.Run())
}

// port is a small scenario of several blocks and part files.
const port = `cistern: 1
title: Quayside in small
seed: 7
households: 20000
life: {first_age: 30, last_age: 60, survival: {gompertz: {modal_age: 60, dispersion: 9}}}
preferences:
  utility: {family: crra, relative_risk_aversion: 2}
  discount_factor: {mean: 0.95, half_width: 0.02, points: 2}
income:
  profile: {constant: 30000}
  persistent: {autocorrelation: 0.9, innovation_sd: 0.1, points: 5}
  transitory: {sd: 0.2}
  job_loss: {probability: 0.05, benefit_rate: 0.5}
saving: {return: 0.02}
public: {pension: {claim_age: 55, flat: 8000}}
groups:
  - {name: dockers, share: 0.7}
  - {name: pilots, share: 0.3, income: {profile: {constant: 60000}}}
panel: {block: 8192}
`

// cistern runs the program in process.
func cistern(t *testing.T, args ...string) (status int, stdout, stderr string) {
	t.Helper()
	return cisternIn(t, context.Background(), args...)
}

func cisternIn(t *testing.T, ctx context.Context, args ...string) (status int, stdout, stderr string) {
	t.Helper()
	var out, err bytes.Buffer
	status = execute(ctx, args, &out, &err)
	return status, out.String(), err.String()
}

// inFolder moves to an empty folder with the scenario port.yaml.
func inFolder(t *testing.T) {
	t.Helper()
	t.Chdir(t.TempDir())
	if err := os.WriteFile("port.yaml", []byte(port), 0o666); err != nil {
		t.Fatal(err)
	}
}

func TestExitStatus(t *testing.T) {
	inFolder(t)
	if err := os.WriteFile("wrong.yaml", []byte("cistern: 1\nhouseholds: -3\nlive: {}\n"), 0o666); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile("taken", nil, 0o666); err != nil {
		t.Fatal(err)
	}
	for _, tt := range []struct {
		args   string
		status int
		stdout string
		stderr string
	}{
		{"version", 0, "cistern ", ""},
		{"--help", 0, "simulate", ""},
		{"simulate --help", 0, "Examples:", ""},
		{"simualte", 2, "", `there is no command "simualte"; did you mean simulate?`},
		{"simulate --wrokers 2", 2, "", "unknown flag: --wrokers"},
		{"simulate --workers 0", 2, "", "--workers is 0, want at least 1"},
		{"simulate --workers many", 2, "", "--workers"},
		{"simulate --format xml", 2, "", "--format is xml, want table, csv or json"},
		{"version --format xml", 2, "", "--format is xml, want table, csv or json"},
		{"simulate --worker 2", 2, "", "did you mean --workers?"},
		{"simulate --out=", 2, "", "--out is empty, want a folder"},
		{"help simualte", 2, "", `there is no command "simualte"; did you mean simulate?`},
		{"help simulate", 0, "Examples:", ""},
		{"completion fsh", 2, "", `there is no completion for "fsh", want one of bash, fish, powershell, zsh`},
		{"completion bash extra", 2, "", "takes no"},
		{"solve port.yaml --households 4000000000", 0, "relative_prudence", ""}, // the rule writes no panel
		{"simulate a b", 2, "", "cistern simulate takes one scenario, not 2 arguments"},
		{"simulate nowhere.yaml", 2, "", "nowhere.yaml: cannot be read"},
		{"simulate quaysid", 2, "", "did you mean quayside?"},
		{"simulate wrong.yaml", 2, "", "wrong.yaml:2:13: households: is -3"},
		{"check wrong.yaml", 2, "", "wrong.yaml:3:1: live: is not a key of the format"},
		{"check port.yaml --set saving.return=5", 2, "", "--set saving.return=5: saving.return: is 5, want from -0.9 to 1"},
		{"check", 2, "", "takes one scenario"},
		{"check port.yaml --seed -1", 2, "", "seed: is -1"},
		{"check port.yaml --households 4000000000", 2, "", "free on the disk"},
		{"check port.yaml --set solver.asset_points=100000 --set income.persistent.points=255", 2, "", "of memory, and"},
		{"simulate port.yaml --out taken", 1, "", "taken"},
		{"report", 2, "", "report takes the folder of a run"},
		{"report nowhere", 2, "", "nowhere holds no finished run"},
		{"report .", 2, "", ". holds no finished run"},
		{"scenarios nosuch", 2, "", "is not a built-in scenario"},
		{"completion bash", 0, "bash completion", ""},
		{"__complete simulate q", 0, "quayside-patience", ""},
		{"schema", 0, `"additionalProperties": false`, ""},
		{"scenarios", 0, "quayside-exponential", ""},
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
	for _, left := range []string{"runs"} {
		if _, err := os.Stat(left); !errors.Is(err, os.ErrNotExist) {
			t.Errorf("a refused run left %s", left)
		}
	}
}

// The main job: the run folder is complete and its parts agree.
func TestSimulate(t *testing.T) {
	inFolder(t)
	status, stdout, stderr := cistern(t, "simulate", "port.yaml")
	if status != 0 {
		t.Fatalf("status %d: %s", status, stderr)
	}
	for _, want := range []string{"30-39", "precautionary", "share_at_limit"} {
		if !strings.Contains(stdout, want) {
			t.Errorf("the table has no %q:\n%s", want, stdout)
		}
	}
	for _, want := range []string{"runs/port", "accuracy:", "understate", "no personal financial advice"} {
		if !strings.Contains(filepath.ToSlash(stderr), want) {
			t.Errorf("the messages have no %q:\n%s", want, stderr)
		}
	}
	dir := filepath.Join("runs", "port")
	if err := output.Verify(dir); err != nil {
		t.Error(err)
	}
	run, err := output.ReadRun(dir)
	if err != nil {
		t.Fatal(err)
	}
	if run.Counts["households"] != 20000 || run.Seed != 7 || len(run.Timings) == 0 {
		t.Errorf("run.json: %+v", run)
	}
	var rows int64
	if err := output.ReadPanel(filepath.Join(dir, "panel"), []string{"household"}, func(t *output.Table) error { rows += int64(t.Len()); return nil }); err != nil {
		t.Fatal(err)
	}
	if rows != run.Counts["household_years"] {
		t.Errorf("the panel has %d rows, the run %d household-years", rows, run.Counts["household_years"])
	}
	checkSummary(t, dir)
	// the resolved scenario gives the same run
	if status, _, stderr := cistern(t, "simulate", filepath.Join(dir, "scenario.yaml"), "--out", "again", "--quiet"); status != 0 || stderr != "" {
		t.Fatalf("status %d: %s", status, stderr)
	}
	sameFiles(t, dir, "again", "run.json")
}

// checkSummary recomputes some of the summary from the panel.
func checkSummary(t *testing.T, dir string) {
	t.Helper()
	var assets []float64
	err := output.ReadPanel(filepath.Join(dir, "panel"), []string{"group", "age", "assets"}, func(p *output.Table) error {
		for i, a := range p.Column("age").Ints {
			if a == 40 && p.Column("group").Strings[i] == "pilots" {
				assets = append(assets, p.Column("assets").Floats[i])
			}
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	slices.Sort(assets)
	mean := 0.0
	for _, a := range assets {
		mean += a / float64(len(assets))
	}
	h := float64(len(assets)-1) * 0.9 // type 7 of Hyndman & Fan (1996)
	p90 := assets[int(h)] + (h-math.Floor(h))*(assets[int(h)+1]-assets[int(h)])
	text, err := os.ReadFile(filepath.Join(dir, "summary.csv"))
	if err != nil {
		t.Fatal(err)
	}
	records, err := csv.NewReader(bytes.NewReader(text)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	at := func(name string) int { return slices.Index(records[0], name) }
	found := 0
	for _, r := range records[1:] {
		if r[at("group")] != "pilots" || r[at("age")] != "40" || r[at("variable")] != "assets" {
			continue
		}
		x, _ := strconv.ParseFloat(r[at("estimate")], 64)
		low, _ := strconv.ParseFloat(r[at("lower")], 64)
		high, _ := strconv.ParseFloat(r[at("upper")], 64)
		var want float64
		switch r[at("statistic")] + r[at("level")] {
		case "mean":
			want = mean
		case "percentile90":
			want = p90
		default:
			continue
		}
		found++
		if math.Abs(x/want-1) > 1e-12 || !(low < x && x < high) || r[at("households")] != strconv.Itoa(len(assets)) {
			t.Errorf("%v: from the panel %v of %d households", r, want, len(assets))
		}
	}
	if found != 2 {
		t.Errorf("found %d of mean and 90th percentile", found)
	}
}

// sameFiles compares two run folders byte for byte, some files aside.
func sameFiles(t *testing.T, a, b string, except ...string) {
	t.Helper()
	n := 0
	err := filepath.WalkDir(a, func(path string, d os.DirEntry, err error) error {
		if err != nil || d.IsDir() || slices.Contains(except, d.Name()) {
			return err
		}
		rel, _ := filepath.Rel(a, path)
		x, err1 := os.ReadFile(path)
		y, err2 := os.ReadFile(filepath.Join(b, rel))
		if err := errors.Join(err1, err2); err != nil {
			return err
		}
		if n++; !bytes.Equal(x, y) {
			t.Errorf("%s differs between %s and %s", rel, a, b)
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if n < 5 {
		t.Errorf("compared only %d files", n)
	}
}

func TestWorkersGiveSameBytes(t *testing.T) {
	inFolder(t)
	for _, w := range []string{"1", "2", "5"} {
		if status, _, stderr := cistern(t, "simulate", "port.yaml", "--workers", w, "--out", "w"+w, "--quiet"); status != 0 {
			t.Fatalf("status %d: %s", status, stderr)
		}
	}
	sameFiles(t, "w1", "w2", "run.json")
	sameFiles(t, "w1", "w5", "run.json")
}

func TestExistingFolder(t *testing.T) {
	inFolder(t)
	run := func(args ...string) (int, string) {
		status, _, stderr := cistern(t, append([]string{"simulate", "port.yaml", "--households", "3000", "--out", "r"}, args...)...)
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
	if err := os.Mkdir("mine", 0o777); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile("mine/letter.txt", []byte("dear"), 0o666); err != nil {
		t.Fatal(err)
	}
	if status, _, stderr := cistern(t, "simulate", "port.yaml", "--out", "mine", "--replace"); status != exitFailed || !strings.Contains(stderr, "not those of a run") {
		t.Errorf("status %d: %s", status, stderr)
	}
	if entries, _ := os.ReadDir("mine"); len(entries) != 1 {
		t.Errorf("a refused run wrote into the folder: %v", entries)
	}
}

// A run that is stopped keeps its whole parts and goes on to the same end.
func TestInterruptAndResume(t *testing.T) {
	inFolder(t)
	if status, _, stderr := cistern(t, "simulate", "port.yaml", "--households", "60000", "--out", "whole", "--quiet"); status != 0 {
		t.Fatal(stderr)
	}
	ctx, cancel := context.WithCancel(context.Background())
	defer cancel()
	go func() {
		for ctx.Err() == nil {
			if _, err := os.Stat("stopped/panel/part-00000.parquet"); err == nil {
				cancel()
			}
			time.Sleep(time.Millisecond)
		}
	}()
	status, stdout, stderr := cisternIn(t, ctx, "simulate", "port.yaml", "--households", "60000", "--out", "stopped", "--workers", "1")
	if status == 0 {
		t.Skip("the run was over before it could be stopped")
	}
	if status != exitInterrupted || stdout != "" || !strings.Contains(stderr, "the same command goes on from there") {
		t.Fatalf("status %d, stdout %q: %s", status, stdout, stderr)
	}
	if _, err := os.Stat("stopped/run.json"); err == nil {
		t.Error("a stopped run looks finished")
	}
	if status, _, stderr = cistern(t, "simulate", "port.yaml", "--households", "60000", "--out", "stopped"); status != 0 || !strings.Contains(stderr, "going on with the unfinished run") {
		t.Fatalf("status %d: %s", status, stderr)
	}
	sameFiles(t, "whole", "stopped", "run.json")
}

// Ctrl-C in the terminal: the program ends with 130 and leaves no half-written
// file.
func TestSignal(t *testing.T) {
	inFolder(t)
	cmd := exec.Command(os.Args[0], "simulate", "port.yaml", "--households", "400000", "--out", "r")
	cmd.Env = append(os.Environ(), asProgram+"=1")
	var stderr bytes.Buffer
	cmd.Stderr = &stderr
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	for range 3000 {
		if _, err := os.Stat("r/panel/part-00000.parquet"); err == nil {
			break
		}
		time.Sleep(10 * time.Millisecond)
	}
	if err := cmd.Process.Signal(syscall.SIGINT); err != nil {
		t.Fatal(err)
	}
	err := cmd.Wait()
	var exit *exec.ExitError
	if !errors.As(err, &exit) || exit.ExitCode() != exitInterrupted {
		t.Fatalf("%v, want exit status 130: %s", err, stderr.String())
	}
	entries, err := os.ReadDir("r/panel")
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		if !strings.HasPrefix(e.Name(), "part-") || !strings.HasSuffix(e.Name(), ".parquet") {
			t.Errorf("left behind: %s", e.Name())
		}
	}
}

// What a user should know before trusting a run is said in its messages and kept
// in run.json.
func TestWarnings(t *testing.T) {
	inFolder(t)
	for name, tt := range map[string]struct{ set, want string }{
		"bliss": {"preferences.utility={family: quadratic, bliss_point: 20000}", "beyond the bliss point"},
		"grid":  {"solver.highest_assets=30000", "above the top of the asset grid"},
	} {
		status, _, stderr := cistern(t, "simulate", "port.yaml", "--households", "4000", "--out", name, "--set", tt.set)
		if status != 0 || !strings.Contains(stderr, tt.want) {
			t.Errorf("%s: status %d: %s", name, status, stderr)
			continue
		}
		if run, err := output.ReadRun(name); err != nil || len(run.Warnings) != 1 || !strings.Contains(run.Warnings[0], tt.want) {
			t.Errorf("%s: run.json has %v, %v", name, run.Warnings, err)
		}
	}
}

func TestIncomeCommand(t *testing.T) {
	status, stdout, stderr := cistern(t, "income", "quayside", "--set", "income.persistent.method=tauchen", "--set", "income.persistent.autocorrelation=0.99")
	if status != 0 || !strings.Contains(stdout, "autocorrelation") || !strings.Contains(stderr, "% too high") {
		t.Errorf("status %d\n%s\n%s", status, stdout, stderr)
	}
}

func TestSolveCommand(t *testing.T) {
	inFolder(t)
	status, stdout, stderr := cistern(t, "solve", "port.yaml", "--out", "rule", "--format", "json")
	if status != 0 || !strings.Contains(stderr, "accuracy:") {
		t.Fatalf("status %d: %s", status, stderr)
	}
	if !json.Valid([]byte(stdout)) {
		t.Errorf("not JSON: %.200s", stdout)
	}
	if err := output.Verify("rule"); err != nil {
		t.Error(err)
	}
	table, err := output.ReadTable("rule/policy.parquet")
	if err != nil {
		t.Fatal(err)
	}
	if table.Len() < 10000 || table.Column("discount_factor") == nil {
		t.Errorf("policy.parquet has %d rows, columns %v", table.Len(), table.Columns)
	}
}

// The rows of policy.parquet are a rule that can be read by interpolation: finite,
// ascending in cash-on-hand, from the least that a household can have.
func TestPolicyRows(t *testing.T) {
	for _, name := range []string{"quayside", "quayside-exponential"} {
		t.Chdir(t.TempDir())
		if status, _, stderr := cistern(t, "solve", name, "--out", "rule", "--quiet"); status != 0 {
			t.Fatal(stderr)
		}
		p, err := output.ReadTable("rule/policy.parquet")
		if err != nil {
			t.Fatal(err)
		}
		cash, consumption, age := p.Column("cash_on_hand").Floats, p.Column("consumption").Floats, p.Column("age").Ints
		z, group := p.Column("persistent").Floats, p.Column("group").Strings
		for i, m := range cash {
			if math.IsInf(m, 0) || math.IsNaN(m) || math.IsInf(consumption[i], 0) || math.IsNaN(consumption[i]) {
				t.Fatalf("%s row %d: consumption %v at %v", name, i, consumption[i], m)
			}
			first := i == 0 || age[i] != age[i-1] || z[i] != z[i-1] || group[i] != group[i-1]
			if !first && (m <= cash[i-1] || consumption[i] < consumption[i-1]) {
				t.Fatalf("%s row %d: cash-on-hand %v, consumption %v after %v, %v", name, i, m, consumption[i], cash[i-1], consumption[i-1])
			}
			if first && name == "quayside" && (m != 0 || consumption[i] != 0) {
				t.Fatalf("%s row %d: the rule begins at %v, %v, want 0, 0", name, i, m, consumption[i])
			}
		}
	}
}

func TestCheckCommand(t *testing.T) {
	status, stdout, stderr := cistern(t, "check", "quayside", "--households", "1000")
	if status != 0 || !strings.Contains(stdout, "households: 1000") || !strings.Contains(stdout, "kink_threshold:") || !strings.Contains(stderr, "household-years") {
		t.Errorf("status %d\n%s\n%s", status, stdout, stderr)
	}
}

func TestVerifyCommand(t *testing.T) {
	status, stdout, stderr := cistern(t, "verify", "--format", "csv")
	if status != 0 || strings.Contains(stdout, ",fails,") || !strings.Contains(stdout, "Tauchen (1986)") || !strings.Contains(stderr, "checks pass") {
		t.Errorf("status %d\n%s\n%s", status, stdout, stderr)
	}
}
