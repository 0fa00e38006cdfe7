package configs

import (
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"cistern/policy"
)

// small is a scenario with everything written in an unusual but right way.
const small = `cistern: 1
title: Quayside in small
seed: 7
households: 100
life: {first_age: 30, last_age: 80, survival: certain}
preferences:
  utility: {family: crra, relative_risk_aversion: 2}
  discount_factor: 0.96
income:
  profile: {constant: 30000}
  persistent: {autocorrelation: 0.9, innovation_sd: 0.1, points: 5}
  transitory: {sd: 0.1}
saving: {return: 0.02}
public: {pension: {claim_age: 65, flat: 8000}}
`

func TestBuiltinScenarios(t *testing.T) {
	if names := Names(); len(names) != 3 || names[0] != Default {
		t.Errorf("built-in scenarios %v, want three, %s first", names, Default)
	}
	for _, name := range Names() {
		sc, err := Builtin(name, nil)
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if sc.Title == "" || sc.Name != name || len(sc.Problems()) == 0 {
			t.Errorf("%s: title %q, name %q, %d problems", name, sc.Title, sc.Name, len(sc.Problems()))
		}
	}
}

// Reading what was written gives the same scenario: every default is in it.
func TestResolvedScenarioRoundTrip(t *testing.T) {
	for _, name := range Names() {
		t.Run(name, func(t *testing.T) {
			sc, err := Builtin(name, nil)
			if err != nil {
				t.Fatal(err)
			}
			dir := t.TempDir()
			for _, in := range sc.Inputs {
				file := filepath.Join(dir, in.Name)
				if err := os.MkdirAll(filepath.Dir(file), 0o777); err != nil {
					t.Fatal(err)
				}
				if err := os.WriteFile(file, in.Data, 0o666); err != nil {
					t.Fatal(err)
				}
			}
			file := filepath.Join(dir, name+".yaml")
			if err := os.WriteFile(file, sc.YAML(), 0o666); err != nil {
				t.Fatal(err)
			}
			again, err := Load(file, nil)
			if err != nil {
				t.Fatal(err)
			}
			if string(again.YAML()) != string(sc.YAML()) {
				t.Errorf("resolved twice differs:\n%s\nwas\n%s", again.YAML(), sc.YAML())
			}
			a, b := *sc, *again
			a.resolved, b.resolved = nil, nil
			a.Solver, b.Solver = policy.Options{}, policy.Options{} // NaN for auto
			for _, s := range []*Scenario{&a, &b} {                 // NaN for stationary
				for i := range s.Groups {
					s.Groups[i].Process.InitialSD = 0
				}
			}
			if !reflect.DeepEqual(a, b) {
				t.Error("the scenario read back is another one")
			}
		})
	}
}

func TestDefaults(t *testing.T) {
	sc, err := Parse("small.yaml", []byte(small), nil)
	if err != nil {
		t.Fatal(err)
	}
	o := sc.Solver
	if o.AssetPoints != 200 || !math.IsNaN(o.HighestAssets) || !math.IsNaN(o.AssetScale) || o.Interpolation != policy.Cubic {
		t.Errorf("solver %+v", o)
	}
	if sc.Panel != (Panel{true, "double", 65536}) || len(sc.Summary.Percentiles) != 9 || len(sc.Summary.By) != 2 {
		t.Errorf("panel %+v, summary %+v", sc.Panel, sc.Summary)
	}
	if len(sc.Groups) != 1 || sc.Groups[0].Name != "households" || sc.FirstAge != 30 || sc.LastAge != 80 || sc.Currency != "crown" {
		t.Errorf("groups %+v, ages %d to %d, currency %s", sc.Groups, sc.FirstAge, sc.LastAge, sc.Currency)
	}
}

// Discount factors are the middles of equal slices of mean ± half_width: their
// mean is the mean (derived).
func TestDiscountFactors(t *testing.T) {
	sc, err := Parse("small.yaml", []byte(small), []Override{{"preferences.discount_factor", "{mean: 0.9, half_width: 0.04, points: 4}"}})
	if err != nil {
		t.Fatal(err)
	}
	want := []float64{0.87, 0.89, 0.91, 0.93}
	for i, b := range sc.Groups[0].Discounts {
		if math.Abs(b-want[i]) > 1e-15 {
			t.Errorf("factor %d is %v, want %v", i, b, want[i])
		}
	}
	if p := sc.Problems(); len(p) != 4 || p[3].Household.DiscountFactor != sc.Groups[0].Discounts[3] {
		t.Errorf("%d problems", len(p))
	}
}

