package income_test

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"cistern/income"
)

func TestNormalNodesAreOrderedAndSymmetric(t *testing.T) {
	for _, rule := range []income.Rule{income.Trapezoid, income.GaussHermite} {
		for _, n := range []int{1, 2, 3, 4, 15, 31, 100, 199, 200, 201, 1000} {
			t.Run(fmt.Sprintf("%v,nodes=%d", rule, n), func(t *testing.T) {
				x, w := income.NormalNodes(rule, n)
				near(t, "sum of weights", total(w), 1, 1e-14)
				for i := range n {
					if x[i] != -x[n-1-i] || w[i] != w[n-1-i] || w[i] < 0 {
						t.Fatalf("node %d: %g (%g) against %g (%g)", i, x[i], w[i], x[n-1-i], w[n-1-i])
					}
					if i > 0 && x[i] <= x[i-1] {
						t.Fatalf("nodes %g, %g not ascending", x[i-1], x[i])
					}
				}
			})
		}
	}
	mustPanic(t, func() { income.NormalNodes(income.Trapezoid, 0) })
}

// Derived: E Z^2k = (2k−1)!!, exact with n nodes up to degree 2n−1, and
// E exp(Z) = e^½. Beyond 199 nodes an expansion limits the digits.
func TestGaussHermiteIntegratesPolynomials(t *testing.T) {
	for _, n := range []int{2, 3, 5, 8, 15, 31, 100, 200, 400} {
		x, w := income.NormalNodes(income.GaussHermite, n)
		want := 1.0
		for k := 1; 2*k <= min(2*n-1, 16); k++ {
			want *= float64(2*k - 1)
			got := 0.0
			for i := range x {
				got += w[i] * math.Pow(x[i], float64(2*k))
			}
			near(t, fmt.Sprintf("%d nodes, degree %d, ratio", n, 2*k), got/want, 1, 1e-11)
		}
		if n >= 15 {
			near(t, fmt.Sprintf("%d nodes, exponential", n), meanExp(x, w), math.Exp(0.5), 1e-11)
		}
	}
}

func meanExp(x, w []float64) float64 {
	mean := 0.0
	for i := range x {
		mean += w[i] * math.Exp(x[i])
	}
	return mean
}

// Derived by hand: two nodes at ±1, three at 0 and ±√3 with weights ⅔ and ⅙.
func TestGaussHermiteByHand(t *testing.T) {
	x, w := income.NormalNodes(income.GaussHermite, 3)
	for i, want := range []float64{-math.Sqrt(3), 0, math.Sqrt(3)} {
		near(t, "node", x[i], want, 1e-15)
		near(t, "weight", w[i], []float64{1. / 6, 2. / 3, 1. / 6}[i], 1e-15)
	}
	x, w = income.NormalNodes(income.GaussHermite, 2)
	near(t, "lower of two", x[0], -1, 1e-15)
	near(t, "its weight", w[0], 0.5, 0)
}

// Derived by hand: nodes −4, −2, 0, 2, 4 weigh e^−8, e^−2, 1, e^−2, e^−8.
func TestTrapezoidByHand(t *testing.T) {
	x, w := income.NormalNodes(income.Trapezoid, 5)
	sum := 1 + 2*math.Exp(-2) + 2*math.Exp(-8)
	for i, want := range []float64{-4, -2, 0, 2, 4} {
		near(t, "node", x[i], want, 0)
		near(t, "weight", w[i], math.Exp(-want*want/2)/sum, 1e-16)
	}
}

// Derived: cutting at ±4 takes 8φ(4)/(2Φ(4)−1) from the variance (the truncated
// normal law) and the trapezoid's ends have half of their weight too much; the sum
// itself converges faster than any power of the step.
func TestTrapezoidMoments(t *testing.T) {
	tests := []struct {
		nodes     int
		tolerance float64 // of sd and kurtosis against the normal law's 1 and 3
	}{{7, 0.015}, {9, 0.0015}, {15, 0.005}, {31, 0.01}, {601, 0.02}}
	for _, tt := range tests {
		m := income.Transitory{SD: 1, Nodes: tt.nodes}.Moments()
		near(t, fmt.Sprintf("sd on %d nodes", tt.nodes), m.SD, 1, tt.tolerance/10)
		near(t, fmt.Sprintf("kurtosis on %d nodes", tt.nodes), m.Kurtosis, 3, tt.tolerance)
	}
	phi4 := math.Exp(-8) / math.Sqrt(2*math.Pi)
	inside := math.Erf(4 / math.Sqrt2)
	m := income.Transitory{SD: 1, Nodes: 10001}.Moments()
	near(t, "variance of many nodes", m.SD*m.SD, 1-8*phi4/inside, 2e-6) // ends: 32·φ(4)·h/2
	five := income.Transitory{SD: 1, Nodes: 5}.Moments()
	near(t, "variance of five nodes", five.SD*five.SD, (8*math.Exp(-2)+32*math.Exp(-8))/(1+2*math.Exp(-2)+2*math.Exp(-8)), 1e-15)
}

func TestTransitoryMomentsScale(t *testing.T) {
	m := income.Transitory{SD: 0.2, Nodes: 3, Rule: income.GaussHermite}.Moments()
	near(t, "sd", m.SD, 0.2, 1e-15)
	near(t, "kurtosis", m.Kurtosis, 3, 1e-13)
	if got := (income.Transitory{Nodes: 15}).Moments(); got.SD != 0 || got.Mean != 0 {
		t.Errorf("without a shock: %+v", got)
	}
}

func TestRuleNames(t *testing.T) {
	got := []string{income.Trapezoid.String(), income.GaussHermite.String(), income.Log.String(), income.Level.String(), income.Mean.String(), income.Median.String(), income.Rouwenhorst{}.Name(), income.Tauchen{}.Name()}
	want := []string{"trapezoid", "gauss_hermite", "log", "level", "mean", "median", "rouwenhorst", "tauchen"}
	if !slices.Equal(got, want) {
		t.Errorf("names %v, want %v", got, want)
	}
}
