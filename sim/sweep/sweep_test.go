package sweep

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distmv"
	"gonum.org/v1/gonum/stat/samplemv"
)

// The points of a small factorial design, by hand: the last axis varies fastest,
// ranges meet both their ends, logs go by equal ratios.
func TestFactorial(t *testing.T) {
	l := lay(t, Design{Axes: []Axis{
		{Key: "preferences.utility.family", Values: []string{"crra", "cara"}},
		{Key: "saving.return", From: 0.01, To: 0.04, Steps: 4},
		{Key: "income.transitory.sd", From: 0.01, To: 1, Steps: 3, Log: true},
	}})
	if got, want := l.Len(), 2*4*3; got != want {
		t.Fatalf("%d points, want %d", got, want)
	}
	for i, want := range map[int][]string{
		0:  {"crra", "0.01", "0.01"},
		1:  {"crra", "0.01", "0.1"},
		2:  {"crra", "0.01", "1"},
		3:  {"crra", "0.02", "0.01"},
		11: {"crra", "0.04", "1"},
		12: {"cara", "0.01", "0.01"},
		23: {"cara", "0.04", "1"},
	} {
		if got := l.Point(i); !slices.Equal(got, want) {
			t.Errorf("point %d is %v, want %v", i, got, want)
		}
	}
	if got, want := l.Keys(), []string{"preferences.utility.family", "saving.return", "income.transitory.sd"}; !slices.Equal(got, want) {
		t.Errorf("keys %v, want %v", got, want)
	}
}

// Every slice of every axis of a Latin hypercube holds exactly one point (McKay,
// Beckman and Conover 1979), and a list takes every value equally often.
func TestLatinHypercube(t *testing.T) {
	const n = 60
	l := lay(t, Design{Kind: LatinHypercube, Points: n, Seed: 3, Axes: []Axis{
		{Key: "a", From: -1, To: 2}, {Key: "b", From: 1, To: 100, Log: true}, {Key: "c", Values: []string{"x", "y", "z"}}}})
	slices1, slices2, words := map[int]int{}, map[int]int{}, map[string]int{}
	for i := range n {
		p := l.Point(i)
		slices1[int((parse(t, p[0])+1)/3*n)]++
		slices2[int(math.Log(parse(t, p[1]))/math.Log(100)*n)]++
		words[p[2]]++
	}
	if len(slices1) != n || len(slices2) != n {
		t.Errorf("%d and %d slices are taken, want %d", len(slices1), len(slices2), n)
	}
	for _, w := range []string{"x", "y", "z"} {
		if words[w] != n/3 {
			t.Errorf("%s stands %d times, want %d", w, words[w], n/3)
		}
	}
}

// The first b^k points of a scrambled Halton sequence fall one into each of the
// b^k equal parts of an axis with base b (Owen 2017), and the coordinates are those
// of gonum's sampler.
func TestHalton(t *testing.T) {
	const n = 2 * 2 * 2 * 3 * 3 * 5
	d := Design{Kind: Halton, Points: n, Seed: 11, Axes: []Axis{{Key: "a", From: 0, To: 1}, {Key: "b", From: 0, To: 1}, {Key: "c", From: 0, To: 1}}}
	l := lay(t, d)
	for j, base := range []int{2, 3, 5} {
		parts := map[int]bool{}
		size := base * base
		for i := range size {
			parts[int(parse(t, l.Point(i)[j])*float64(size))] = true
		}
		if len(parts) != size {
			t.Errorf("axis %d: the first %d points take %d of as many parts", j, size, len(parts))
		}
	}
	cube := mat.NewDense(n, 3, nil)
	samplemv.Halton{Kind: samplemv.Owen, Q: distmv.NewUnitUniform(3, nil), Src: Source(11)}.Sample(cube)
	for i := range n {
		for j, v := range l.Point(i) {
			if got, want := parse(t, v), cube.At(i, j); math.Abs(got-want) > 1e-12 {
				t.Fatalf("point %d, axis %d: %v, want %v", i, j, got, want)
			}
		}
	}
}