func TestGroupsOverride(t *testing.T) {
	text := small + `groups:
  - {name: dockers, share: 0.75, income: {transitory: {sd: 0.3}}}
  - {name: pilots, share: 0.25, preferences: {utility: {family: cara, absolute_risk_aversion: 0.0001}}, saving: {borrowing_limit: none}}
`
	sc, err := Parse("small.yaml", []byte(text), []Override{{"groups.pilots.income.profile", "{constant: 50000}"}, {"groups.0.share", "0.7"}, {"groups.1.share", "0.3"}})
	if err != nil {
		t.Fatal(err)
	}
	dockers, pilots := sc.Groups[0].Household, sc.Groups[1].Household
	if sd := dockers.Earnings.Transitory.SD; sd != 0.3 {
		t.Errorf("dockers' transitory sd %v, want 0.3", sd)
	}
	if pilots.Earnings.Transitory.SD != 0.1 || pilots.Earnings.Profile[0] != 50000 || pilots.Utility.Family() != "cara" ||
		pilots.Limit.Kind != policy.LimitNone || dockers.Utility.Family() != "crra" {
		t.Errorf("pilots %+v", pilots)
	}
	if sc.Groups[0].Share != 0.7 {
		t.Errorf("share %v, want 0.7", sc.Groups[0].Share)
	}
}

