package income_test

import (
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"strconv"
	"testing"

	"cistern/income"
)

// derivedTable is a life table from age 20 to 130 with hazard 3e-4 + 8e-6·1.115^x,
// whose integral over a year is taken exactly.
func derivedTable() income.LifeTable {
	l := income.LifeTable{FirstAge: 20}
	for x := 20.0; x < 130; x++ {
		integral := 3e-4 + 8e-6*(math.Pow(1.115, x+1)-math.Pow(1.115, x))/math.Log(1.115)
		l.Q = append(l.Q, -math.Expm1(-integral))
	}
	return l
}

// Derived: an independent program, tolerance 1e-9. l_20 = 1.
func TestLifeTableAgainstAHazard(t *testing.T) {
	l := derivedTable()
	s, err := l.Survival(20, 130)
	if err != nil {
		t.Fatal(err)
	}
	alive := make([]float64, len(s)+1)
	alive[0] = 1
	for k := range s {
		alive[k+1] = alive[k] * s[k]
	}
	near(t, "one-year survival at 65", s[45], .9897572335, 1e-9)
	near(t, "one-year survival at 80", s[60], .9498415674, 1e-9)
	near(t, "alive at 65", alive[45], .9050456643, 1e-9)
	near(t, "alive at 80", alive[60], .6298824856, 1e-9)
	near(t, "alive at 95", alive[75], .1003775316, 1e-9)
	near(t, "last age", s[110], 0, 0)
	curtate, annuity := 0.0, 0.0
	for k := 45; k < len(alive); k++ {
		annuity += alive[k] / alive[45] * math.Pow(1.02, float64(45-k))
		curtate += alive[k] / alive[45]
	}
	near(t, "curtate expectancy at 65", curtate-1, 18.9795314808, 1e-9)
	near(t, "annuity-due at 65 and 2 %", annuity, 16.1562847938, 1e-9)
	// Derived: with deaths spread over the year, half a year more than curtate.
	near(t, "expectancy at 65", l.Expectancy(65), 19.4795314808, 1e-9)
}

type tableKey struct{ year, sex string }

// readTables reads death probabilities from a file with columns year, sex, age, q.
func readTables(t *testing.T, path string) map[tableKey]income.LifeTable {
	t.Helper()
	tables := map[tableKey]income.LifeTable{}
	for _, r := range readRows(t, path) {
		k := tableKey{r[0], r[1]}
		l := tables[k]
		if age := int(number(t, r[2])); age != len(l.Q) {
			t.Fatalf("%s: age %d where %d was expected", path, age, len(l.Q))
		}
		l.Q = append(l.Q, number(t, r[3]))
		tables[k] = l
	}
	return tables
}

func readRows(t *testing.T, path string) [][]string {
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
	return rows[1:]
}

