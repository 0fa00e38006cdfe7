package pension_test

import (
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"

	"cistern/income"
	"cistern/policy/pension"
)

// near reports whether got is within tolerance of want.
func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: got %.12g, want %.12g ± %g", what, got, want, tolerance)
	}
}

// cohort is born in 1980 and lives from 20 for sure until 85, after which years
// there is nobody.
func cohort(survival []float64) pension.Cohort {
	return pension.Cohort{Birth: 1980, FirstAge: 20, Survival: survival, Return: 0.03}
}

// law makes rules concrete, which must be possible.
func law(t testing.TB, r pension.Rules, c pension.Cohort) *pension.Law {
	t.Helper()
	l, err := r.For(c)
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// rules are those of most tests: average earnings of 30000 in 2020 that grow by 1 %.
func rules() pension.Rules {
	r := pension.NoRules()
	r.Wages = pension.Wages{Average: 30000, Growth: pension.Constant(0.01), BaseYear: 2020}
	return r
}

func constant(x float64) pension.Parameter { return pension.Constant(x) }

func inf() float64 { return math.Inf(1) }

// wantFaults checks that err has exactly the fields given, in order, each as
// "Field: part of its text".
func wantFaults(t *testing.T, err error, want ...string) {
	t.Helper()
	got := income.Faults(err)
	for i, w := range want {
		field, text, _ := strings.Cut(w, ": ")
		if i >= len(got) {
			t.Errorf("no fault %q", w)
			continue
		}
		if got[i].Field != field || !strings.Contains(got[i].Error(), text) {
			t.Errorf("fault %d: got %q, want %q", i, got[i].Error(), w)
		}
	}
	for _, extra := range got[min(len(got), len(want)):] {
		t.Errorf("another fault: %q", extra.Error())
	}
	if err != nil && len(got) == 0 {
		t.Errorf("no FieldError: %v", err)
	}
}

// makeham is the survival of ages first … last under the hazard A + B·c^x, its
// integral over a year taken exactly; the last entry is 0.
func makeham(a, b, c float64, first, last int) []float64 {
	s := make([]float64, last-first+1)
	for t := range last - first {
		x := float64(first + t)
		s[t] = math.Exp(-a - b*(math.Pow(c, x+1)-math.Pow(c, x))/math.Log(c))
	}
	return s
}

// readLifeTables reads death probabilities from a file with columns year, sex, age, q.
func readLifeTables(t *testing.T, path string) map[string]income.LifeTable {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	rows, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	tables := map[string]income.LifeTable{}
	for _, row := range rows[1:] {
		q, err := strconv.ParseFloat(row[3], 64)
		if err != nil {
			t.Fatal(err)
		}
		k := fmt.Sprintf("%s %s", row[1], row[0])
		l := tables[k]
		l.Q = append(l.Q, q)
		tables[k] = l
	}
	return tables
}
