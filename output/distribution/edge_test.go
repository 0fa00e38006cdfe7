package distribution

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"sync"
	"testing"

	"cistern/output/stats"
)

// figures lists all figures of a study, with their names.
func figures(s *Study) (names []string, list []stats.Estimate) {
	note := func(e stats.Estimate, name ...any) {
		names, list = append(names, strings.TrimSpace(fmt.Sprintln(name...))), append(list, e)
	}
	for t := range s.o.Targets {
		r := s.Target(t)
		note(stats.Estimate{Value: float64(r.Rows())}, "rows", t)
		for v, variable := range s.o.Variables {
			note(stats.Estimate{Value: float64(r.Values(v))}, "values", t, v)
			note(r.Mean(v), "mean", t, v)
			note(r.SD(v), "sd", t, v)
			note(r.Proportion(v), "proportion", t, v)
			note(r.Ratio(v, 0), "ratio", t, v)
			for i := range variable.Shares {
				note(r.Share(v, i), "share", t, v, i)
			}
			wants := s.o.Targets[t].Wants[v]
			if wants&Gini != 0 {
				note(r.Gini(v), "gini", t, v)
			}
			if wants&Median != 0 {
				note(r.Median(v), "median", t, v)
			}
			for i := range s.o.Percentiles {
				if wants&Percentiles != 0 {
					note(r.Percentile(v, i), "percentile", t, v, i)
				}
			}
			if wants&Concentration != 0 {
				for i := range s.o.Lorenz {
					note(r.Lorenz(v, i), "lorenz", t, v, i)
				}
				for i := range s.o.TopShares {
					note(r.TopShare(v, i), "top share", t, v, i)
				}
				note(r.QuintileRatio(v), "s80/s20", t, v)
			}
			for i := range s.o.Shortfalls {
				if wants&Shortfall != 0 {
					note(r.Shortfall(v, i), "shortfall", t, v, i)
				}
			}
			for i := range s.o.Tails {
				if wants&Tail != 0 {
					e, k := r.Hill(v, i)
					note(e, "hill", t, v, i)
					note(stats.Estimate{Value: float64(k)}, "rows of hill", t, v, i)
				}
			}
			for class := range s.o.Classes {
				if wants&Classes != 0 {
					note(r.MeanIn(v, class, 0), "mean in class", t, v, class)
				}
			}
		}
	}
	return names, list
}

func sameBits(a, b stats.Estimate) bool {
	for _, x := range [][2]float64{{a.Value, b.Value}, {a.StandardError, b.StandardError}, {a.Lower, b.Lower}, {a.Upper, b.Upper}} {
		if math.Float64bits(x[0]) != math.Float64bits(x[1]) {
			return false
		}
	}
	return true
}

// runOn runs a study on several goroutines, the last block first.
func runOn(t testing.TB, o Options, blocks []*Rows) *Study {
	t.Helper()
	s, err := NewStudy(o)
	if err != nil {
		t.Fatal(err)
	}
	for more := true; more; {
		commits := make([]func() error, len(blocks))
		var wg sync.WaitGroup
		for w := range o.Workers {
			wg.Go(func() {
				for i := len(blocks) - 1 - w; i >= 0; i -= o.Workers {
					commit, err := s.Add(w, blocks[i])
					if err != nil {
						t.Error(err)
					}
					commits[i] = commit
				}
			})
		}
		wg.Wait()
		for _, commit := range commits {
			if commit != nil {
				if err := commit(); err != nil {
					t.Fatal(err)
				}
			}
		}
		if more, err = s.EndPass(); err != nil {
			t.Fatal(err)
		}
	}
	return s
}

// TestStudyWorkers asks for the same bits from any number of workers.
func TestStudyWorkers(t *testing.T) {
	for _, weighted := range []bool{false, true} {
		v := newVillage(3000, true, weighted, 5)
		for _, budget := range []int64{0, 1 << 15} {
			if weighted && budget > 0 {
				continue
			}
			o := v.options()
			o.Budget = budget
			names, want := figures(runOn(t, o, v.blocks))
			for o.Workers = 2; o.Workers <= 4; o.Workers++ {
				_, got := figures(runOn(t, o, v.blocks))
				for i, e := range got {
					if !sameBits(e, want[i]) {
						t.Errorf("weighted %v, budget %d, %d workers: %s is %v, was %v", weighted, budget, o.Workers, names[i], e, want[i])
					}
				}
			}
		}
	}
}

