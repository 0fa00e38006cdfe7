package configs

import (
	"bytes"
	"encoding/json"
	"math"
	"strings"
	"testing"

	"github.com/santhosh-tekuri/jsonschema/v6"
	"go.yaml.in/yaml/v4"
)

func compiled(t *testing.T) *jsonschema.Schema {
	t.Helper()
	doc, err := jsonschema.UnmarshalJSON(bytes.NewReader(Schema()))
	if err != nil {
		t.Fatal(err)
	}
	c := jsonschema.NewCompiler()
	if err := c.AddResource("scenario.json", doc); err != nil {
		t.Fatal(err)
	}
	s, err := c.Compile("scenario.json")
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// instance turns YAML into what a schema validates.
func instance(t *testing.T, text []byte) any {
	t.Helper()
	var v any
	if err := yaml.Load(text, &v); err != nil {
		t.Fatal(err)
	}
	b, err := json.Marshal(v)
	if err != nil {
		t.Fatal(err)
	}
	out, err := jsonschema.UnmarshalJSON(bytes.NewReader(b))
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// The schema accepts what ships with the program, as written and as resolved, and
// refuses what the program refuses. The judge is a general-purpose validator.
func TestSchema(t *testing.T) {
	schema := compiled(t)
	accept := func(name string, text []byte) {
		t.Helper()
		if err := schema.Validate(instance(t, text)); err != nil {
			t.Errorf("%s is refused: %v", name, err)
		}
	}
	for _, name := range Names() {
		source, err := Source(name)
		if err != nil {
			t.Fatal(err)
		}
		accept(name, source)
		sc, err := Builtin(name, nil)
		if err != nil {
			t.Fatal(err)
		}
		accept(name+" resolved", sc.YAML())
	}
	accept("small", []byte(small))
	for _, change := range []struct{ old, new string }{
		{"title:", "titel:"}, {"autocorrelation: 0.9", "autocorrelation: 1"}, {"households: 100", "households: 1.5"},
		{"family: crra", "family: other"}, {"survival: certain", "survival: forever"}, {"innovation_sd: 0.1", "innovation_sd: -1"},
		{"return: 0.02", "return: 0.02, borrowing_limit: some"}, {"cistern: 1", "cistern: 2"}, {"saving: {return: 0.02}", "saving: {}"},
	} {
		text := strings.Replace(small, change.old, change.new, 1)
		if err := schema.Validate(instance(t, []byte(text))); err == nil {
			t.Errorf("%q for %q is accepted", change.new, change.old)
		}
		if _, err := Parse("s.yaml", []byte(text), nil); err == nil {
			t.Errorf("the program accepts %q for %q", change.new, change.old)
		}
	}
}

func TestSpanWords(t *testing.T) {
	for want, s := range map[string]span{"at least 0": atLeast(0), "above 0": above(0), "from 1 to 2": within(1, 2),
		"strictly between -1 and 1": between(-1, 1), "above 0 and at most 1": aboveTo(0, 1), "a finite number": anyNumber()} {
		if got := s.String(); got != want {
			t.Errorf("%q, want %q", got, want)
		}
	}
	if s := between(0, 1); s.holds(0) || s.holds(1) || !s.holds(0.5) || s.holds(math.NaN()) {
		t.Error("an open span holds its ends or no inside")
	}
}
