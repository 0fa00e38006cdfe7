package configs

import (
	"reflect"
	"strings"
	"testing"
)

// TestMobility reads pairs of ages in every form; what is resolved reads back the
// same.
func TestMobility(t *testing.T) {
	for _, tt := range []struct {
		first, last, text string
		want              []Mobility
		resolved          string
	}{
		{"30", "80", "", []Mobility{{35, 55, 5}}, "  mobility:\n    - from_age: 35\n      to_age: 55\n      quantiles: 5\n"},
		{"40", "80", "", []Mobility{{40, 60, 5}}, "from_age: 40"},
		{"20", "30", "", []Mobility{{20, 30, 5}}, "from_age: 20"},
		{"30", "36", "", []Mobility{{35, 36, 5}}, "from_age: 35"},
		{"34", "35", "", []Mobility{{34, 35, 5}}, "from_age: 34"},
		{"30", "80", "summary: {mobility: {}}", []Mobility{{35, 55, 5}}, "from_age: 35"},
		{"30", "80", "summary: {mobility: []}", nil, "  mobility: []\n"},
		{"30", "80", "summary: {mobility: {from_age: 50, quantiles: 10}}", []Mobility{{50, 70, 10}}, "to_age: 70"},
		{"30", "80", "summary: {mobility: {from_age: 79}}", []Mobility{{79, 80, 5}}, "to_age: 80"},
		{"30", "80", "summary: {mobility: [{from_age: 30, to_age: 31}, {quantiles: 2}]}", []Mobility{{30, 31, 5}, {35, 55, 2}},
			"    - from_age: 30\n      to_age: 31\n      quantiles: 5\n    - from_age: 35\n      to_age: 55\n      quantiles: 2\n"},
	} {
		text := strings.NewReplacer("first_age: 30", "first_age: "+tt.first, "last_age: 80", "last_age: "+tt.last).Replace(small) + tt.text + "\n"
		if tt.last < "65" {
			text = strings.Replace(text, "claim_age: 65", "claim_age: "+tt.last, 1)
		}
		sc, err := Parse("s.yaml", []byte(text), nil)
		if err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(sc.Summary.Mobility, tt.want) {
			t.Errorf("ages %s to %s, %s: %v, want %v", tt.first, tt.last, tt.text, sc.Summary.Mobility, tt.want)
		}
		again, err := Parse("s.yaml", sc.YAML(), nil)
		if err != nil {
			t.Fatal(err)
		}
		if !strings.Contains(string(sc.YAML()), tt.resolved) || !reflect.DeepEqual(again.Summary, sc.Summary) || string(again.YAML()) != string(sc.YAML()) {
			t.Errorf("%s resolved to\n%s", tt.text, sc.YAML())
		}
	}
	sc, err := Parse("s.yaml", []byte(small), []Override{{"summary.mobility.to_age", "44"}})
	if err != nil || !reflect.DeepEqual(sc.Summary.Mobility, []Mobility{{35, 44, 5}}) {
		t.Errorf("overridden: %v, %v", sc.Summary.Mobility, err)
	}
}

func TestMobilityFaults(t *testing.T) {
	for _, tt := range []struct{ text, want string }{
		{"{mobility: 35}", "s.yaml:15:21: summary.mobility: is 35, want {from_age, to_age, quantiles}, or a list of such blocks"},
		{"{mobility: [35]}", "s.yaml:15:22: summary.mobility[0]: is 35, want"},
		{"{mobility: {from_age: 29}}", "s.yaml:15:32: summary.mobility.from_age: is 29, want a whole number from 30 to 79"},
		{"{mobility: {from_age: 80}}", "summary.mobility.from_age: is 80, want a whole number from 30 to 79"},
		{"{mobility: {to_age: 81}}", "summary.mobility.to_age: is 81, want a whole number from 31 to 80"},
		{"{mobility: {from_age: 60, to_age: 60}}", "s.yaml:15:44: summary.mobility.to_age: is 60, want above from_age, 60"},
		{"{mobility: {to_age: 31}}", "summary.mobility.to_age: is 31, want above from_age, 35"},
		{"{mobility: [{}, {from_age: 40, quantiles: 1}]}", "summary.mobility[1].quantiles: is 1, want a whole number from 2 to 20"},
		{"{mobility: {quantiles: 21}}", "summary.mobility.quantiles: is 21, want a whole number from 2 to 20"},
		{"{mobility: [{}, {from_age: 35}]}", "s.yaml:15:26: summary.mobility[1]: stands twice: ages 35 and 55, 5 quantiles"},
		{"{mobility: {age: 35}}", "summary.mobility.age: is not a key of the format; allowed here: from_age, to_age, quantiles"},
		{"{mobility: [" + strings.Repeat("{}, ", 20) + "{}]}", "summary.mobility: has 21 entries, want at most 20"},
		{"{mobility: }", "summary.mobility: has no value"},
	} {
		_, err := Parse("s.yaml", []byte(small+"summary: "+tt.text+"\n"), nil)
		if err == nil || !IsFault(err) || !strings.Contains(err.Error(), tt.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s: %v\nwant %q alone", tt.text, err, tt.want)
		}
	}
}