// Every fault is reported with its place, its key and what is allowed, and all at
// once.
func TestFaults(t *testing.T) {
	for _, tt := range []struct {
		name, old, new string
		want           []string
	}{
		{"unknown key", "title:", "titel:", []string{"s.yaml:2:1: titel: is not a key of the format", "did you mean title?"}},
		{"unknown nested key", "innovation_sd: 0.1", "inovation_sd: 0.1", []string{"s.yaml:11:38: income.persistent.inovation_sd: is not a key", "did you mean innovation_sd?"}},
		{"repeated key", "seed: 7", "seed: 7\nseed: 8", []string{"s.yaml:4:1: seed: stands twice: the first is in line 3"}},
		{"word for number", "households: 100", "households: many", []string{"s.yaml:4:13: households: is many, want a whole number"}},
		{"fraction for count", "households: 100", "households: 240.5", []string{"households: is 240.5, want a whole number"}},
		{"exponent for count", "households: 100", "households: 1e5", []string{"households: is 1e5, want a whole number"}},
		{"octal", "seed: 7", "seed: 017", []string{"seed: is 017, want a whole number"}},
		{"nan", "return: 0.02", "return: .nan", []string{"saving.return: is .nan, want a number"}},
		{"inf", "constant: 30000", "constant: .inf", []string{"income.profile.constant: is .inf"}},
		{"overflow", "constant: 30000", "constant: 1e999", []string{"income.profile.constant: is 1e999"}},
		{"quoted number", "return: 0.02", `return: "0.02"`, []string{`saving.return: is "0.02", want a number`}},
		{"unit root", "autocorrelation: 0.9", "autocorrelation: 1", []string{"s.yaml:11:33: income.persistent.autocorrelation: is 1, want strictly between -1 and 1"}},
		{"negative variance", "innovation_sd: 0.1", "innovation_sd: -0.1", []string{"innovation_sd: is -0.1, want at least 0"}},
		{"empty ages", "last_age: 80", "last_age: 30", []string{"life.last_age: is 30, want above first_age, 30"}},
		{"claim before first age", "claim_age: 65", "claim_age: 30", []string{"public.pension.claim_age: is 30, want above first_age, 30"}},
		{"enormous count", "points: 5", "points: 100000", []string{"income.persistent.points: is 100000, want a whole number from 2 to 255"}},
		{"too many outcomes", "points: 5}\n  transitory: {sd: 0.1}", "points: 255}\n  transitory: {sd: 0.1, nodes: 301}\ngroups: [" + strings.TrimSuffix(strings.Repeat("{name: a, share: 0.1}, ", 10), ", ") + "]", []string{"income.transitory.nodes: makes"}},
		{"households beyond all", "households: 100", "households: 99999999999999", []string{"households: is 99999999999999"}},
		{"wrong format", "cistern: 1", "cistern: 2", []string{"cistern: is 2"}},
		{"missing format", "cistern: 1\n", "", []string{"cistern: is missing"}},
		{"missing required", "saving: {return: 0.02}", "", []string{"saving: is missing"}},
		{"family without parameter", "relative_risk_aversion: 2", "", []string{"preferences.utility.relative_risk_aversion: is missing"}},
		{"parameter of another family", "relative_risk_aversion: 2", "relative_risk_aversion: 2, bliss_point: 3", []string{"preferences.utility.bliss_point: is not a key"}},
		{"unknown family", "family: crra", "family: crrra", []string{"preferences.utility.family: is crrra, want crra, cara, quadratic or stone_geary; did you mean crra?"}},
		{"no limit with crra", "return: 0.02", "return: 0.02, borrowing_limit: none", []string{"s.yaml:13:41: saving.borrowing_limit: is none, want 0, an amount or natural"}},
		{"debt beyond repaying", "return: 0.02", "return: 0.02, borrowing_limit: 5e6", []string{"saving.borrowing_limit: is 5e+06, want at most"}},
		{"income below subsistence", "family: crra, relative_risk_aversion: 2", "family: stone_geary, relative_risk_aversion: 2, subsistence: 29000", []string{"income: is ", "want an income that stays above 29000"}},
		{"missing table", "{constant: 30000}", "{table: nowhere.csv}", []string{"s.yaml:10:20: income.profile.table: names nowhere.csv, which cannot be read"}},
		{"bad union", "survival: certain", "survival: forever", []string{"life.survival: is forever, want {table, sex, year}, {gompertz: {modal_age, dispersion}} or certain"}},
		{"negative profile", "constant: 30000", "constant: -3", []string{"income.profile: is -3, want positive in form log"}},
		{"tab", "households: 100", "households: 100\n\tx: 1", []string{"s.yaml:5:", "not tabs"}},
		{"alias", "seed: 7", "seed: &a 7", []string{"s.yaml:3:7: seed: anchors and aliases are not part of the format"}},
		{"two documents", "seed: 7", "seed: 7\n---\nx: 1", []string{"document"}},
		{"not a scenario", small, "- 1\n- 2\n", []string{"s.yaml:1:1: is a list, want a scenario"}},
		{"empty", small, "", []string{"cistern: is missing", "life: is missing"}},
		{"shares", "seed: 7", "seed: 7\ngroups: [{name: a, share: 0.4}, {name: b, share: 0.5}]", []string{"groups: has shares that sum to 0.9, want 1"}},
		{"group named all", "seed: 7", "seed: 7\ngroups: [{name: all, share: 1}]", []string{"groups[0].name: is all, want a name"}},
		{"several at once", "seed: 7\nhouseholds: 100", "seed: -7\nhouseholds: 0", []string{"seed: is -7", "households: is 0"}},
		{"block", "seed: 7", "seed: 7\npanel: {block: 5000}", []string{"panel.block: is 5000, want a multiple of 4096"}},
		{"nothing to consume", "  persistent", "  job_loss: {probability: 0.1}\n  persistent", []string{"s.yaml:1:1: start.assets: a household of group households begins with 0, want more than 0"}},
		{"nothing to consume, at its place", "seed: 7", "seed: 7\nstart: {assets: {constant: -26000}}", []string{"s.yaml:4:17: start.assets: a household of group households begins with -26000, want more than -"}},
		{"percentiles", "seed: 7", "seed: 7\nsummary: {percentiles: [50, 100]}", []string{"summary.percentiles[1]: is 100, want strictly between 0 and 100"}},
		{"percentile twice", "seed: 7", "seed: 7\nsummary: {percentiles: [50, 50.0]}", []string{"s.yaml:4:24: summary.percentiles: has 50 twice"}},
		{"growth", "seed: 7", "seed: 7\npopulation: {growth: 0.2}", []string{"s.yaml:4:22: population.growth: is 0.2, want from -0.1 to 0.1"}},
		{"population key", "seed: 7", "seed: 7\npopulation: {grows: 0}", []string{"s.yaml:4:14: population.grows: is not a key of the format; allowed here: growth"}},
		{"lorenz", "seed: 7", "seed: 7\nsummary: {lorenz: [0, 50, 50]}", []string{"summary.lorenz[0]: is 0, want strictly between 0 and 100", "summary.lorenz: has 50 twice"}},
		{"top shares", "seed: 7", "seed: 7\nsummary: {top_shares: 10}", []string{"summary.top_shares: is 10, want a list of numbers"}},
		{"shortfall", "seed: 7", "seed: 7\nsummary: {shortfall: [5, 101]}", []string{"summary.shortfall[1]: is 101, want above 0 and at most 100"}},
		{"runway", "seed: 7", "seed: 7\nsummary: {runway_months: [0, 3, 3]}", []string{"s.yaml:4:27: summary.runway_months[0]: is 0, want above 0", "summary.runway_months: has 3 twice"}},
		{"falls", "seed: 7", "seed: 7\nsummary: {consumption_falls: 5}", []string{"summary.consumption_falls: is 5, want a list of numbers"}},
		{"tail", "seed: 7", "seed: 7\nsummary: {tail: 60}", []string{"summary.tail: is 60, want above 0 and at most 50"}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			if !strings.Contains(small, tt.old) {
				t.Fatalf("the scenario has no %q", tt.old)
			}
			_, err := Parse("s.yaml", []byte(strings.Replace(small, tt.old, tt.new, 1)), nil)
			if err == nil {
				t.Fatal("no error")
			}
			if !IsFault(err) {
				t.Errorf("%v is no fault with a place", err)
			}
			for _, w := range tt.want {
				if !strings.Contains(err.Error(), w) {
					t.Errorf("got\n%v\nwant %q in it", err, w)
				}
			}
		})
	}
}

