package distribution

import (
	"fmt"
	"math"
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
