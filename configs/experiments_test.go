package configs

import (
	"encoding/json"
	"math"
	"reflect"
	"strings"
	"testing"
)

// TestExperiments reads what is asked for and what it is without being asked; what
// is resolved reads back the same.
func TestExperiments(t *testing.T) {
	for _, tt := range []struct {
		name, text string
		want       Experiments
		resolved   string
	}{
		{"none", "", Experiments{}, ""},
		{"none of them", "experiments: {}\n", Experiments{}, "experiments: {}\n"},
		{"transfer", "experiments: {transfer: {amount: 500}}\n",
			Experiments{Transfer: &Transfer{500, []int{30, 35, 40, 45, 50, 55, 60, 65, 70, 75, 80}, 5}},
			"    amount: 500\n    ages: [30, 35, 40, 45, 50, 55, 60, 65, 70, 75, 80]\n    years: 5\n"},
		{"decomposition", "experiments: {decomposition: {}}\n", Experiments{Decomposition: &Decomposition{[]string{"income_risk", "longevity_risk", "borrowing_limit"}, 0}},
			"    order: [income_risk, longevity_risk, borrowing_limit]\n    households: 0\n"},
		{"part of one", "experiments: {decomposition: {order: [borrowing_limit, income_risk], households: 5000}}\n", Experiments{Decomposition: &Decomposition{[]string{"borrowing_limit", "income_risk"}, 5000}},
			"    order: [borrowing_limit, income_risk]\n    households: 5000\n"},
		{"bill", "experiments:\n  transfer:\n    amount: -2e3\n    ages: [62, 31]\n    years: 0\n",
			Experiments{Transfer: &Transfer{-2000, []int{31, 62}, 0}}, "    amount: -2000\n    ages: [62, 31]\n    years: 0\n"},
	} {
		sc, err := Parse("s.yaml", []byte(small+tt.text), nil)
		if err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(sc.Experiments, tt.want) {
			t.Errorf("%s: %+v", tt.name, sc.Experiments)
		}
		again, err := Parse("s.yaml", sc.YAML(), nil)
		if err != nil {
			t.Fatal(err)
		}
		if !strings.HasSuffix(string(sc.YAML()), tt.resolved) || strings.Contains(string(sc.YAML()), "experiments") != (tt.text != "") ||
			!reflect.DeepEqual(again.Experiments, sc.Experiments) || string(again.YAML()) != string(sc.YAML()) {
			t.Errorf("%s: resolved to\n%s", tt.name, sc.YAML())
		}
	}
}

func TestExperimentFaults(t *testing.T) {
	for _, tt := range []struct{ text, want string }{
		{"experiments: {decomposition: {order: [income]}}", "experiments.decomposition.order: has income, want each of income_risk, longevity_risk or borrowing_limit at most once"},
		{"experiments: {decomposition: {order: [longevity_risk, 3]}}", "experiments.decomposition.order: has 3, want each of"},
		{"experiments: {decomposition: {order: [income_risk, income_risk]}}", "experiments.decomposition.order"},
		{"experiments: {decomposition: {order: []}}", "experiments.decomposition.order: is empty, want at least one of"},
		{"experiments: {decomposition: {households: -1}}", "experiments.decomposition.households: is -1"},
		{"experiments: 3", "s.yaml:15:14: experiments: is 3, want a block of keys"},
		{"experiments: {transfers: {}}", "s.yaml:15:15: experiments.transfers: is not a key of the format; allowed here: "},
		{"experiments: {transfer: {}}", "s.yaml:15:25: experiments.transfer.amount: is missing, and has no default"},
		{"experiments: {transfer: }", "experiments.transfer: has no value"},
		{"experiments: {transfer: {amount: 0}}", "s.yaml:15:34: experiments.transfer.amount: is 0, want an amount above 0, or below 0 for a bill"},
		{"experiments: {transfer: {amount: -0.0}}", "experiments.transfer.amount: is 0, want"},
		{"experiments: {transfer: {amount: lots}}", "experiments.transfer.amount: is lots, want a number from -1e+12 to 1e+12"},
		{"experiments: {transfer: {amount: 1e13}}", "experiments.transfer.amount: is 1e13, want from -1e+12 to 1e+12"},
		{"experiments: {transfer: {amount: 1, years: 61}}", "s.yaml:15:44: experiments.transfer.years: is 61, want a whole number from 0 to 60"},
		{"experiments: {transfer: {amount: 1, ages: 40}}", "experiments.transfer.ages: is 40, want a list of whole numbers, such as [1, 2]"},
		{"experiments: {transfer: {amount: 1, ages: []}}", "experiments.transfer.ages: has 0 entries, want 1 to 121"},
		{"experiments: {transfer: {amount: 1, ages: [29]}}", "s.yaml:15:44: experiments.transfer.ages[0]: is 29, want a whole number from 30 to 80"},
		{"experiments: {transfer: {amount: 1, ages: [40, 81]}}", "experiments.transfer.ages[1]: is 81, want a whole number from 30 to 80"},
		{"experiments: {transfer: {amount: 1, ages: [40.5]}}", "experiments.transfer.ages[0]: is 40.5, want a whole number"},
		{"experiments: {transfer: {amount: 1, ages: [40, 40]}}", "experiments.transfer.ages: has 40 twice"},
	} {
		_, err := Parse("s.yaml", []byte(small+tt.text+"\n"), nil)
		if err == nil || !IsFault(err) || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: %v\nwant %q in it", tt.text, err, tt.want)
		}
		if err != nil && strings.Contains(err.Error(), "\n") {
			t.Errorf("%s: one mistake, several faults:\n%v", tt.text, err)
		}
	}
}

