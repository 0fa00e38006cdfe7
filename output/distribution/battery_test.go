package distribution

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"cistern/output/stats"
)

// village is a sample of rows for the tests: three cells, two variables, of which
// the second is missing now and then, weights of rows and of cells, units of three
// rows each in several cells.
type village struct {
	blocks []*Rows
	ofCell []float64
	rows   bool // rows have weights
}

// newVillage invents n rows. Values repeat (a tenth is zero, debts are whole) and
// have a long upper tail.
func newVillage(n int, cells, rows bool, seed uint64) *village {
	v := &village{ofCell: []float64{1, 1, 1}, rows: rows}
	if cells {
		v.ofCell = []float64{1, 0.8312345, 2.178765}
	}
	g := rand.New(rand.NewPCG(seed, 1))
	const blocks = 5
	for b := range blocks {
		r := &Rows{First: int64(b), N: n / blocks, Values: make([][]float64, 2)}
		for k := range r.N {
			u := g.Float64()
			x := math.Exp(1.5 * g.NormFloat64())
			switch {
			case u < 0.1:
				x = 0
			case u < 0.15:
				x = -math.Round(3 * g.Float64())
			}
			y := 1/(1+math.Abs(x)) + g.Float64()
			if g.Float64() < 0.05 {
				y = math.NaN()
			}
			r.Unit = append(r.Unit, int64(b*r.N+k)/3)
			r.Values[0], r.Values[1] = append(r.Values[0], x), append(r.Values[1], y)
			if rows {
				w := math.Exp(0.8 * g.NormFloat64())
				if g.Float64() < 0.03 {
					w = 0 // not there
				}
				r.Weight = append(r.Weight, w)
			}
		}
		for c := range v.ofCell {
			r.Spans = append(r.Spans, Span{c, c * r.N / 3, (c + 1) * r.N / 3})
		}
		v.blocks = append(v.blocks, r)
	}
	return v
}

const all = Percentiles | Gini | Concentration | Shortfall | Tail | Classes

// options describes all cells together, the last two, and the first alone.
func (v *village) options() Options {
	cell := func(cells ...int) (list []Cell) {
		for _, c := range cells {
			list = append(list, Cell{c, v.ofCell[c]})
		}
		return list
	}
	var rows int64
	for _, b := range v.blocks {
		rows += int64(b.N)
	}
	return Options{
		Variables: []Variable{
			{Name: "x", Held: true, Shares: []Threshold{{0, false}, {0, true}, {-1, false}, {1.5, true}}},
			{Name: "y", Held: true, Optional: true, Shares: []Threshold{{0.5, false}}},
		},
		Cells: 3, Targets: []Target{{Cells: cell(0, 1, 2), Wants: []Set{all, all}}, {Cells: cell(2, 1), Wants: []Set{all, Gini | Median}}, {Cells: cell(0), Wants: []Set{all, Tail}}},
		Percentiles: []float64{0.1, 1.03, 12.7, 50.017, 90.3, 99.91}, Lorenz: []float64{10.01, 33.3, 77.7}, TopShares: []float64{20.02, 1.01, 0.13},
		Shortfalls: []float64{1.003, 5.1, 100}, Tails: []float64{5.003, 50.7}, Classes: 4, Means: []int{1},
		Rows: rows, Weighted: v.rows, Workers: 1,
	}
}

// crowd returns the rows of a target with a value of a variable; with is what the
// rows have of another variable.
func (v *village) crowd(t *Target, variable int) crowd {
	var x, w []float64
	var unit []int64
	for _, b := range v.blocks {
		for _, sp := range b.Spans {
			for _, c := range t.Cells {
				if c.Index != sp.Cell {
					continue
				}
				for k := sp.From; k < sp.To; k++ {
					weight := c.Weight
					if v.rows {
						weight *= b.Weight[k]
					}
					if weight > 0 {
						x, w, unit = append(x, b.Values[variable][k]), append(w, weight), append(unit, b.Unit[k])
					}
				}
			}
		}
	}
	return newCrowd(x, w, unit)
}

