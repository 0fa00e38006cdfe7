package sweep

import (
	"encoding/binary"
	"errors"
	"fmt"
	"math"

	//lint:ignore SA1019 the project's generator
	"golang.org/x/exp/rand"
	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distmv"
	"gonum.org/v1/gonum/stat/samplemv"
)

// Kind is how a design places its points.
type Kind int

// The kinds of designs.
const (
	Factorial Kind = iota
	LatinHypercube
	Halton
)

// String returns the name used in sweep files.
func (k Kind) String() string {
	switch k {
	case Factorial:
		return "factorial"
	case LatinHypercube:
		return "latin_hypercube"
	case Halton:
		return "halton"
	}
	return fmt.Sprintf("Kind(%d)", int(k))
}

// MaxPoints is the largest number of points of a design.
const MaxPoints = 10_000_000

// Design is what a sweep varies and how.
type Design struct {
	Axes   []Axis
	Kind   Kind
	Points int    // of LatinHypercube and Halton, at least 1; ignored by Factorial
	Seed   uint64 // of LatinHypercube and Halton
}

// Validate reports every fault at once, each a *FieldError.
func (d Design) Validate() error {
	var errs []error
	bad := func(key, field string, value any, want string) {
		errs = append(errs, &FieldError{Key: key, Field: field, Value: value, Want: want})
	}
	if len(d.Axes) == 0 {
		bad("", "axes", "empty", "at least one key to vary")
	}
	seen := map[string]bool{}
	total := 1.0
	for _, a := range d.Axes {
		if err := a.Validate(); err != nil {
			errs = append(errs, err)
		}
		if seen[a.Key] {
			bad(a.Key, "key", a.Key, "every key once")
		}
		seen[a.Key] = true
		if d.Kind == Factorial && a.Values == nil && a.Steps < 2 {
			bad(a.Key, "steps", a.Steps, "at least 2")
		}
		total *= math.Max(1, float64(a.levels()))
	}
	switch {
	case d.Kind != Factorial && d.Kind != LatinHypercube && d.Kind != Halton:
		bad("", "kind", int(d.Kind), "factorial, latin_hypercube or halton")
	case d.Kind == Factorial && total > MaxPoints:
		bad("", "points", total, fmt.Sprintf("at most %d in all", MaxPoints))
	case d.Kind != Factorial && (d.Points < 1 || d.Points > MaxPoints):
		bad("", "points", d.Points, fmt.Sprintf("from 1 to %d", MaxPoints))
	}
	return errors.Join(errs...)
}

// Layout is a design laid out: its points in order.
type Layout struct {
	axes []Axis
	n    int
	cube *mat.Dense // [point][axis] in [0, 1); nil for Factorial
}

// Lay returns the points of a design. The same design gives the same points,
// whoever asks for how many of them.
func (d Design) Lay() (*Layout, error) {
	if err := d.Validate(); err != nil {
		return nil, err
	}
	l := &Layout{axes: d.Axes, n: 1}
	if d.Kind == Factorial {
		for _, a := range d.Axes {
			l.n *= a.levels()
		}
		return l, nil
	}
	l.n = d.Points
	l.cube = d.sample()
	return l, nil
}

// sample draws the points of a design that is not factorial, [point][axis].
func (d Design) sample() *mat.Dense {
	points := mat.NewDense(d.Points, len(d.Axes), nil)
	cube := distmv.NewUnitUniform(len(d.Axes), nil)
	if d.Kind == Halton {
		samplemv.Halton{Kind: samplemv.Owen, Q: cube, Src: Source(d.Seed)}.Sample(points)
	} else {
		samplemv.LatinHypercube{Q: cube, Src: Source(d.Seed)}.Sample(points)
	}
	return points
}

// Cube returns the points of a Latin hypercube or Halton design as they lie in the
// unit cube, [point][axis]. A factorial design has none: its points are nil.
func (d Design) Cube() ([][]float64, error) {
	if err := d.Validate(); err != nil || d.Kind == Factorial {
		return nil, err
	}
	points := d.sample()
	rows := make([][]float64, d.Points)
	for i := range rows {
		rows[i] = points.RawRowView(i)
	}
	return rows, nil
}

// Source returns a generator whose state is well mixed whatever the seed.
func Source(seed uint64) *rand.PCGSource {
	var state [16]byte
	binary.BigEndian.PutUint64(state[:8], seed*0x9e3779b97f4a7c15+0x7f4a7c15)
	binary.BigEndian.PutUint64(state[8:], (seed^0xd1b54a32d192ed03)*0xbf58476d1ce4e5b9)
	s := new(rand.PCGSource)
	if err := s.UnmarshalBinary(state[:]); err != nil {
		panic(err) // sixteen bytes are what it wants
	}
	for range 8 {
		s.Uint64()
	}
	return s
}

// Len returns the number of points.
func (l *Layout) Len() int { return l.n }

// Keys returns the keys that vary, in the order of a point's values.
func (l *Layout) Keys() []string {
	keys := make([]string, len(l.axes))
	for j, a := range l.axes {
		keys[j] = a.Key
	}
	return keys
}

// Point returns the values of point i, one a key, as a scenario file writes them.
// It panics unless 0 ≤ i < Len.
func (l *Layout) Point(i int) []string {
	if i < 0 || i >= l.n {
		panic(fmt.Sprintf("sweep: point %d of %d", i, l.n))
	}
	values := make([]string, len(l.axes))
	for j := len(l.axes) - 1; j >= 0; j-- {
		if l.cube != nil {
			values[j] = l.axes[j].read(l.cube.At(i, j))
			continue
		}
		n := l.axes[j].levels()
		values[j] = l.axes[j].level(i % n)
		i /= n
	}
	return values
}
