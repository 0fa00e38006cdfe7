package main

import (
	"bytes"
	"encoding/csv"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"testing"
)

// The whole pipeline against the C yardstick, a program of its own that solves and
// simulates the same model with other random streams: mean assets and consumption
// at every tenth age within 4 standard errors of the difference.
func TestYardstickPanel(t *testing.T) {
	root, err := filepath.Abs(filepath.Join("..", ".."))
	if err != nil {
		t.Fatal(err)
	}
	t.Chdir(t.TempDir())
	const households = 60000
	status, _, stderr := cistern(t, "simulate", filepath.Join(root, "testdata", "yardstick-S.yaml"), "--households", strconv.Itoa(households), "--out", "r", "--quiet")
	if status != 0 {
		t.Fatal(stderr)
	}
	read := func(name string) [][]string {
		text, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		r := csv.NewReader(bytes.NewReader(text))
		r.Comment = '#'
		rows, err := r.ReadAll()
		if err != nil {
			t.Fatal(err)
		}
		return rows
	}
	summary := read("r/summary.csv")
	at := func(name string) int { return slices.Index(summary[0], name) }
	number := func(s string) float64 {
		x, err := strconv.ParseFloat(s, 64)
		if err != nil {
			t.Fatal(err)
		}
		return x
	}
	compared := 0
	for _, ref := range read(filepath.Join(root, "testdata", "yardstick-S-ages.csv"))[1:] {
		age := number(ref[0])
		if int(age)%10 != 5 {
			continue
		}
		for _, row := range summary[1:] {
			if row[at("group")] != "all" || row[at("age")] != ref[0] || row[at("statistic")] != "mean" {
				continue
			}
			want := map[string]string{"assets": ref[2], "consumption": ref[3]}[row[at("variable")]]
			if want == "" {
				continue
			}
			compared++
			// the yardstick's own error is smaller by the root of its households over ours
			allowed := 4 * number(row[at("standard_error")]) * math.Sqrt(1+households/1e6)
			if got := number(row[at("estimate")]); math.Abs(got-number(want)) > allowed {
				t.Errorf("age %s: mean %s %.6g, the yardstick has %s, allowed difference %.2g", ref[0], row[at("variable")], got, want, allowed)
			}
		}
	}
	if compared != 16 {
		t.Errorf("compared %d means, want 16", compared)
	}
}