// An alias bomb, deep nesting and a huge file are refused, and at once.
func TestHostileFiles(t *testing.T) {
	bomb := "a: &a [x,x,x,x,x,x,x,x,x]\n"
	for c := 'b'; c < 'k'; c++ {
		bomb += string(c) + ": &" + string(c) + " [" + strings.TrimSuffix(strings.Repeat("*"+string(c-1)+",", 9), ",") + "]\n"
	}
	for name, text := range map[string]string{
		"aliases": bomb,
		"depth":   "a: " + strings.Repeat("[", 20000),
		"size":    "# " + strings.Repeat("x", maxScenarioBytes),
		"keys":    strings.Repeat("a: 1\n", 10000),
		"bytes":   "a: \x00\xff\xfe",
	} {
		t.Run(name, func(t *testing.T) {
			if _, err := Parse("s.yaml", []byte(text), nil); !IsFault(err) {
				t.Errorf("got %v, want a fault", err)
			}
		})
	}
}

func TestOverrides(t *testing.T) {
	if _, err := ParseOverride("saving.return"); !IsFault(err) {
		t.Errorf("an override without = gives %v", err)
	}
	sc, err := Parse("s.yaml", []byte(small), []Override{{"saving.return", "0.05"}, {"income.job_loss", "{probability: 0.1, benefit_rate: 0.5}"}, {"income.profile", "{polynomial: [10, 0.01], from: 30}"}})
	if err != nil {
		t.Fatal(err)
	}
	h := sc.Groups[0].Household
	if h.Return != 0.05 || h.Earnings.JobLoss.Probability != 0.1 || math.Abs(h.Earnings.Profile[1]-math.Exp(10.01)) > 1e-9 {
		t.Errorf("overrides did not arrive: %+v", h)
	}
	for _, tt := range []struct{ key, value, want string }{
		{"saving.retrun", "0.05", "--set saving.retrun=0.05: saving.retrun: is not a key of the format"},
		{"saving.return", "high", "--set saving.return=high: saving.return: is high, want a number"},
		{"saving.return", "", "--set saving.return=: saving.return: has no value"},
		{"groups.pilots.share", "1", "groups"},
		{"saving..return", "1", "the key has an empty part"},
		{"saving.return", "[1, ", "--set saving.return=[1, "},
	} {
		if _, err := Parse("s.yaml", []byte(small), []Override{{tt.key, tt.value}}); !IsFault(err) || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("--set %s=%s: got %v, want %q", tt.key, tt.value, err, tt.want)
		}
	}
}

