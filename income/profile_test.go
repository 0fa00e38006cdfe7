package income_test

import (
	"math"
	"testing"

	"cistern/income"
)

// By hand, at ages 30 and 31: x = 5 and 6, 1 + 2x − x² = −14 and −23.
func TestPolynomial(t *testing.T) {
	coefficients := []float64{1, 2, -1}
	level := income.Polynomial(income.Level, coefficients, 25, 30, 2)
	logs := income.Polynomial(income.Log, coefficients, 25, 30, 2)
	for k, want := range []float64{-14, -23} {
		near(t, "level", level[k], want, 0)
		near(t, "log, relative", logs[k]/math.Exp(want), 1, 1e-15)
	}
	near(t, "half-way origin", income.Polynomial(income.Level, []float64{0, 1}, 24.5, 25, 1)[0], 0.5, 0)
	near(t, "no coefficients", income.Polynomial(income.Log, nil, 0, 25, 1)[0], 1, 0)
}

func TestTable(t *testing.T) {
	ages, earnings := []int{27, 25, 26, 40}, []float64{3, 1, 2, 9} // any order, more than needed
	tests := []struct {
		name         string
		ages         []int
		first, years int
		want         []float64
		faults       []string
	}{
		{"all there", ages, 25, 3, []float64{1, 2, 3}, nil},
		{"part", ages, 26, 2, []float64{2, 3}, nil},
		{"no years", ages, 99, 0, []float64{}, nil},
		{"two missing", ages, 24, 5, nil, []string{"ages", "ages"}},
		{"twice", []int{25, 26, 25, 40}, 25, 2, nil, []string{"ages[2]"}},
		{"twice and missing", []int{25, 25, 26, 40}, 25, 3, nil, []string{"ages[1]", "ages"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			got, err := income.Table(tt.ages, earnings, tt.first, tt.years)
			checkFaults(t, err, tt.faults...)
			if len(got) != len(tt.want) {
				t.Fatalf("got %v, want %v", got, tt.want)
			}
			for k := range got {
				near(t, "earnings", got[k], tt.want[k], 0)
			}
		})
	}
	mustPanic(t, func() { _, _ = income.Table(ages, earnings[:2], 25, 1) })
}

func TestConstant(t *testing.T) {
	got := income.Constant(30000, 3)
	if len(got) != 3 || got[0] != 30000 || got[2] != 30000 {
		t.Errorf("got %v", got)
	}
}