// TestStudyAgainstDefinitions compares every figure and its error with the
// definitions worked out by sorting (naive_test.go), in memory and in several
// passes, with weights of rows, of cells, of both and of none.
func TestStudyAgainstDefinitions(t *testing.T) {
	for _, tt := range []struct {
		cells, rows bool
		budget      int64
	}{{false, false, 0}, {false, false, 1 << 16}, {true, false, 0}, {true, false, 1 << 16}, {false, true, 0}, {true, true, 0}} {
		if testing.Short() && (tt.cells != tt.rows || tt.budget > 0) && (!tt.cells || tt.budget == 0) {
			continue // left: neither weight, both, and cells in passes
		}
		t.Run(fmt.Sprintf("cells=%v/rows=%v/budget=%d", tt.cells, tt.rows, tt.budget), func(t *testing.T) {
			v := newVillage(4000, tt.cells, tt.rows, 42)
			o := v.options()
			o.Budget = tt.budget
			s := run(t, o, v.blocks...)
			if (s.Passes() > 1) != (tt.budget > 0) {
				t.Fatalf("%d passes", s.Passes())
			}
			for i := range o.Targets {
				for variable := range o.Variables {
					v.compare(t, s, i, variable)
				}
			}
		})
	}
}

// compare compares the figures of one variable in one target.
func (v *village) compare(t *testing.T, s *Study, target, variable int) {
	t.Helper()
	o, r := &s.o, s.Target(target)
	to := &o.Targets[target]
	c := v.crowd(to, variable)
	weighted := v.rows || to.weighted()
	// Errors of partial sums keep the threshold of the full sample: right to first
	// order, which the tolerance ofError makes room for.
	figure := func(what string, got stats.Estimate, of func(crowd) float64, tolerance, ofError float64) {
		t.Helper()
		want := of(c)
		if math.IsNaN(want) != math.IsNaN(got.Value) || math.Abs(got.Value-want) > tolerance*max(1e-3, math.Abs(want)) {
			t.Errorf("target %d, variable %d: %s is %v, want %v", target, variable, what, got.Value, want)
		}
		if se := c.jackknife(of); ofError > 0 && !(math.Abs(got.StandardError-se) <= ofError*se) && !math.IsNaN(se) {
			t.Errorf("target %d, variable %d: error of %s is %v, want %v", target, variable, what, got.StandardError, se)
		}
	}
	few := func(percent, tolerance float64) float64 { // no error of the few rows of a thin tail
		if percent*float64(len(c)) < 40*100 {
			return 0
		}
		return tolerance
	}
	if got := r.Values(variable); got != int64(len(c)) {
		t.Errorf("target %d, variable %d: %d values, want %d", target, variable, got, len(c))
	}
	figure("mean", r.Mean(variable), crowd.mean, 1e-12, 1e-8)
	figure("sd", r.SD(variable), crowd.sd, 1e-11, 0.01) // n is scaled with the weight left
	for i, threshold := range o.Variables[variable].Shares {
		figure(fmt.Sprint("share ", threshold), r.Share(variable, i), func(c crowd) float64 { return c.share(threshold) }, 1e-12, 1e-8)
	}
	wants := to.Wants[variable]
	if wants&Gini != 0 {
		if bound := r.GiniBound(variable); bound > 0 {
			figure("gini", r.Gini(variable), crowd.gini, 1e-10+bound/c.gini(), 0)
		} else {
			figure("gini", r.Gini(variable), crowd.gini, 1e-11, 1e-6)
		}
	}
	if wants&Percentiles != 0 {
		for i, p := range o.Percentiles {
			figure(fmt.Sprint("percentile ", p), r.Percentile(variable, i), func(c crowd) float64 { return c.quantile(p/100, weighted) }, 1e-15, 0)
		}
		if s.Passes() == 1 {
			v.compareIntervals(t, s, target, variable, c)
		}
	}
	if wants&Median != 0 {
		figure("median", r.Median(variable), func(c crowd) float64 { return c.quantile(0.5, weighted) }, 1e-15, 0)
	}
	if wants&Concentration != 0 {
		for i, p := range o.Lorenz {
			figure(fmt.Sprint("lorenz ", p), r.Lorenz(variable, i), func(c crowd) float64 { return c.lorenz(p / 100) }, 1e-11, 0.02)
		}
		for i, p := range o.TopShares {
			figure(fmt.Sprint("top share ", p), r.TopShare(variable, i), func(c crowd) float64 { return c.topShare(p / 100) }, 1e-11, few(p, 0.1))
		}
		figure("s80/s20", r.QuintileRatio(variable), func(c crowd) float64 {
			if c.lorenz(0.2) > 0 {
				return c.s80s20()
			}
			return math.NaN()
		}, 1e-11, 0.05)
	}
	if wants&Shortfall != 0 {
		for i, p := range o.Shortfalls {
			figure(fmt.Sprint("shortfall ", p), r.Shortfall(variable, i), func(c crowd) float64 { return c.shortfall(p / 100) }, 1e-11, few(p, 0.1))
		}
	}
	if wants&Tail != 0 {
		for i, p := range o.Tails {
			alpha, k := r.Hill(variable, i)
			u := c.quantile(1-p/100, true)
			if !weighted {
				u = c[len(c)-int(math.Round(p/100*float64(len(c))))-1].x
			}
			rows := c.above(u)
			if k != int64(rows) {
				t.Errorf("target %d, variable %d: %d rows above, want %d", target, variable, k, rows)
			}
			figure(fmt.Sprint("hill ", p), alpha, func(c crowd) float64 { return c.hill(c.above(u)) }, 1e-10, 0) // its error: TestHillError
		}
	}
	if wants&Classes != 0 {
		v.compareClasses(t, r, to, variable, c)
	}
}