// TestStudyPasses asks for the same bits from any number of passes, but for Gini
// coefficients and the intervals of percentiles of dependent rows. With one row in
// a unit there are the latter too.
func TestStudyPasses(t *testing.T) {
	for _, cells := range []bool{false, true} {
		v := newVillage(6000, cells, false, 6)
		o := v.options()
		names, want := figures(run(t, o, v.blocks...))
		seen := map[int]bool{}
		for budget := int64(1 << 10); budget <= 1<<17; budget *= 2 {
			o.Budget = budget
			s := run(t, o, v.blocks...)
			seen[s.Passes()] = true
			_, got := figures(s)
			for i, e := range got {
				switch {
				case strings.HasPrefix(names[i], "gini"):
					continue
				case strings.HasPrefix(names[i], "percentile"), strings.HasPrefix(names[i], "median"):
					if e.Value != want[i].Value {
						t.Errorf("budget %d: %s is %v, was %v", budget, names[i], e.Value, want[i].Value)
					}
				case !sameBits(e, want[i]):
					t.Errorf("budget %d: %s is %v, was %v", budget, names[i], e, want[i])
				}
			}
		}
		if !seen[3] || len(seen) < 3 || seen[1] {
			t.Errorf("passes %v, want 3 and more numbers", seen)
		}
	}
}

// TestFrequencyWeights: whole weights give the means, shares and partial sums of the
// long form, in which a row stands as often as it weighs; standard errors too, since
// copies of a row are of one unit, and quantiles as the inverse of F.
func TestFrequencyWeights(t *testing.T) {
	short := newVillage(1500, false, true, 7)
	long := &village{ofCell: short.ofCell}
	for _, b := range short.blocks {
		l := &Rows{First: b.First, Values: make([][]float64, 2)}
		for _, sp := range b.Spans {
			from := l.N
			for k := sp.From; k < sp.To; k++ {
				b.Weight[k] = math.Floor(2 * b.Weight[k])
				for range int(b.Weight[k]) {
					l.Unit = append(l.Unit, b.Unit[k])
					for v := range l.Values {
						l.Values[v] = append(l.Values[v], b.Values[v][k])
					}
					l.N++
				}
			}
			l.Spans = append(l.Spans, Span{sp.Cell, from, l.N})
		}
		long.blocks = append(long.blocks, l)
	}
	a, b := run(t, short.options(), short.blocks...), run(t, long.options(), long.blocks...)
	names, want := figures(b)
	_, got := figures(a)
	for i, name := range names {
		switch kind := strings.Fields(name)[0]; kind {
		case "rows", "values", "sd", "gini", "percentile", "median", "hill":
			continue // of the number of rows, or compared below
		default:
			if !(math.Abs(got[i].Value-want[i].Value) <= 1e-10*math.Abs(want[i].Value) || math.IsNaN(want[i].Value) && math.IsNaN(got[i].Value)) {
				t.Errorf("%s is %v, in the long form %v", name, got[i].Value, want[i].Value)
			}
			if kind != "share" && kind != "proportion" && !(math.Abs(got[i].StandardError-want[i].StandardError) <= 1e-7*want[i].StandardError+1e-13 || math.IsNaN(want[i].StandardError)) {
				t.Errorf("error of %s is %v, in the long form %v", name, got[i].StandardError, want[i].StandardError)
			}
		}
	}
	c := long.crowd(&long.options().Targets[0], 0)
	r := a.Target(0)
	n := float64(r.Values(0))
	long0 := float64(len(c))
	near(t, "sd", r.SD(0).Value*math.Sqrt((n-1)/n), c.sd()*math.Sqrt((long0-1)/long0), 1e-10)
	for i, p := range a.o.Percentiles {
		if got, want := r.Percentile(0, i).Value, c.quantile(p/100, true); got != want {
			t.Errorf("percentile %v is %v, in the long form %v", p, got, want)
		}
	}
}

