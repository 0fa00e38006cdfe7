package main

import (
	"encoding/csv"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"

	"cistern/configs"
	"cistern/output"
	"cistern/output/stats"
	"cistern/policy"
	"cistern/sim/transfer"
)

// records reads a CSV file as one map a row.
func records(t *testing.T, file string) []map[string]string {
	t.Helper()
	data, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	r := csv.NewReader(strings.NewReader(string(data)))
	r.Comment = '#'
	lines, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var all []map[string]string
	for _, line := range lines[1:] {
		row := map[string]string{}
		for i, name := range lines[0] {
			row[name] = line[i]
		}
		all = append(all, row)
	}
	return all
}

func float(t *testing.T, text string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// The experiment's files are there where it is asked for, and the same for any
// number of workers; what is consumed and held in the first year is the transfer;
// fifths hold a fifth each where assets differ.
func TestTransferExperiment(t *testing.T) {
	inFolder(t)
	const ask = "experiments.transfer={amount: 2000, ages: [34, 42, 47, 58], years: 3}"
	var first []byte
	for _, workers := range []string{"1", "3"} {
		status, _, stderr := cistern(t, "simulate", "port.yaml", "--set", ask, "--set", "panel.write=false", "--workers", workers, "--out", "run"+workers)
		if status != 0 || !strings.Contains(stderr, "transfer: of 2000 crown that nobody expected, ") {
			t.Fatalf("status %d: %s", status, stderr)
		}
		data, err := os.ReadFile("run" + workers + "/transfer.parquet")
		if err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = data
		} else if string(first) != string(data) {
			t.Error("three workers write another transfer.parquet than one")
		}
	}
	spent, households := map[string]float64{}, map[string]float64{}
	for _, r := range records(t, "run1/transfer.csv") {
		cell := strings.Join([]string{r["group"], r["first_age"], r["wealth_fifth"]}, "/")
		x := float(t, r["estimate"])
		households[cell] = float(t, r["households"])
		switch key := r["variable"] + "/" + r["statistic"] + "/" + r["years_since"]; key {
		case "consumption/share_of_transfer/0":
			spent[cell] = x
			if !(x > 0 && x <= 1) || !(float(t, r["standard_error"]) < 0.05) {
				t.Errorf("%s: consumes %g (± %s) of it", cell, x, r["standard_error"])
			}
		case "consumption/mean_propensity/0":
			if !(x > 0 && x < 1) {
				t.Errorf("%s: propensity %g", cell, x)
			}
		case "assets/share_of_transfer/0":
			if math.Abs(spent[cell]+x-1) > 1e-9 {
				t.Errorf("%s: consumes %g and holds %g of it", cell, spent[cell], x)
			}
		case "consumption/share_to_date/3":
			if !(x > spent[cell]) && households[cell] > 100 {
				t.Errorf("%s: %g consumed in four years, %g in one", cell, x, spent[cell])
			}
		}
	}
	if len(spent) != 3*4*6 { // two groups and all; three bands and all ages; five fifths and all
		t.Errorf("%d cells, want 72", len(spent))
	}
	for _, band := range []string{"40", "50"} { // at 30 many have nothing
		for fifth := range 5 {
			if got, want := households["all/"+band+"/"+strconv.Itoa(fifth+1)], households["all/"+band+"/"]/5; math.Abs(got-want) > 2 {
				t.Errorf("fifth %d at %s holds %g of %g households", fifth+1, band, got, 5*want)
			}
		}
	}
	if !(spent["all/40/1"] > 1.2*spent["all/40/5"]) {
		t.Errorf("the poorest fifth consumes %g of it, the richest %g", spent["all/40/1"], spent["all/40/5"])
	}
	status, _, stderr := cistern(t, "simulate", "port.yaml", "--set", "panel.write=false", "--out", "plain")
	if status != 0 || strings.Contains(stderr, "transfer") {
		t.Fatalf("status %d without the experiment: %s", status, stderr)
	}
	if _, err := os.Stat("plain/transfer.csv"); err == nil {
		t.Error("a run without the experiment has its table")
	}
}

