package distribution

import (
	"errors"
	"math"
	"strings"
	"testing"
)

// TestStudyFaults: rows that do not fit end the study with an error that says why.
func TestStudyFaults(t *testing.T) {
	good := func() *Rows { return newVillage(300, false, true, 1).blocks[0] }
	for name, tt := range map[string]struct {
		spoil func(r *Rows)
		want  string
	}{
		"weight":       {func(r *Rows) { r.Weight[3] = -1 }, "row 3 weighs -1"},
		"nan weight":   {func(r *Rows) { r.Weight[3] = math.NaN() }, "weighs NaN"},
		"few weights":  {func(r *Rows) { r.Weight = r.Weight[:3] }, "3 weights for 60 rows"},
		"nan":          {func(r *Rows) { r.Values[0][5] = math.NaN(); r.Weight[5] = 1 }, "a value of x is not finite"},
		"infinite":     {func(r *Rows) { r.Values[1][5] = math.Inf(1); r.Weight[5] = 1 }, "a value of y is not finite"},
		"cell":         {func(r *Rows) { r.Spans[0].Cell = 3 }, "cell 3 of 3"},
		"short column": {func(r *Rows) { r.Values[1] = r.Values[1][:9] }, "column y has 9 rows"},
		"columns":      {func(r *Rows) { r.Values = r.Values[:1] }, "1 variables, want 60 and 2"},
		"gap":          {func(r *Rows) { r.Spans[1].From++ }, "follows row"},
		"uncovered":    {func(r *Rows) { r.Spans = r.Spans[:2] }, "cover 40 rows of 60"},
	} {
		r := good()
		tt.spoil(r)
		s, err := NewStudy(newVillage(300, false, true, 1).options())
		if err != nil {
			t.Fatal(err)
		}
		commit, err := s.Add(0, r)
		if err == nil {
			err = commit()
		}
		if err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("%s: %v, want word of %q", name, err, tt.want)
		}
		if _, again := s.Add(0, good()); again == nil {
			t.Errorf("%s: the study goes on", name)
		}
	}
}

// TestOtherRows: later passes over other rows are noticed, whichever figures are
// wanted.
func TestOtherRows(t *testing.T) {
	for _, wants := range []Set{Percentiles, Concentration} {
		noticed := false
		o := alone(4000)
		o.Budget = 1 << 13
		o.Targets[0].Wants[0] = wants
		s, err := NewStudy(o)
		if err != nil {
			t.Fatal(err)
		}
		x := make([]float64, 4000)
		for pass, more := 0, true; more; pass++ {
			for k := range x {
				x[k] = float64(k*k) + 1e6*float64(pass)
			}
			commit, err := s.Add(0, column(x))
			if err == nil && commit != nil {
				err = commit()
			}
			if err == nil {
				more, err = s.EndPass()
			}
			if err != nil {
				if !errors.Is(err, ErrPassesDiffer) {
					t.Errorf("error %v, want %v", err, ErrPassesDiffer)
				}
				noticed = true
				break
			}
		}
		if !noticed {
			t.Errorf("%v: other rows went unnoticed", wants)
		}
	}
}

func TestOptions(t *testing.T) {
	o := alone(10)
	o.Percentiles, o.Lorenz, o.TopShares, o.Shortfalls, o.Tails = []float64{0, 50, 50}, []float64{100}, []float64{math.NaN()}, []float64{101}, []float64{-1}
	o.Means, o.Workers, o.Targets[0].Cells = []int{1}, 0, []Cell{{0, 1}, {0, 0}, {1, 1}}
	o.Variables[0].Shares, o.Variables[0].MeanOnly = []Threshold{{Value: math.NaN()}}, true
	err := o.Validate()
	if err == nil {
		t.Fatal("accepted")
	}
	for _, want := range []string{"percentile 0", "percentile 50 stands twice", "lorenz 100", "top share NaN", "shortfall 101", "tail -1", "means of variable 1",
		"0 workers", "a threshold is no number", "only its mean is wanted", "cell 0 is not one of 1, or stands twice"} {
		if !strings.Contains(err.Error(), want) {
			t.Errorf("no word of %q in: %v", want, err)
		}
	}
	weighted := newVillage(30000, false, true, 1).options()
	weighted.Budget = 1 << 16
	var short *MemoryError
	if _, err := NewStudy(weighted); !errors.As(err, &short) {
		t.Errorf("weighted rows beyond the budget: %v, want a MemoryError", err)
	}
}
