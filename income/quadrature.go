package income

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/integrate/quad"
)

// Rule is a quadrature rule for expectations over a normal shock.
type Rule int

const (
	// Trapezoid is the truncated trapezoid rule on ±4 standard deviations. The
	// marginal utility that is averaged has a kink where the borrowing limit starts
	// to bind; there 15 of its nodes do as well as 31 of Gauss–Hermite.
	Trapezoid Rule = iota
	// GaussHermite is exact for polynomials up to degree 2n−1. Beyond 199 nodes they
	// come from an asymptotic expansion, good to 12 digits.
	GaussHermite
)

// String returns the name used in scenario files.
func (r Rule) String() string {
	if r == GaussHermite {
		return "gauss_hermite"
	}
	return "trapezoid"
}

// trapezoidSpan is the half-width of the trapezoid rule, in standard deviations.
const trapezoidSpan = 4

// NormalNodes returns n nodes and weights for expectations over N(0, 1), nodes
// ascending and symmetric to the bit, weights summing to 1. One node is 0. It
// panics if n is not positive.
func NormalNodes(r Rule, n int) (x, w []float64) {
	if n < 1 {
		panic("income: a quadrature rule needs a node")
	}
	x, w = make([]float64, n), make([]float64, n)
	switch {
	case n == 1:
		w[0] = 1
	case r == GaussHermite:
		quad.Hermite{}.FixedLocations(x, w, math.Inf(-1), math.Inf(1))
		for i := range x {
			x[i] *= math.Sqrt2 // gonum's weight function is exp(−x²)
		}
	default:
		copy(x, evenly(n, trapezoidSpan))
		for i := range x {
			w[i] = math.Exp(-x[i] * x[i] / 2)
		}
	}
	symmetrise(x, w)
	return x, w
}

// symmetrise orders the nodes and makes nodes and weights symmetric to the bit.
func symmetrise(x, w []float64) {
	n := len(x)
	if x[0] > x[n-1] {
		for i := range n / 2 {
			x[i], x[n-1-i] = x[n-1-i], x[i]
			w[i], w[n-1-i] = w[n-1-i], w[i]
		}
	}
	sum := 0.0
	for i := range n / 2 {
		z, q := (x[n-1-i]-x[i])/2, (w[i]+w[n-1-i])/2
		x[i], x[n-1-i], w[i], w[n-1-i] = -z, z, q, q
		sum += 2 * q
	}
	if n%2 == 1 {
		x[n/2] = 0
		sum += w[n/2]
	}
	for i := range w {
		w[i] /= sum
	}
}

// Transitory is the shock ε ~ N(0, SD²), independent over years, and how a solver
// sums over it. A shock with SD 0 needs one node and gets one, whatever Nodes is.
type Transitory struct {
	SD    float64 // σ_ε ≥ 0; log points (form log) or money (form level)
	Nodes int     // quadrature nodes, 1 to 1000
	Rule  Rule
}

// Validate reports every fault at once, each as a *FieldError.
func (s Transitory) Validate() error {
	var f faults
	if !(s.SD >= 0) || math.IsInf(s.SD, 1) {
		f.add("Transitory.SD", s.SD, "at least 0 and finite")
	}
	if s.Nodes < 1 || s.Nodes > 1000 {
		f.add("Transitory.Nodes", s.Nodes, "from 1 to 1000")
	}
	if s.Rule != Trapezoid && s.Rule != GaussHermite {
		f.add("Transitory.Rule", int(s.Rule), "trapezoid or gauss_hermite")
	}
	return errors.Join(f...)
}

// shock returns the nodes of ε and their weights.
func (s Transitory) shock() (x, w []float64) {
	if s.SD == 0 {
		return NormalNodes(s.Rule, 1)
	}
	x, w = NormalNodes(s.Rule, s.Nodes)
	for k := range x {
		x[k] *= s.SD
	}
	return x, w
}
