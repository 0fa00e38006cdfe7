package evidence

import (
	"context"
	"errors"
	"testing"
)

// Every check must pass, and every check must be able to fail: its tolerance is
// small against what a wrong program would give.
func TestRun(t *testing.T) {
	seen := 0
	checks, err := Run(context.Background(), func(Check) { seen++ })
	if err != nil {
		t.Fatal(err)
	}
	if len(checks) < 40 || seen != len(checks) {
		t.Errorf("%d checks, %d reported, want at least 40", len(checks), seen)
	}
	for _, c := range checks {
		if !c.Pass() {
			t.Errorf("%s: %s: found %.12g, want %.12g within %.1e (%s)", c.Area, c.Name, c.Found, c.Expected, c.Tolerance, c.Source)
		}
		if c.Source == "" || c.Tolerance <= 0 {
			t.Errorf("%s: no source or tolerance", c.Name)
		}
		c.Found += 2*c.Tolerance + 1e-15
		if c.Pass() {
			t.Errorf("%s: passes whatever is found", c.Name)
		}
	}
}

func TestRunStops(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Run(ctx, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("got %v, want a cancelled run", err)
	}
}
