package distribution

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"cistern/output/stats"
)

// people invents rows of several cells: a skewed variable with a mass at zero and
// debts, and one that goes with it and is missing now and then.
func people(n, cells int) *Rows {
	r := &Rows{N: n, Values: make([][]float64, 2)}
	g := rand.New(rand.NewPCG(3, 5))
	for k := range n {
		x := math.Exp(g.NormFloat64()) - 0.3
		if g.Float64() < 0.1 {
			x = 0
		}
		y := 1 / (1 + math.Abs(x))
		if g.Float64() < 0.05 {
			y = math.NaN()
		}
		r.Unit = append(r.Unit, int64(k/3))
		r.Values[0], r.Values[1] = append(r.Values[0], x), append(r.Values[1], y)
	}
	for c := range cells {
		r.Spans = append(r.Spans, Span{c, c * n / cells, (c + 1) * n / cells})
	}
	return r
}

func options(n, cells int) Options {
	all := make([]Cell, cells)
	for c := range all {
		all[c] = Cell{c, 1}
	}
	every := Percentiles | Gini | Concentration | Shortfall | Tail | Classes
	return Options{Variables: []Variable{{Name: "x", Held: true, Shares: []Threshold{{Value: 0}}}, {Name: "y", Optional: true}}, Cells: cells,
		Targets:     []Target{{Cells: all, Wants: []Set{every, 0}}, {Cells: all[:1], Wants: []Set{every, 0}, Independent: true}},
		Percentiles: []float64{1, 50, 99.9}, Lorenz: []float64{10, 50}, TopShares: []float64{10, 0.1}, Shortfalls: []float64{5, 100}, Tails: []float64{5},
		Classes: 5, Means: []int{1}, Rows: int64(n), Workers: 1}
}

func run(t testing.TB, o Options, blocks ...*Rows) *Study {
	t.Helper()
	s, err := NewStudy(o)
	if err != nil {
		t.Fatal(err)
	}
	for more := true; more; {
		for _, rows := range blocks {
			commit, err := s.Add(0, rows)
			if err == nil && commit != nil {
				err = commit()
			}
			if err != nil {
				t.Fatal(err)
			}
		}
		if more, err = s.EndPass(); err != nil {
			t.Fatal(err)
		}
	}
	return s
}

// The figures of a sample in memory and in several passes are those of the sorted
// sample (package stats).
func TestStudyAgainstSorted(t *testing.T) {
	const n = 20000
	rows := people(n, 4)
	for _, budget := range []int64{0, 1 << 18} {
		o := options(n, 4)
		o.Budget = budget
		s := run(t, o, rows)
		if (s.Passes() > 1) != (budget > 0) {
			t.Fatalf("budget %d: %d passes", budget, s.Passes())
		}
		for target, to := range []int{n, n / 4} {
			x := slices.Sorted(slices.Values(rows.Values[0][:to]))
			r := s.Target(target)
			check := func(what string, got stats.Estimate, want, tolerance float64) {
				t.Helper()
				if !(math.Abs(got.Value-want) <= tolerance*math.Abs(want)) {
					t.Errorf("budget %d, target %d: %s is %v, want %v", budget, target, what, got.Value, want)
				}
				if !(got.StandardError > 0) || !(got.Lower <= got.Value && got.Value <= got.Upper) {
					t.Errorf("budget %d, target %d: %s has error %v and interval %v to %v", budget, target, what, got.StandardError, got.Lower, got.Upper)
				}
			}
			check("mean", r.Mean(0), stats.Mean(x), 1e-12)
			check("sd", r.SD(0), stats.SD(x), 1e-12)
			for i, p := range o.Percentiles[:2] {
				check("percentile", r.Percentile(0, i), stats.Quantile(x, p/100, stats.Type7), 0)
			}
			g, _ := stats.GiniUnbiased(x)
			check("gini", r.Gini(0), g, 1e-12+r.GiniBound(0)/g)
			for i, p := range o.Lorenz {
				l, _ := stats.Lorenz(x, nil, p/100)
				check("lorenz", r.Lorenz(0, i), l, 1e-11)
			}
			for i, p := range o.TopShares {
				l, _ := stats.TopShare(x, nil, p/100)
				check("top share", r.TopShare(0, i), l, 1e-11)
			}
			check("shortfall", r.Shortfall(0, 0), stats.ExpectedShortfall(x, 0.05), 1e-11)
			if got := r.Shortfall(0, 1).Value; math.Abs(got-stats.Mean(x)) > 1e-12 {
				t.Errorf("shortfall of all is %v, want the mean %v", got, stats.Mean(x))
			}
			alpha, k := r.Hill(0, 0)
			want, _ := stats.Hill(x, to/20)
			check("hill", alpha, want, 1e-11)
			if k != int64(to/20) {
				t.Errorf("%d rows in the tail, want %d", k, to/20)
			}
			at := 0
			for _, v := range x {
				if v <= 0 {
					at++
				}
			}
			check("share", r.Share(0, 0), float64(at)/float64(to), 1e-15)
			for class := range 5 {
				lo, hi := math.Inf(-1), math.Inf(1)
				if class > 0 {
					lo = x[to*class/5-1]
				}
				if class < 4 {
					hi = x[to*(class+1)/5-1]
				}
				var sum, count float64
				for i, v := range rows.Values[0][:to] {
					if y := rows.Values[1][i]; v > lo && v <= hi && y == y {
						sum, count = sum+y, count+1
					}
				}
				check("mean in class", r.MeanIn(0, class, 0), sum/count, 1e-12)
			}
		}
	}
}