// A point is the same however many are asked for where the sequence allows it, and
// other seeds give other points.
func TestSeeds(t *testing.T) {
	d := Design{Kind: Halton, Points: 50, Seed: 5, Axes: []Axis{{Key: "a", From: 0, To: 1}, {Key: "b", From: 0, To: 1}}}
	long := d
	long.Points = 500
	other := d
	other.Seed = 6
	a, b, c := lay(t, d), lay(t, long), lay(t, other)
	differ := 0
	for i := range d.Points {
		if !slices.Equal(a.Point(i), b.Point(i)) {
			t.Errorf("point %d is %v of 50 and %v of 500", i, a.Point(i), b.Point(i))
		}
		if !slices.Equal(a.Point(i), c.Point(i)) {
			differ++
		}
	}
	if differ < 45 {
		t.Errorf("another seed changes %d of 50 points", differ)
	}
}

func TestDesignFaults(t *testing.T) {
	ok := Axis{Key: "saving.return", From: 0, To: 1, Steps: 3}
	for _, tt := range []struct {
		name   string
		d      Design
		field  string
		faults int
	}{
		{"no axes", Design{}, "axes", 1},
		{"no key", Design{Axes: []Axis{{From: 0, To: 1, Steps: 2}}}, "key", 1},
		{"key twice", Design{Axes: []Axis{ok, ok}}, "key", 1},
		{"empty list", Design{Axes: []Axis{{Key: "a", Values: []string{}}}}, "values", 1},
		{"value twice", Design{Axes: []Axis{{Key: "a", Values: []string{"1", "1"}}}}, "values", 1},
		{"empty range", Design{Axes: []Axis{{Key: "a", From: 1, To: 1, Steps: 2}}}, "to", 1},
		{"endless range", Design{Axes: []Axis{{Key: "a", From: 1, To: math.Inf(1), Steps: 2}}}, "to", 1},
		{"no number", Design{Axes: []Axis{{Key: "a", From: math.NaN(), To: 1, Steps: 2}}}, "from", 1},
		{"log of 0", Design{Axes: []Axis{{Key: "a", From: 0, To: 1, Steps: 2, Log: true}}}, "from", 1},
		{"one step", Design{Axes: []Axis{{Key: "a", From: 0, To: 1, Steps: 1}}}, "steps", 1},
		{"too many", Design{Axes: []Axis{{Key: "a", From: 0, To: 1, Steps: 10000}, {Key: "b", From: 0, To: 1, Steps: 10000}}}, "points", 1},
		{"no points", Design{Kind: Halton, Axes: []Axis{ok}}, "points", 1},
		{"no such kind", Design{Kind: 9, Axes: []Axis{ok}}, "kind", 1},
		{"two faults", Design{Kind: Halton, Axes: []Axis{{Key: "a", From: 1, To: 0}}}, "to", 2},
	} {
		t.Run(tt.name, func(t *testing.T) {
			_, err := tt.d.Lay()
			var field *FieldError
			if !errors.As(err, &field) || field.Field != tt.field {
				t.Fatalf("got %v, want a fault of %s", err, tt.field)
			}
			if joined, isMany := err.(interface{ Unwrap() []error }); isMany && len(joined.Unwrap()) != tt.faults {
				t.Errorf("%d faults, want %d: %v", len(joined.Unwrap()), tt.faults, err)
			}
		})
	}
}

func ExampleDesign_Lay() {
	l, err := Design{Axes: []Axis{
		{Key: "saving.return", From: 0.02, To: 0.04, Steps: 3},
		{Key: "public.pension.claim_age", Values: []string{"65", "67"}},
	}}.Lay()
	if err != nil {
		panic(err)
	}
	for i := range l.Len() {
		fmt.Println(l.Point(i))
	}
	// Output:
	// [0.02 65]
	// [0.02 67]
	// [0.03 65]
	// [0.03 67]
	// [0.04 65]
	// [0.04 67]
}

func lay(t *testing.T, d Design) *Layout {
	t.Helper()
	l, err := d.Lay()
	if err != nil {
		t.Fatal(err)
	}
	return l
}

func parse(t *testing.T, s string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(s, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}
