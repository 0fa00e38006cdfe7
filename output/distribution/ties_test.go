package distribution

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"cistern/output/stats"
)

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
