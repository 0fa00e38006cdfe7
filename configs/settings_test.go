package configs

import (
	"strings"
	"testing"
)

// Every key of a resolved scenario has a meaning, and the settings are those that
// the resolved file holds.
func TestSettings(t *testing.T) {
	for _, name := range Names() {
		sc, err := Builtin(name, nil)
		if err != nil {
			t.Fatal(err)
		}
		yaml := string(sc.YAML())
		found := map[string]string{}
		for _, s := range sc.Settings() {
			if s.Meaning == "" {
				t.Errorf("%s: %s has no meaning", name, s.Key)
			}
			last := s.Key[strings.LastIndexByte(s.Key, '.')+1:]
			if !strings.Contains(yaml, last+": "+s.Value) {
				t.Errorf("%s: %s: %s is not in the resolved scenario", name, s.Key, s.Value)
			}
			found[s.Key] = s.Value
		}
		for key, want := range map[string]string{"cistern": "1", "panel.precision": "double", "groups.dockers.life.first_age": "25"} {
			if name == "quayside" && found[key] != want {
				t.Errorf("%s is %q, want %q", key, found[key], want)
			}
		}
	}
}
