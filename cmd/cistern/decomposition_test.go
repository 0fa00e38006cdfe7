package main

import (
	"os"
	"strings"
	"testing"

	"cistern/output"
)

// The experiment leaves its tables, a sentence and a section of the page, the same
// for any number of workers.
func TestDecompositionExperiment(t *testing.T) {
	inFolder(t)
	var tables [2][]byte
	for i, args := range []string{"--out a --workers 1", "--out b --workers 3"} {
		status, _, stderr := cistern(t, append(strings.Fields("simulate port.yaml --households 3000 --set experiments.decomposition.order=[income_risk,longevity_risk]"), strings.Fields(args)...)...)
		if status != 0 || !strings.Contains(stderr, " because of longevity risk, removed in this order; ") || !strings.Contains(stderr, "premium:  to be rid of income risk a household would give up, of its consumption, ") {
			t.Fatalf("status %d, %s", status, stderr)
		}
		var err error
		if tables[i], err = os.ReadFile(string(rune('a'+i)) + "/decomposition.parquet"); err != nil {
			t.Fatal(err)
		}
	}
	if string(tables[0]) != string(tables[1]) {
		t.Error("the table depends on the number of workers")
	}
	if err := output.Verify("a"); err != nil {
		t.Error(err)
	}
	page, err := os.ReadFile("a/report.html")
	if err != nil || !strings.Contains(string(page), `<section id="decomposition"`) {
		t.Errorf("the page has no such section, %v", err)
	}
	again, err := output.ReadTable("a/decomposition.parquet")
	if err != nil {
		t.Fatal(err)
	}
	removed := map[string]bool{}
	for _, r := range again.Column("removed").Strings {
		removed[r] = true
	}
	if len(removed) != 4 || !removed["income_risk + longevity_risk"] || !removed["longevity_risk"] {
		t.Errorf("steps and parts %v", removed)
	}
}
