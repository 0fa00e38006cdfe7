package main

import (
	"fmt"
	"math"
	"os"
	"strings"
	"testing"

	"cistern/output"
)

// The figures of a run's panel are those of its summary, as far as both have them.
func TestSummariseOwnPanel(t *testing.T) {
	inFolder(t)
	if status, _, stderr := cistern(t, "simulate", "port.yaml", "--households", "3000", "--quiet", "--out", "run", "--set", "panel.block=4096"); status != 0 {
		t.Fatal(stderr)
	}
	if status, _, stderr := cistern(t, "summarise", "run", "--by", "group,age", "--out", "again.parquet", "--quiet"); status != 0 {
		t.Fatal(stderr)
	}
	read := func(path string) map[string][4]float64 {
		table, err := output.ReadTable(path)
		if err != nil {
			t.Fatal(err)
		}
		figures := map[string][4]float64{}
		for i := range table.Len() {
			key := ""
			for _, name := range []string{"group", "variable", "statistic"} {
				key += table.Column(name).Strings[i] + " "
			}
			if c := table.Column("age"); !c.IsMissing(i) {
				key += strings.Repeat("|", int(c.Ints[i]))
			}
			level := func(name string) float64 {
				if c := table.Column(name); !c.IsMissing(i) {
					return c.Floats[i]
				}
				return math.NaN()
			}
			if l := level("level"); !math.IsNaN(l) {
				key += fmt.Sprintf("@%g", l) // thresholds may be negative
			}
			figures[key] = [4]float64{level("estimate"), level("standard_error"), level("lower"), level("upper")}
		}
		return figures
	}
	want, got := read("run/summary.parquet"), read("again.parquet")
	both := 0
	for key, a := range want {
		b, ok := got[key]
		if !ok {
			continue
		}
		both++
		for i := range a {
			if !(math.Abs(a[i]-b[i]) <= 1e-9*math.Abs(a[i])) && !(math.IsNaN(a[i]) && math.IsNaN(b[i])) {
				t.Fatalf("%s: %v in the run's summary, %v here", key, a, b)
			}
		}
	}
	if both < 1000 {
		t.Errorf("%d figures are in both tables", both)
	}
}

func TestSummariseCommand(t *testing.T) {
	inFolder(t)
	for _, args := range []string{"--out a", "--out b --set saving.return=0.04", "--out c --set panel.write=false"} {
		if status, _, stderr := cistern(t, append(strings.Fields("simulate port.yaml --households 500 --quiet"), strings.Fields(args)...)...); status != 0 {
			t.Fatal(stderr)
		}
	}
	if err := os.WriteFile("text.parquet", []byte("no Parquet"), 0o666); err != nil {
		t.Fatal(err)
	}
	for _, tt := range []struct {
		args   string
		status int
		stdout string
		stderr string
	}{
		{"summarise", 2, "", "summarise takes a panel"},
		{"summarise nowhere", 2, "", "nowhere: no such file"},
		{"summarise c", 2, "", "the run in c kept no panel"},
		{"summarise text.parquet", 1, "", "text.parquet"},
		{"summarise a --variables asets", 2, "", "column asets is not there"},
		{"summarise a --variables asets", 2, "", "did you mean assets?"},
		{"summarise a --percentiles 0", 2, "", "percentiles is 0, want above 0 and below 100"},
		{"summarise a --percentiles x", 2, "", "--percentiles"},
		{"summarise a --out table.txt", 2, "", "want the name of a file that ends in .csv, .json or .parquet"},
		{"summarise a --by persistent", 2, "", "has fractions"},
		{"summarise a --variables assets", 0, "expected_shortfall", ""},
		{"summarise a/panel/part-00000.parquet --variables assets --format json", 0, `"statistic"`, ""},
		{"summarise a b --variables assets --format csv", 0, "\nb,assets,percentile,50,", ""},
		{"summarise a --variables income --by employed --format csv", 0, "\n1,income,mean,", ""},
	} {
		t.Run(tt.args, func(t *testing.T) {
			status, stdout, stderr := cistern(t, strings.Fields(tt.args)...)
			if status != tt.status || !strings.Contains(stdout, tt.stdout) || !strings.Contains(stderr, tt.stderr) {
				t.Errorf("status %d, want %d\nstdout: %.300s\nwant %q\nstderr: %s\nwant %q", status, tt.status, stdout, tt.stdout, stderr, tt.stderr)
			}
		})
	}
}