// TestStudyEdges: targets without rows, with one, with equal values only, with
// nothing but losses, and with values missing throughout.
func TestStudyEdges(t *testing.T) {
	nan := math.NaN()
	for _, tt := range []struct {
		name string
		x    []float64
		want map[string]float64 // NaN: missing; the rest is not looked at
	}{
		{"none", nil, map[string]float64{"rows": 0, "mean": nan, "sd": nan, "share": nan, "gini": nan, "percentile": nan, "lorenz": nan, "top share": nan, "s80/s20": nan, "shortfall": nan, "hill": nan, "rows of hill": 0}},
		{"one", []float64{3}, map[string]float64{"rows": 1, "mean": 3, "sd": nan, "gini": nan, "percentile": 3, "shortfall": 3, "hill": nan, "share": 0}},
		{"equal", slices.Repeat([]float64{0.1}, 500), map[string]float64{"rows": 500, "mean": 0.1, "sd": 0, "percentile": 0.1, "shortfall": 0.1, "s80/s20": 1, "share": 1, "hill": nan}},
		{"zeros", slices.Repeat([]float64{0}, 500), map[string]float64{"mean": 0, "gini": nan, "lorenz": nan, "top share": nan, "s80/s20": nan, "shortfall": 0, "hill": nan}},
		{"debts", []float64{-4, -3, -2, -1, -4, -3, -2, -1}, map[string]float64{"mean": -2.5, "gini": nan, "lorenz": nan, "hill": nan, "shortfall": -4, "share": 1}},
		{"absent", []float64{nan, nan, nan}, map[string]float64{"rows": 3, "values": 0, "mean": nan, "gini": nan, "percentile": nan, "lorenz": nan, "shortfall": nan}},
		{"huge", []float64{-1e150, 1e150, 2e150, 3e150}, map[string]float64{"mean": 1.25e150, "shortfall": -1e150}},
		{"tiny", []float64{1e-310, 2e-310, 3e-310}, map[string]float64{"rows": 3, "values": 3}},
	} {
		for _, budget := range []int64{0, 64} {
			o := alone(1000)
			o.Budget = budget
			o.Variables[0].Optional = true
			o.Percentiles, o.Lorenz, o.TopShares, o.Shortfalls, o.Tails = []float64{1e-9}, []float64{50}, []float64{10}, []float64{0.1}, []float64{20}
			s := run(t, o, column(tt.x))
			names, list := figures(s)
			for i, name := range names {
				for kind, want := range tt.want {
					if at := strings.TrimRight(name, " 0"); at != kind {
						continue
					}
					if got := list[i].Value; !(math.Abs(got-want) <= 1e-12*math.Abs(want)) && !(math.IsNaN(got) && math.IsNaN(want)) {
						t.Errorf("%s, budget %d: %s is %v, want %v", tt.name, budget, kind, got, want)
					}
				}
			}
		}
	}
}

// TestSample: rows that come in the order of their values are sampled evenly: in
// several passes the errors of Gini coefficients and percentiles are about those in
// memory. derived: either error is known to 9 %; 3.5 times what both make is allowed.
func TestSample(t *testing.T) {
	v := newVillage(60000, false, false, 9)
	o := v.options()
	o.Cells, o.Targets = 1, o.Targets[2:]
	x := slices.Concat(v.blocks[0].Values[0], v.blocks[1].Values[0], v.blocks[2].Values[0], v.blocks[3].Values[0], v.blocks[4].Values[0])
	for k, v := range x {
		x[k] = math.Copysign(math.Pow(math.Abs(v), 0.4), v) // a tail that 20,000 rows show
	}
	slices.Sort(x)
	for b, rows := range v.blocks {
		rows.Spans = []Span{{0, 0, rows.N}}
		copy(rows.Values[0], x[b*rows.N:])
		for k, u := range rand.New(rand.NewPCG(9, uint64(b))).Perm(rows.N) {
			rows.Unit[k] = int64(u)
		}
	}
	whole := run(t, o, v.blocks...).Target(0)
	o.Budget = 1 << 20
	s := run(t, o, v.blocks...)
	if s.Passes() < 3 || s.Sampled() < 10000 || s.Sampled() > 20000 {
		t.Fatalf("%d passes, a sample of %d", s.Passes(), s.Sampled())
	}
	split := s.Target(0)
	near(t, "error of gini in passes over that in memory", split.Gini(0).StandardError/whole.Gini(0).StandardError, 1, 0.45)
	near(t, "error of the median in passes over that in memory", split.Percentile(0, 3).StandardError/whole.Percentile(0, 3).StandardError, 1, 0.45)
}

