package configs

import "testing"

func TestX(t *testing.T) {
	for _, n := range Names() {
		sc, err := Builtin(n, nil)
		if err != nil {
			t.Error(err)
			continue
		}
		t.Log("\n" + string(sc.YAML()))
	}
	for _, n := range []string{"S", "L"} {
		if _, err := Load("../testdata/yardstick-"+n+".yaml", nil); err != nil {
			t.Error(err)
		}
	}
	t.Log(len(Schema()))
}
