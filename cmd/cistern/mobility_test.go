package main

import (
	"math"
	"slices"
	"strconv"
	"testing"

	"cistern/output"
)

// The mobility of a run is what sorting its panel gives: who is in which class at
// both ages, classes of equal size among those alive at both.
func TestMobilityFromThePanel(t *testing.T) {
	inFolder(t)
	if status, _, stderr := cistern(t, "simulate", "port.yaml", "--set", "summary.mobility=[{}, {from_age: 30, to_age: 31, quantiles: 2}]"); status != 0 {
		t.Fatalf("status %d: %s", status, stderr)
	}
	type key struct{ household, age int64 }
	assets, group := map[key]float64{}, map[int64]string{}
	err := output.ReadPanel("runs/port/panel", []string{"household", "group", "age", "assets"}, func(p *output.Table) error {
		for i, id := range p.Column("household").Ints {
			assets[key{id, p.Column("age").Ints[i]}] = p.Column("assets").Floats[i]
			group[id] = p.Column("group").Strings[i]
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	found := 0
	for _, r := range records(t, "runs/port/mobility.csv") {
		if r["statistic"] != "probability" {
			continue
		}
		number := func(column string) int64 { n, _ := strconv.ParseInt(r[column], 10, 64); return n }
		var ids []int64
		for id := range group {
			_, before := assets[key{id, number("from_age")}]
			_, after := assets[key{id, number("to_age")}]
			if before && after && (r["group"] == "all" || r["group"] == group[id]) {
				ids = append(ids, id)
			}
		}
		class := func(age int64) map[int64]int64 {
			slices.SortFunc(ids, func(a, b int64) int {
				if d := assets[key{a, age}] - assets[key{b, age}]; d != 0 {
					return int(math.Copysign(1, d))
				}
				return int(a - b)
			})
			of := map[int64]int64{}
			for i, id := range ids {
				if i > 0 && assets[key{id, age}] == assets[key{ids[i-1], age}] {
					of[id] = of[ids[i-1]] // equal assets, one class
					continue
				}
				of[id] = int64(math.Ceil(float64(i)*float64(number("quantiles"))/float64(len(ids)-1))) - 1
				of[id] = max(of[id], 0) + 1
			}
			return of
		}
		from, to := class(number("from_age")), class(number("to_age"))
		in, both := 0.0, 0.0
		for _, id := range ids {
			if from[id] == number("from_quantile") {
				in++
				if to[id] == number("to_quantile") {
					both++
				}
			}
		}
		if found++; math.Abs(float(t, r["estimate"])-both/in) > 1e-12 || float(t, r["households"]) != in {
			t.Errorf("%v: from the panel %g of %g households", r, both/in, in)
		}
	}
	if found != 3*(25+4) {
		t.Errorf("%d probabilities, want 87", found)
	}
}

// Runway and the changes of consumption of a run are what its panel gives.
func TestBuffersFromThePanel(t *testing.T) {
	inFolder(t)
	if status, _, stderr := cistern(t, "simulate", "port.yaml", "--set", "summary.runway_months=[3, 12]", "--set", "summary.consumption_falls=[7.5]"); status != 0 {
		t.Fatalf("status %d: %s", status, stderr)
	}
	const age = 45
	var n, below, changes, falls, losses, lost float64
	last := map[int64]float64{}
	err := output.ReadPanel("runs/port/panel", []string{"household", "age", "employed", "consumption", "assets"}, func(p *output.Table) error {
		for i, id := range p.Column("household").Ints {
			c := p.Column("consumption").Floats[i]
			if p.Column("age").Ints[i] == age {
				n++
				if p.Column("assets").Floats[i] < 3*c/12 {
					below++
				}
				change := c/last[id] - 1
				changes += change
				if change < -0.075 {
					falls++
				}
				if p.Column("employed").Ints[i] == 0 {
					losses++
					lost += change
				}
			}
			last[id] = c
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	want := map[string]float64{"runway_months share_below 3": below / n, "consumption_change mean ": changes / n,
		"consumption_change share_below -0.075": falls / n, "consumption_change_job_loss mean ": lost / losses}
	for _, r := range records(t, "runs/port/summary.csv") {
		key := r["variable"] + " " + r["statistic"] + " " + r["level"]
		if x, ok := want[key]; ok && r["group"] == "all" && r["age"] == strconv.Itoa(age) {
			if math.Abs(float(t, r["estimate"])-x) > 1e-8 || !(float(t, r["standard_error"]) > 0) {
				t.Errorf("%v: from the panel %v", r, x)
			}
			delete(want, key)
		}
	}
	if len(want) > 0 || !(lost/losses < changes/n-0.02) {
		t.Errorf("not in the summary: %v; consumption changes by %g, at job loss by %g", want, changes/n, lost/losses)
	}
}
