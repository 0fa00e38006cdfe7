package calibration

import (
	"context"
	"errors"
	"math"
	"reflect"
	"testing"
)

// rosenbrock has its minimum 0 at (1, 1), at the end of a curved valley
// (Rosenbrock 1960, Computer Journal 3, 175–184).
func rosenbrock(x []float64) float64 {
	a, b := 1-x[0], x[1]-x[0]*x[0]
	return a*a + 100*b*b
}

// griewank has its minimum 0 at 0 among hundreds of local ones (Griewank 1981,
// Journal of Optimization Theory and Applications 34, 11–39).
func griewank(x []float64) float64 {
	sum, product := 0.0, 1.0
	for i, v := range x {
		sum += v * v / 4000
		product *= math.Cos(v / math.Sqrt(float64(i+1)))
	}
	return 1 + sum - product
}

func each(f func([]float64) float64) Evaluator {
	return func(_ context.Context, points [][]float64) ([]float64, error) {
		var out []float64
		for _, p := range points {
			out = append(out, f(p))
		}
		return out, nil
	}
}

func TestSearch(t *testing.T) {
	nan := math.NaN()
	for _, tt := range []struct {
		name      string
		f         func([]float64) float64
		s         Search
		want      []float64
		tolerance float64
		bound     []bool
	}{
		{"valley", rosenbrock, Search{Parameters: []Parameter{{"a", -2, 2, -1.2, false}, {"b", -1, 3, 1, false}},
			Points: 20, Locals: 3, Step: 0.1, Tolerance: 1e-14, Most: 2000}, []float64{1, 1}, 1e-5, []bool{false, false}},
		{"many minima", griewank, Search{Parameters: []Parameter{{"a", -60, 40, nan, false}, {"b", -40, 60, nan, false}},
			Points: 400, Locals: 12, Step: 0.02, Tolerance: 1e-12, Most: 500}, []float64{0, 0}, 1e-4, []bool{false, false}},
		{"at a bound", func(x []float64) float64 { return x[0] + (x[1]-3)*(x[1]-3) }, Search{Parameters: []Parameter{{"a", 2, 5, nan, false}, {"b", 1, 100, nan, true}},
			Points: 10, Locals: 3, Step: 0.1, Tolerance: 1e-13, Most: 1000}, []float64{2, 3}, 1e-4, []bool{true, false}},
		{"no solution in places", func(x []float64) float64 {
			if x[0] > 0.5 {
				return math.Inf(1)
			}
			return (x[0] - 0.4) * (x[0] - 0.4)
		}, Search{Parameters: []Parameter{{"a", 0, 1, nan, false}}, Points: 8, Locals: 2, Step: 0.1, Tolerance: 1e-14, Most: 300}, []float64{0.4}, 1e-5, []bool{false}},
		{"evolution", func(x []float64) float64 { return (x[0]-1)*(x[0]-1) + (x[1]-2)*(x[1]-2) }, Search{Parameters: []Parameter{{"a", 0, 4, nan, false}, {"b", 0, 4, nan, false}},
			Method: CMAES, Points: 10, Locals: 2, Step: 0.2, Tolerance: 1e-10, Most: 2000}, []float64{1, 2}, 0.1, []bool{false, false}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			got, err := tt.s.Minimise(context.Background(), each(tt.f), nil, nil)
			if err != nil {
				t.Fatal(err)
			}
			for j, want := range tt.want {
				if math.Abs(got.Best.Point[j]-want) > tt.tolerance {
					t.Errorf("minimum at %v, want %v", got.Best.Point, tt.want)
					break
				}
			}
			if !reflect.DeepEqual(got.AtBound, tt.bound) {
				t.Errorf("at bounds %v, want %v", got.AtBound, tt.bound)
			}
			if len(got.Ends) != tt.s.Locals {
				t.Errorf("%d local searches, want %d", len(got.Ends), tt.s.Locals)
			}
		})
	}
}

// A search that is interrupted and goes on from its notes ends as one that is not,
// and does nothing twice.
func TestSearchGoesOn(t *testing.T) {
	s := Search{Parameters: []Parameter{{"a", -2, 2, -1.2, false}, {"b", -1, 3, 1, false}}, Points: 20, Locals: 3, Step: 0.1, Tolerance: 1e-12, Most: 200}
	var all []Evaluation
	whole, err := s.Minimise(context.Background(), each(rosenbrock), nil, func(e Evaluation) error { all = append(all, e); return nil })
	if err != nil {
		t.Fatal(err)
	}
	if whole.Evaluations != len(all) {
		t.Errorf("%d evaluations were noted, %d counted", len(all), whole.Evaluations)
	}
	for _, after := range []int{1, 20, len(all) / 2, len(all) - 1} {
		stop := errors.New("enough")
		var notes []Evaluation
		note := func(e Evaluation) error {
			if notes = append(notes, e); len(notes) == after {
				return stop
			}
			return nil
		}
		if _, err := s.Minimise(context.Background(), each(rosenbrock), nil, note); !errors.Is(err, stop) {
			t.Fatalf("stopped after %d: %v", after, err)
		}
		again := 0
		rest, err := s.Minimise(context.Background(), each(rosenbrock), notes, func(Evaluation) error { again++; return nil })
		if err != nil {
			t.Fatal(err)
		}
		if !reflect.DeepEqual(rest, whole) {
			t.Errorf("stopped after %d: the end is %+v, want %+v", after, rest, whole)
		}
		if again != len(all)-after {
			t.Errorf("stopped after %d: %d more evaluations, want %d", after, again, len(all)-after)
		}
	}
}

func TestSearchStops(t *testing.T) {
	s := Search{Parameters: []Parameter{{"a", 0, 1, math.NaN(), false}}, Points: 5, Locals: 1, Step: 0.1, Tolerance: 1e-12, Most: 100}
	ctx, cancel := context.WithCancelCause(context.Background())
	ctrlC := errors.New("interrupted")
	n := 0
	_, err := s.Minimise(ctx, each(func(x []float64) float64 {
		if n++; n == 8 {
			cancel(ctrlC)
		}
		return x[0]
	}), nil, nil)
	if !errors.Is(err, ctrlC) || n != 8 {
		t.Errorf("after %d evaluations: %v, want 8 and %v", n, err, ctrlC)
	}
	if _, err := s.Minimise(context.Background(), each(func([]float64) float64 { return math.NaN() }), nil, nil); err == nil {
		t.Error("an objective that is no number is taken")
	}
	for name, change := range map[string]func(*Search){
		"start":     func(s *Search) { s.Parameters = []Parameter{{"a", 0, 1, 2, false}} },
		"bounds":    func(s *Search) { s.Parameters = []Parameter{{"a", 1, 0, math.NaN(), false}} },
		"log of 0":  func(s *Search) { s.Parameters = []Parameter{{"a", 0, 1, math.NaN(), true}} },
		"nothing":   func(s *Search) { s.Parameters = nil },
		"points":    func(s *Search) { s.Points = 0 },
		"locals":    func(s *Search) { s.Locals = 6 },
		"step":      func(s *Search) { s.Step = 0 },
		"tolerance": func(s *Search) { s.Tolerance = math.NaN() },
		"most":      func(s *Search) { s.Most = 0 },
		"method":    func(s *Search) { s.Method = 7 },
	} {
		w := s
		change(&w)
		if _, err := w.Minimise(context.Background(), each(griewank), nil, nil); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}