// Where ages are taken together those of the more numerous young count more
// (derived: (1 + growth)^−(age − first age) times those alive).
func TestTransferWeighsAges(t *testing.T) {
	inFolder(t)
	if status, _, stderr := cistern(t, "simulate", "port.yaml", "--set", "experiments.transfer={amount: 2000, ages: [35, 45, 55], years: 0}",
		"--set", "panel.write=false", "--set", "population.growth=0.05"); status != 0 {
		t.Fatalf("status %d: %s", status, stderr)
	}
	sum, total, got := 0.0, 0.0, 0.0
	for _, r := range records(t, "runs/port/transfer.csv") {
		if r["group"] != "all" || r["wealth_fifth"] != "" || r["variable"]+r["statistic"] != "consumptionshare_of_transfer" {
			continue
		}
		if r["first_age"] == "" {
			got = float(t, r["estimate"])
			continue
		}
		w := math.Pow(1.05, 30-(float(t, r["first_age"])+5)) * float(t, r["households"])
		sum += w * float(t, r["estimate"])
		total += w
	}
	if math.Abs(got-sum/total) > 1e-12 {
		t.Errorf("all ages consume %.12g of it, want %.12g", got, sum/total)
	}
}

// Bills that some cannot pay are counted; and those that nobody can.
func TestBillExperiment(t *testing.T) {
	inFolder(t)
	for _, tt := range []struct{ amount, want string }{
		{"-15000", "transfer: of a bill of 15000 crown that nobody expected, consumption bears "},
		{"-1e9", "transfer: of a bill of 1e+09 crown nothing can be said: no household could pay it"},
	} {
		status, _, stderr := cistern(t, "simulate", "port.yaml", "--set", "experiments.transfer={amount: "+tt.amount+"}", "--set", "panel.write=false", "--replace")
		if status != 0 || !strings.Contains(stderr, tt.want) {
			t.Fatalf("status %d: %s", status, stderr)
		}
		unable := 0
		for _, r := range records(t, "runs/port/transfer.csv") {
			if r["statistic"] != "share_unable" {
				continue
			}
			unable++
			if x := float(t, r["estimate"]); tt.amount == "-1e9" && x != 1 || r["group"] == "all" && r["first_age"]+r["wealth_fifth"] == "" && !(x > 0.01) {
				t.Errorf("bill of %s: %g cannot pay: %v", tt.amount, x, r)
			}
		}
		if unable == 0 {
			t.Error("no row says who cannot pay")
		}
	}
}

// The jackknife errors of responses match how much responses differ from sample to
// sample, and the intervals cover: 200 samples of 1280 households, twenty a
// jackknife group, against their mean. Limits of wealth are kept.
func TestTransferErrorsMatchTheSpread(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	sc, err := configs.Parse("port.yaml", []byte(port), nil)
	if err != nil {
		t.Fatal(err)
	}
	var households []policy.Household
	for _, p := range sc.Problems() {
		households = append(households, p.Household)
	}
	rules, err := solveAll(t.Context(), households, sc.Solver, 2, func(int64) {})
	if err != nil {
		t.Fatal(err)
	}
	p := sc.Population(rules, nil)
	p.Households = 1280
	o := transfer.Options{Amount: 3000, Ages: []int{40, 45}, Years: 4, Bands: []transfer.Band{{First: 40, Last: 49}}, Limits: [][]float64{{3000, 10000}}}
	const samples = 200
	figures := map[string][]stats.Estimate{}
	for range samples {
		p.Seed++
		r, err := transfer.Run(t.Context(), p, o)
		if err != nil {
			t.Fatal(err)
		}
		x := output.Transfer{Amount: o.Amount, Bands: []output.Band{{First: 40, Last: 49}}, Groups: []string{"dockers", "pilots"}, Classes: 3, Years: 4}
		for i := range r.Cells {
			x.Cells = append(x.Cells, output.TransferSums(r.Cells[i]))
		}
		all, poor := x.Response(-1, -1, -1), x.Response(0, 0, 0)
		for name, e := range map[string]stats.Estimate{"propensity": all.Propensity, "consumed": all.Consumed[0], "to date": all.Cumulated[4],
			"held": all.Held[2], "of income": all.OfIncome, "poor dockers": poor.Consumed[0]} {
			figures[name] = append(figures[name], e)
		}
	}
	for name, list := range figures {
		mean, square, errors, covered := 0.0, 0.0, 0.0, 0.0
		for _, e := range list {
			mean += e.Value / samples
			errors += e.StandardError * e.StandardError / samples
		}
		for _, e := range list {
			square += (e.Value - mean) * (e.Value - mean) / (samples - 1)
			if e.Lower <= mean && mean <= e.Upper {
				covered++
			}
		}
		if ratio := errors / square; math.Abs(ratio-1) > 4*math.Sqrt(2.0/samples) {
			t.Errorf("%s: mean square error %.3g times the variance over samples", name, ratio)
		}
		if covered/samples < 0.95-4*math.Sqrt(0.05*0.95/samples) {
			t.Errorf("%s: intervals cover in %g of %d samples", name, covered, samples)
		}
	}
}