// compareIntervals compares the intervals of percentiles with those of n/deff
// independent rows, deff from deleting groups.
func (v *village) compareIntervals(t *testing.T, s *Study, target, variable int, c crowd) {
	t.Helper()
	o, r := &s.o, s.Target(target)
	x, w := c.columns()
	n, weighted := float64(len(x)), v.rows || o.Targets[target].weighted()
	for i, p := range o.Percentiles {
		edge := c.quantile(p/100, true)
		f := func(c crowd) float64 { return c.share(Threshold{edge, false}) }
		se, share := c.jackknife(f), f(c)
		deff := max(1, se*se*n/(share*(1-share)))
		effective := int64(n / deff)
		lower, upper, _ := stats.OrderInterval(effective, p/100, confidence)
		at := func(rank int64) float64 {
			switch at := float64(rank) / float64(effective); {
			case rank < 1 || rank > effective:
				return math.NaN()
			case !weighted && rank == lower:
				return x[int(math.Floor(at*n))-1]
			default:
				return stats.WeightedQuantile(x, w, at, stats.Type1)
			}
		}
		e := r.Percentile(variable, i)
		for _, end := range []struct{ got, want float64 }{{e.Lower, at(lower)}, {e.Upper, at(upper)}} {
			if end.got != end.want && !(math.IsNaN(end.got) && math.IsNaN(end.want)) && !alike(x, end.got, end.want) {
				t.Errorf("target %d, variable %d: interval of percentile %v is %v to %v, want %v to %v", target, variable, o.Percentiles[i], e.Lower, e.Upper, at(lower), at(upper))
			}
		}
	}
}

// alike reports whether two values stand within two ranks: the number of effective
// rows is rounded, from sums in different order.
func alike(x []float64, a, b float64) bool {
	i, _ := slices.BinarySearch(x, min(a, b))
	return slices.Contains(x[i:min(len(x), i+3)], max(a, b))
}

// compareClasses compares the means of variable 1 within classes.
func (v *village) compareClasses(t *testing.T, r *Result, to *Target, variable int, c crowd) {
	t.Helper()
	classes := r.s.o.Classes
	for class := range classes {
		lo, hi := math.Inf(-1), math.Inf(1)
		if class > 0 {
			lo = c.quantile(float64(class)/float64(classes), true)
		}
		if class < classes-1 {
			hi = c.quantile(float64(class+1)/float64(classes), true)
		}
		var y, w []float64
		var unit []int64
		for _, b := range v.blocks {
			for _, sp := range b.Spans {
				for _, cell := range to.Cells {
					for k := sp.From; k < sp.To && cell.Index == sp.Cell; k++ {
						weight := cell.Weight
						if v.rows {
							weight *= b.Weight[k]
						}
						if x := b.Values[variable][k]; x > lo && x <= hi && weight > 0 {
							y, w, unit = append(y, b.Values[1][k]), append(w, weight), append(unit, b.Unit[k])
						}
					}
				}
			}
		}
		inside := newCrowd(y, w, unit)
		got := r.MeanIn(variable, class, 0)
		if want := inside.mean(); math.Abs(got.Value-want) > 1e-11 {
			t.Errorf("mean in class %d of variable %d is %v, want %v", class, variable, got.Value, want)
		}
		if want := inside.jackknife(crowd.mean); math.Abs(got.StandardError-want) > 1e-6*want {
			t.Errorf("error of the mean in class %d of variable %d is %v, want %v", class, variable, got.StandardError, want)
		}
	}
}

// above is the number of rows above a value.
func (c crowd) above(u float64) (n int) {
	for _, p := range c {
		if p.x > u && p.w > 0 {
			n++
		}
	}
	return n
}
