package income_test

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"cistern/income"
)

// everyRouwenhorst runs f for many sizes and persistences, up to 0.999.
func everyRouwenhorst(t *testing.T, f func(t *testing.T, p income.AR1, n int, c *income.Chain)) {
	t.Helper()
	for _, n := range []int{2, 3, 7, 10, 25, 51} {
		for _, rho := range []float64{-0.999, -0.7, 0, 0.5, 0.95, 0.97, 0.99, 0.999} {
			t.Run(fmt.Sprintf("points=%d,rho=%g", n, rho), func(t *testing.T) {
				p := income.AR1{Autocorrelation: rho, InnovationSD: 0.15}
				f(t, p, n, discretise(t, income.Rouwenhorst{Points: n}, p))
			})
		}
	}
}

// Published: Rouwenhorst (1995); with p = (1+ρ)/2 the three-node matrix has rows
// p², 2p(1−p), (1−p)² and p(1−p), p²+(1−p)², p(1−p) (Kopecky & Suen 2010, eq. 6,
// number from memory; re-derived as the sum of two two-state chains).
func TestRouwenhorstThreeNodes(t *testing.T) {
	c := discretise(t, income.Rouwenhorst{Points: 3}, income.AR1{Autocorrelation: 0.6, InnovationSD: 0.8})
	want := []float64{0.64, 0.32, 0.04, 0.16, 0.68, 0.16, 0.04, 0.32, 0.64}
	for k, w := range want {
		near(t, fmt.Sprintf("entry %d", k), c.Transition[k], w, 1e-15)
	}
	for i, w := range []float64{-math.Sqrt2, 0, math.Sqrt2} { // stationary sd 0.8/0.8 = 1
		near(t, "node", c.Nodes[i], w, 1e-15)
	}
}

// Published: Kopecky & Suen (2010): conditional mean and variance exact in every
// state. The stationary sd is 22 innovations at ρ = 0.999, and a variance of
// z′ against a grid that wide loses its square in digits.
func TestRouwenhorstConditionalMoments(t *testing.T) {
	everyRouwenhorst(t, func(t *testing.T, p income.AR1, n int, c *income.Chain) {
		top := c.Nodes[n-1]
		for _, k := range c.Conditionals(p) {
			near(t, fmt.Sprintf("mean from %g", k.Node), k.Mean, p.Autocorrelation*k.Node, 1e-13*top)
			near(t, fmt.Sprintf("variance from %g", k.Node), k.SD*k.SD, 0.15*0.15, 1e-13*top*top)
			near(t, "true mean", k.TrueMean, p.Autocorrelation*k.Node, 0)
			near(t, "true sd", k.TrueSD, 0.15, 0)
		}
	})
}

// Published: Kopecky & Suen (2010): the stationary law is Binomial(n−1, ½).
func TestRouwenhorstStationaryLawIsBinomial(t *testing.T) {
	everyRouwenhorst(t, func(t *testing.T, p income.AR1, n int, c *income.Chain) {
		want := math.Pow(0.5, float64(n-1))
		for k, got := range c.Stationary() {
			if math.Abs(got/want-1) > 2e-13*float64(n) { // relative: the tails too
				t.Errorf("node %d has %.15g, want %.15g", k, got, want)
			}
			want *= float64(n-1-k) / float64(k+1)
		}
	})
}

// Published: Kopecky & Suen (2010): unconditional variance and autocorrelation
// exact. Derived: kurtosis 3 − 2/(n−1), that of Binomial(n−1, ½).
func TestRouwenhorstUnconditionalMoments(t *testing.T) {
	everyRouwenhorst(t, func(t *testing.T, p income.AR1, n int, c *income.Chain) {
		got, truth := c.Moments(c.Stationary()), p.Moments()
		near(t, "sd ratio", got.SD/truth.SD, 1, 1e-12)
		near(t, "autocorrelation", got.Autocorrelation, truth.Autocorrelation, 1e-12)
		near(t, "mean", got.Mean, 0, 1e-13*c.Nodes[n-1])
		near(t, "skewness", got.Skewness, 0, 1e-12)
		near(t, "kurtosis", got.Kurtosis, 3-2/float64(n-1), 1e-11)
	})
}

// Published: Kopecky & Suen (2010): eigenvalues 1, ρ, …, ρ^(n−1). The chain is
// reversible, so D^½·P·D^−½ is symmetric and its eigenvalues are well conditioned.
func TestRouwenhorstEigenvalues(t *testing.T) {
	everyRouwenhorst(t, func(t *testing.T, p income.AR1, n int, c *income.Chain) {
		law := c.Stationary()
		s := mat.NewSymDense(n, nil)
		for i := range n {
			for j := i; j < n; j++ {
				s.SetSym(i, j, math.Sqrt(law[i]/law[j])*c.Row(i)[j])
			}
		}
		var e mat.EigenSym
		if !e.Factorize(s, false) {
			t.Fatal("no eigenvalues")
		}
		left := e.Values(nil) // each is taken out once it is met
		for k := range n {
			want, best := math.Pow(p.Autocorrelation, float64(k)), 0
			for i := range left {
				if math.Abs(left[i]-want) < math.Abs(left[best]-want) {
					best = i
				}
			}
			near(t, fmt.Sprintf("eigenvalue %d", k), left[best], want, 1e-12)
			left = append(left[:best], left[best+1:]...)
		}
	})
}

// As close to 1 as a number can be, a node is still left: the chance (1−ρ)/2 must
// not be lost in 1 − (1+ρ)/2.
func TestRouwenhorstNextToAUnitRoot(t *testing.T) {
	rho := math.Nextafter(1, 0)
	c := discretise(t, income.Rouwenhorst{Points: 2}, income.AR1{Autocorrelation: rho, InnovationSD: 1})
	near(t, "chance to leave", c.Row(0)[1], (1-rho)/2, 0)
	near(t, "stationary law", c.Stationary()[0], 0.5, 1e-15)
}