func TestTables(t *testing.T) {
	const life = "life: {first_age: 30, last_age: 33, survival: {table: q.csv, sex: female, year: 2010}}"
	good := "# source\nage,sex,year,q\n30,female,2010,0.1\n31,female,2010,0.2\n32,female,2010,0.3\n30,male,2010,0.5\n"
	for _, tt := range []struct{ name, csv, want string }{
		{"good", good, ""},
		{"no column", "age,sex,q\n30,female,0.1\n", "q.csv:1: has no column year"},
		{"probability", strings.Replace(good, "0.2", "1.2", 1), `q.csv:4: q is "1.2", want a probability from 0 to 1`},
		{"age", strings.Replace(good, "31,", "x,", 1), `q.csv:4: age is "x"`},
		{"gap", strings.Replace(good, "31,female,2010,0.2\n", "", 1), "has no row for age 31"},
		{"twice", good + "30,female,2010,0.1\n", "q.csv:7: has age 30 a second time"},
		{"short", "age,sex,year,q\n30,female,2010,0.1\n", "life.survival: is for ages 30 to 30, want every age from 30 to 32"},
		{"other year", strings.ReplaceAll(good, "2010", "2011"), "has no rows for sex female and year 2010, only for female 2011, male 2011"},
		{"ragged", good + "1,2\n", "q.csv:7: wrong number of fields"},
		{"empty", "", "q.csv:1: is empty"},
		{"header alone", "age,sex,year,q\n", "q.csv:1: has a header but no rows"},
		{"column twice", "age,sex,year,q,q\n30,female,2010,0.1,0.2\n", "q.csv:1: has column q twice"},
		{"hexadecimal", strings.Replace(good, "0.2", "0x1p-2", 1), `q is "0x1p-2"`},
		{"nan", strings.Replace(good, "0.2", "NaN", 1), `q is "NaN"`},
	} {
		t.Run(tt.name, func(t *testing.T) {
			dir := t.TempDir()
			scenario := filepath.Join(dir, "s.yaml")
			text := strings.Replace(small, "life: {first_age: 30, last_age: 80, survival: certain}", life, 1)
			if err := errors.Join(os.WriteFile(filepath.Join(dir, "q.csv"), []byte(tt.csv), 0o666), os.WriteFile(scenario, []byte(text), 0o666)); err != nil {
				t.Fatal(err)
			}
			sc, err := Load(scenario, []Override{{"public.pension.claim_age", "32"}})
			switch {
			case tt.want == "" && err != nil:
				t.Error(err)
			case tt.want == "":
				if s := sc.Groups[0].Household.Survival; s[0] != 0.9 || s[1] != 0.8 || s[3] != 0 {
					t.Errorf("survival %v", s)
				}
			case err == nil || !strings.Contains(err.Error(), tt.want):
				t.Errorf("got %v, want %q", err, tt.want)
			}
		})
	}
}

func TestProfileTables(t *testing.T) {
	for _, tt := range []struct{ csv, want string }{
		{"age,earnings\n30,100\n31,110\n", ""},
		{"age,earnings\n", "y.csv:1: has a header but no rows"},
		{"age,earnings\n30,100\n", "without 31, want every age from 30 to 31"},
		{"age,earnings\n30,Inf\n31,1\n", `y.csv:2: earnings is "Inf", want a number`},
		{"age,earnings\n30,1\n30,1\n", "y.csv:3: has age 30 a second time"},
	} {
		dir := t.TempDir()
		scenario := filepath.Join(dir, "s.yaml")
		text := strings.Replace(small, "{constant: 30000}", "{table: y.csv}", 1)
		if err := errors.Join(os.WriteFile(filepath.Join(dir, "y.csv"), []byte(tt.csv), 0o666), os.WriteFile(scenario, []byte(text), 0o666)); err != nil {
			t.Fatal(err)
		}
		sc, err := Load(scenario, []Override{{"public.pension.claim_age", "32"}})
		switch {
		case tt.want == "" && err != nil:
			t.Error(err)
		case tt.want == "":
			if p := sc.Groups[0].Household.Earnings.Profile; len(p) != 2 || p[1] != 110 {
				t.Errorf("profile %v", p)
			}
		case err == nil || !strings.Contains(err.Error(), tt.want):
			t.Errorf("%q: got %v, want %q", tt.csv, err, tt.want)
		}
	}
}

