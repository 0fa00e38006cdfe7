package income_test

import (
	"strings"
	"testing"

	"cistern/income"
)

// What each remark must say; the figures are those of TestTauchenAccuracyByPersistence.
func TestRemarks(t *testing.T) {
	rouwenhorst := func(n int) income.Discretiser { return income.Rouwenhorst{Points: n} }
	grid := func(n int, span float64) income.Discretiser { return income.Tauchen{Points: n, Span: span} }
	tests := []struct {
		name string
		d    income.Discretiser
		rho  float64
		want [][]string // words of each remark, in order
	}{
		{"exact", rouwenhorst(7), 0.99, nil},
		{"exact and alternating", rouwenhorst(7), -0.9, nil},
		{"kurtosis just within", rouwenhorst(5), 0.9, nil},
		{"short tails", rouwenhorst(4), 0.9, [][]string{{"kurtosis 2.333", "more points"}}},
		{"Tauchen with many points", grid(25, 3), 0.5, nil},
		{"Tauchen too wide", grid(15, 3), 0.9, [][]string{{"standard deviation", "3.1 % too high"}, {"rouwenhorst", "15 points"}}},
		{"Tauchen at high persistence", grid(9, 3), 0.99, [][]string{{"28.5 % too high"}, {"0.998631", "506 years instead of 69"}, {"innovations", "% too low"}, {"rouwenhorst", "9 points", "more points"}}},
		{"Tauchen hardly moving", grid(5, 3), 0.99, [][]string{{"36.2 % too high"}, {"autocorrelation 1 "}, {"innovations with standard deviation 0.00367", "99.6 % too low"}, {"rouwenhorst", "5 points"}}},
		{"Tauchen too narrow", grid(25, 1), 0.9, [][]string{{"too low"}, {"autocorrelation"}, {"innovations"}, {"reach only 1 ", "wider span"}, {"kurtosis"}}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			p := income.AR1{Autocorrelation: tt.rho, InnovationSD: 1}
			checkRemarks(t, income.Remarks(p, discretise(t, tt.d, p)), tt.want)
		})
	}
}

func checkRemarks(t *testing.T, got []string, want [][]string) {
	t.Helper()
	if len(got) != len(want) {
		t.Fatalf("got %d remarks, want %d:\n%s", len(got), len(want), strings.Join(got, "\n"))
	}
	for i, words := range want {
		for _, w := range words {
			if !strings.Contains(got[i], w) {
				t.Errorf("%q lacks %q", got[i], w)
			}
		}
	}
}

func TestRemarksWithoutAChainToSpeakOf(t *testing.T) {
	checkRemarks(t, income.Remarks(income.AR1{Autocorrelation: 0.9}, income.Degenerate()), nil)
	checkRemarks(t, income.Remarks(income.AR1{Autocorrelation: 0.9, InnovationSD: 0.1}, income.Degenerate()), [][]string{{"left out"}})
}

func TestTransitoryRemarks(t *testing.T) {
	tests := []struct {
		name  string
		shock income.Transitory
		want  [][]string
	}{
		{"none", income.Transitory{Nodes: 2}, nil},
		{"none on one node", income.Transitory{Nodes: 1}, nil},
		{"one node", income.Transitory{SD: 0.2, Nodes: 1}, [][]string{{"leaves transitory risk out"}}},
		// Derived: two nodes at ±4 sds of weight ½ have 4 times the sd.
		{"two nodes", income.Transitory{SD: 0.2, Nodes: 2}, [][]string{{"0.8 on 2 nodes (trapezoid)", "300.0 % too high"}}},
		{"five nodes", income.Transitory{SD: 0.2, Nodes: 5}, [][]string{{"7.3 % too low"}}}, // see TestTrapezoidMoments
		{"seven nodes", income.Transitory{SD: 0.2, Nodes: 7}, nil},
		{"two Gauss–Hermite nodes", income.Transitory{SD: 0.2, Nodes: 2, Rule: income.GaussHermite}, nil},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) { checkRemarks(t, tt.shock.Remarks(), tt.want) })
	}
}

func TestProjectionRemarks(t *testing.T) {
	seven := discretise(t, income.Rouwenhorst{Points: 7}, income.AR1{Autocorrelation: 0.95, InnovationSD: 0.15})
	six := discretise(t, income.Rouwenhorst{Points: 6}, income.AR1{Autocorrelation: 0.95, InnovationSD: 0.15})
	checkRemarks(t, seven.ProjectionRemarks(0), nil)
	checkRemarks(t, six.ProjectionRemarks(0), [][]string{{"no node at 0"}})
	// Nodes lie 0.392 apart: 0.3² + 0.392²/12 = 0.3207² (Sheppard's correction).
	checkRemarks(t, seven.ProjectionRemarks(0.3), [][]string{{"0.32", "0.3 asked for", "6.9 % too high"}})
	checkRemarks(t, seven.ProjectionRemarks(0.05), [][]string{{"too low"}}) // all in the middle cell
	checkRemarks(t, income.Degenerate().ProjectionRemarks(0.3), nil)
}