func number(t *testing.T, s string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// mortalityFiles are the extract of the tests and the file that ships with the
// scenarios.
func mortalityFiles() []string {
	return []string{"../testdata/income/us_mortality_extract.csv", "../configs/data/us_mortality_decennial.csv"}
}

// Published, from memory: US National Center for Health Statistics, life tables
// 1939–41 (two decimals) and United States Life Tables, 2010 (National Vital
// Statistics Reports 63-7, Table A, one decimal).
func TestLifeExpectancyPublished(t *testing.T) {
	tests := []struct {
		year, sex       string
		age             int
		want, tolerance float64
	}{
		{"1940", "male", 65, 12.07, 0.0051},
		{"1940", "female", 65, 13.57, 0.0051},
		{"2010", "male", 65, 17.7, 0.051},
		{"2010", "female", 65, 20.3, 0.051},
	}
	for _, path := range mortalityFiles() {
		tables := readTables(t, path)
		for _, tt := range tests {
			got := tables[tableKey{tt.year, tt.sex}].Expectancy(tt.age)
			near(t, fmt.Sprintf("%s: expectancy at %d, %s %s", path, tt.age, tt.sex, tt.year), got, tt.want, tt.tolerance)
		}
	}
}

// Derived: computed in R from the same table by the same conventions, three
// decimals (five for the share that lives to 65).
func TestLifeExpectancyComputedElsewhere(t *testing.T) {
	for _, path := range mortalityFiles() {
		tables := readTables(t, path)
		for _, r := range readRows(t, "../testdata/income/us_life_expectancy.csv") {
			l := tables[tableKey{r[0], r[1]}]
			for k, age := range []int{0, 20, 65, 85} {
				near(t, fmt.Sprintf("%s: expectancy at %d, %s %s", path, age, r[1], r[0]), l.Expectancy(age), number(t, r[2+k]), 0.0021)
			}
			s, err := l.Survival(0, 65)
			if err != nil {
				t.Fatal(err)
			}
			alive := 1.0
			for _, p := range s[:65] {
				alive *= p
			}
			near(t, "alive at 65", alive, number(t, r[6]), 5.1e-6)
		}
	}
}

// By hand: of those aged 60 half die within the year, of the rest a quarter in the
// next, and a quarter a year ever after: ½·1 + ½·½ … = 0.75 + ½·0.875 + ⅜/ln(4/3).
func TestExpectancyByHand(t *testing.T) {
	l := income.LifeTable{FirstAge: 60, Q: []float64{0.5, 0.25}}
	near(t, "at 60", l.Expectancy(60), 0.75+0.5*0.875+0.375/math.Log(4./3), 1e-14)
	near(t, "at 61", l.Expectancy(61), 0.875+0.75/math.Log(4./3), 1e-14)
	infants := income.LifeTable{Q: []float64{0.2, 1}} // 0.8 + 0.2·0.1 + 0.8·½
	near(t, "at birth", infants.Expectancy(0), 1.22, 1e-15)
	for _, age := range []int{59, 62} {
		if got := l.Expectancy(age); !math.IsNaN(got) {
			t.Errorf("expectancy at %d outside the table is %g", age, got)
		}
	}
	if got := (income.LifeTable{Q: []float64{0.5, 0}}).Expectancy(0); !math.IsInf(got, 1) {
		t.Errorf("expectancy where nobody dies is %g", got)
	}
}

func TestLifeTableFaults(t *testing.T) {
	tests := []struct {
		name        string
		q           []float64
		first, last int
		want        []string
	}{
		{"whole", []float64{0.1, 0.2, 0.3}, 50, 53, nil}, // age 53 is the last and needs no entry
		{"single year", []float64{0.1}, 50, 50, nil},
		{"dead certain", []float64{0, 1}, 50, 52, nil},
		{"starts late", []float64{0.1, 0.2}, 49, 51, []string{"Q"}},
		{"ends early", []float64{0.1, 0.2}, 50, 53, []string{"Q"}},
		{"empty", nil, 50, 60, []string{"Q"}},
		{"backwards", []float64{0.1, 0.2}, 52, 50, []string{"ages"}},
		{"no chances", []float64{-0.1, 1.1, math.NaN(), 0.5}, 50, 60, []string{"Q", "Q[0] (age 50)", "Q[1] (age 51)", "Q[2] (age 52)"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			s, err := income.LifeTable{FirstAge: 50, Q: tt.q}.Survival(tt.first, tt.last)
			checkFaults(t, err, tt.want...)
			if err == nil && len(s) != tt.last-tt.first+1 {
				t.Errorf("%d entries", len(s))
			}
		})
	}
	s, _ := income.LifeTable{FirstAge: 50, Q: []float64{0.1, 0.2, 0.3}}.Survival(51, 53)
	for k, want := range []float64{0.8, 0.7, 0} {
		near(t, "survival from 51", s[k], want, 1e-15)
	}
}

// Derived: the integral of the hazard from x to the modal age is
// 1 − exp((x − modal)/dispersion), over the year from the modal age e^(1/9) − 1.
func TestGompertz(t *testing.T) {
	s, err := income.Gompertz{ModalAge: 88, Dispersion: 9}.Survival(25, 120)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "at the modal age", s[63], math.Exp(1-math.Exp(1./9)), 1e-15)
	alive, deaths := 1.0, make([]float64, len(s))
	for k, p := range s {
		if k == 63 {
			near(t, "alive at the modal age", alive, math.Exp(math.Exp(-7)-1), 1e-15)
		}
		deaths[k] = alive * (1 - p)
		alive *= p
	}
	for k := range deaths { // most deaths in one of the years beside the modal age
		if deaths[k] > deaths[62] && deaths[k] > deaths[63] {
			t.Errorf("more deaths at %d than around the modal age", 25+k)
		}
	}
	near(t, "last age", s[95], 0, 0)
}

func TestGompertzExtremes(t *testing.T) {
	tests := []struct {
		name  string
		g     income.Gompertz
		first float64
	}{
		{"all at once, later", income.Gompertz{ModalAge: 88, Dispersion: 1e-3}, 1},
		{"all at once, before", income.Gompertz{ModalAge: 20, Dispersion: 1e-3}, 0},
		{"nearly even", income.Gompertz{ModalAge: 88, Dispersion: 1e300}, 1},
		{"smallest dispersion", income.Gompertz{ModalAge: 88, Dispersion: 5e-324}, 1},
		{"far away", income.Gompertz{ModalAge: -1e300, Dispersion: 1}, 0},
	}
	for _, tt := range tests {
		s, err := tt.g.Survival(60, 62)
		if err != nil {
			t.Fatal(err)
		}
		near(t, tt.name, s[0], tt.first, 1e-15)
	}
}

func TestGompertzFaults(t *testing.T) {
	nan := math.NaN()
	for _, tt := range []struct {
		g           income.Gompertz
		first, last int
		want        []string
	}{
		{income.Gompertz{ModalAge: 88, Dispersion: 0}, 20, 90, []string{"Dispersion"}},
		{income.Gompertz{ModalAge: nan, Dispersion: nan}, 90, 20, []string{"ModalAge", "Dispersion", "ages"}},
		{income.Gompertz{ModalAge: math.Inf(1), Dispersion: math.Inf(1)}, 20, 90, []string{"ModalAge", "Dispersion"}},
	} {
		_, err := tt.g.Survival(tt.first, tt.last)
		checkFaults(t, err, tt.want...)
	}
}

func TestCertain(t *testing.T) {
	s := income.Certain(98, 100)
	for k, want := range []float64{1, 1, 0} {
		near(t, "survival", s[k], want, 0)
	}
	if len(s) != 3 || len(income.Certain(60, 60)) != 1 {
		t.Error("a survival curve has an entry for each age from first to last")
	}
	mustPanic(t, func() { income.Certain(61, 60) })
}