// Tables of a million rows that are all wrong, or all of another kind, are answered
// at once and with a bounded list.
func TestLargeWrongTables(t *testing.T) {
	var wrong, distinct strings.Builder
	wrong.WriteString("age,sex,year,q\n")
	distinct.WriteString("age,sex,year,q\n")
	for i := range 300_000 {
		fmt.Fprintf(&wrong, "30,female,2010,%d\n", i+2)
		fmt.Fprintf(&distinct, "30,s%d,2010,0.5\n", i)
	}
	for name, csv := range map[string]string{"wrong": wrong.String(), "distinct": distinct.String()} {
		dir := t.TempDir()
		scenario := filepath.Join(dir, "s.yaml")
		text := strings.Replace(small, "survival: certain", "survival: {table: q.csv, sex: female, year: 2010}", 1)
		if err := errors.Join(os.WriteFile(filepath.Join(dir, "q.csv"), []byte(csv), 0o666), os.WriteFile(scenario, []byte(text), 0o666)); err != nil {
			t.Fatal(err)
		}
		_, err := Load(scenario, nil)
		if !IsFault(err) || strings.Count(err.Error(), "\n") > maxFaults {
			t.Errorf("%s: got %.300v", name, err)
		}
		if name == "wrong" && !strings.Contains(err.Error(), "only the first 100 faults are listed") {
			t.Errorf("got %.300v", err)
		}
	}
}

func TestMissingScenario(t *testing.T) {
	for _, name := range []string{filepath.Join(t.TempDir(), "none.yaml"), t.TempDir()} {
		if _, err := Load(name, nil); !IsFault(err) {
			t.Errorf("%s: got %v, want a fault", name, err)
		}
	}
	if _, err := Builtin("quaysid", nil); err == nil || !strings.Contains(err.Error(), "did you mean quayside?") {
		t.Errorf("got %v", err)
	}
}

// A run that costs nothing, or the same whatever is simulated, would be a wrong
// estimate.
func TestCost(t *testing.T) {
	sc, err := Builtin(Default, nil)
	if err != nil {
		t.Fatal(err)
	}
	c := sc.Cost(1)
	more, err := Builtin(Default, []Override{{"households", "200000"}})
	if err != nil {
		t.Fatal(err)
	}
	d := more.Cost(1)
	if math.Abs(d.HouseholdYears/c.HouseholdYears-10) > 1e-9 || d.NodeUpdates != c.NodeUpdates || d.DiskBytes <= 2*c.DiskBytes || more.Cost(2).Seconds >= d.Seconds {
		t.Errorf("cost %+v, of ten times as many %+v", c, d)
	}
	if c.HouseholdYears < 50*20000 || c.HouseholdYears > 65*20000 {
		t.Errorf("%v household-years of 20000 lives from 25", c.HouseholdYears)
	}
}

// FuzzLoad: whatever a file says, reading it ends with a scenario or a fault.
func FuzzLoad(f *testing.F) {
	f.Add(small)
	for _, name := range Names() {
		source, err := Source(name)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(string(source))
	}
	f.Fuzz(func(t *testing.T, text string) {
		sc, err := Parse("s.yaml", []byte(text), nil)
		if err == nil {
			if _, err := Parse("again.yaml", sc.YAML(), nil); err != nil && len(sc.Inputs) == 0 {
				t.Errorf("the resolved scenario is refused: %v", err)
			}
			return
		}
		if !IsFault(err) {
			t.Errorf("%v is no fault with a place", err)
		}
	})
}