func TestExperimentsInSchema(t *testing.T) {
	var schema struct {
		Properties struct {
			Experiments struct {
				Properties struct {
					Transfer struct {
						Required   []string
						Properties struct{ Ages, Years struct{ Default any } }
					}
				}
			}
		}
	}
	if err := json.Unmarshal(Schema(), &schema); err != nil {
		t.Fatal(err)
	}
	transfer := schema.Properties.Experiments.Properties.Transfer
	if !reflect.DeepEqual(transfer.Required, []string{"amount"}) || transfer.Properties.Ages.Default != nil || transfer.Properties.Years.Default != 5.0 {
		t.Errorf("transfer in the schema: %+v", transfer)
	}
}

// A debt that an estate cannot bear is refused before the run, and allowed once death
// is known.
func TestDecompositionFeasible(t *testing.T) {
	order := func(o string) error {
		_, err := Builtin("quayside-patience", []Override{{"experiments", "{decomposition: {order: " + o + "}}"}})
		return err
	}
	err := order("[borrowing_limit, longevity_risk]")
	want := "experiments.decomposition.order: borrowing_limit cannot be removed: Bequest.Shift: is 20000, want at least "
	if err == nil || !IsFault(err) || !strings.Contains(err.Error(), want) || strings.Contains(err.Error(), "\n") {
		t.Errorf("%v\nwant %q in it", err, want)
	}
	if err := order("[longevity_risk, borrowing_limit]"); err != nil {
		t.Error(err)
	}
}

// The experiment costs time in proportion to the years lived with the transfer
// (derived: nobody dies before 80, so from two ages four years each).
func TestTransferCost(t *testing.T) {
	cost := func(text string) Cost {
		sc, err := Parse("s.yaml", []byte(small+text), nil)
		if err != nil {
			t.Fatal(err)
		}
		return sc.Cost(1)
	}
	none := cost("")
	two := cost("experiments: {transfer: {amount: 1, ages: [40, 60], years: 3}}\n")
	late := cost("experiments: {transfer: {amount: 1, ages: [40, 60, 79], years: 3}}\n") // two years to live
	if lived := (late.Seconds - two.Seconds) / secondsPerSecondLife / 100; math.Abs(lived-2) > 1e-6 {
		t.Errorf("receipt at 79 adds %g household-years, want 2", lived)
	}
	if want := 100 * (8*secondsPerSecondLife + 51*2*secondsPerPass); math.Abs(two.Seconds-none.Seconds-want) > 1e-9 {
		t.Errorf("two ages of receipt add %g seconds, want %g", two.Seconds-none.Seconds, want)
	}
	if !(late.MemoryBytes > two.MemoryBytes && two.MemoryBytes > none.MemoryBytes) || two.DiskBytes != none.DiskBytes {
		t.Errorf("costs %+v, %+v and %+v", none, two, late)
	}
}

// An empty block takes what a file has asked for back.
func TestExperimentsOff(t *testing.T) {
	sc, err := Builtin("quayside", []Override{{"experiments", "{}"}})
	if err != nil {
		t.Fatal(err)
	}
	if sc.Experiments != (Experiments{}) {
		t.Errorf("experiments %+v", sc.Experiments)
	}
}

// Every cause removed costs a pass over the households, two where death is known; with
// risky income and known death the problems of 51 lengths of life, half as long on
// average, are solved too (derived).
func TestDecompositionCost(t *testing.T) {
	cost := func(text string) Cost {
		sc, err := Parse("s.yaml", []byte(small+text), nil)
		if err != nil {
			t.Fatal(err)
		}
		return sc.Cost(1)
	}
	none := cost("")
	for _, tt := range []struct {
		order            string
		passes, problems float64
	}{
		{"[income_risk]", 2, 0},
		{"[income_risk, longevity_risk, borrowing_limit]", 6, 0},
		{"[longevity_risk, income_risk]", 5, 26},
		{"[borrowing_limit, longevity_risk]", 4, 27},
	} {
		c := cost("experiments: {decomposition: {order: " + tt.order + "}}\n")
		want := tt.passes*none.HouseholdYears*secondsPerPass + tt.problems*none.NodeUpdates*secondsPerUpdate
		if math.Abs(c.Seconds-none.Seconds-want) > 1e-9 {
			t.Errorf("%s adds %g seconds, want %g", tt.order, c.Seconds-none.Seconds, want)
		}
		if c.MemoryBytes <= none.MemoryBytes {
			t.Errorf("%s takes no memory", tt.order)
		}
	}
	half := cost("experiments: {decomposition: {order: [income_risk], households: 50}}\n")
	if want := none.HouseholdYears * secondsPerPass; math.Abs(half.Seconds-none.Seconds-want) > 1e-9 {
		t.Errorf("half of the households add %g seconds, want %g", half.Seconds-none.Seconds, want)
	}
}