// TestTies: a mass at the limit between classes goes to the lower class whole, and
// partial sums take of it what is their share. derived: of ten rows 0 0 0 0 0 0 1 2 3
// 4 the poorest 50 % have nothing, the poorest 75 % (0.5 of the eighth row) 2 of 10,
// the richest 10 % 0.4; the worst 70 % have 1/7 on average.
func TestTies(t *testing.T) {
	var x []float64
	for range 300 {
		x = append(x, 0, 0, 4, 0, 1, 0, 2, 0, 3, 0)
	}
	o := alone(len(x))
	o.Lorenz, o.TopShares, o.Shortfalls = []float64{50, 75}, []float64{10}, []float64{10, 70}
	o.Classes, o.Means, o.Targets[0].Wants[0] = 4, []int{0}, all
	for _, budget := range []int64{0, 1 << 12} {
		o.Budget = budget
		s := run(t, o, column(x))
		r := s.Target(0)
		for _, tt := range []struct {
			name      string
			got, want float64
		}{
			{"lorenz 50", r.Lorenz(0, 0).Value, 0}, {"lorenz 75", r.Lorenz(0, 1).Value, 0.2}, {"top 10", r.TopShare(0, 0).Value, 0.4},
			{"shortfall 10", r.Shortfall(0, 0).Value, 0}, {"shortfall 70", r.Shortfall(0, 1).Value, 1. / 7},
			{"first class", r.MeanIn(0, 0, 0).Value, 0}, {"third class", r.MeanIn(0, 2, 0).Value, 1.5}, {"fourth class", r.MeanIn(0, 3, 0).Value, 3.5},
		} {
			near(t, fmt.Sprintf("%d passes: %s", s.Passes(), tt.name), tt.got, tt.want, 1e-14)
		}
		if e := r.MeanIn(0, 1, 0); !math.IsNaN(e.Value) {
			t.Errorf("the second class is empty, but has mean %v", e.Value)
		}
	}
}

// TestTiesInPasses: values that many rows share amid values that no two rows share
// neither take more passes nor change a bit.
func TestTiesInPasses(t *testing.T) {
	for _, cells := range []bool{false, true} {
		v := newVillage(60000, cells, false, 8)
		for _, b := range v.blocks {
			for k := range b.Values[0] {
				if k%3 == 0 { // pensions
					b.Values[0][k] = []float64{1, 1.001, 1.0011, 1.5, 3}[k%15/3]
				}
			}
		}
		o := v.options()
		o.Percentiles = append(o.Percentiles, 55, 60, 61.3, 64, 65, 70, 75)
		names, want := figures(run(t, o, v.blocks...))
		for _, budget := range []int64{1 << 16, 1 << 18, 1 << 20} {
			o.Budget = budget
			s := run(t, o, v.blocks...)
			if budget == 1<<20 && s.Passes() != 3 {
				t.Errorf("%d passes, want 3", s.Passes())
			}
			_, got := figures(s)
			for i, e := range got {
				if strings.HasPrefix(names[i], "gini") || strings.HasPrefix(names[i], "percentile") || strings.HasPrefix(names[i], "median") {
					e = stats.Estimate{Value: e.Value}
					want[i] = stats.Estimate{Value: want[i].Value}
				}
				if !sameBits(e, want[i]) && !strings.HasPrefix(names[i], "gini") {
					t.Errorf("budget %d, %d passes: %s is %v, was %v", budget, s.Passes(), names[i], e, want[i])
				}
			}
		}
	}
}

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
