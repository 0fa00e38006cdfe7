package income_test

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"

	"cistern/income"
)

func tauchen(t *testing.T, points int, span, rho, sd float64) *income.Chain {
	t.Helper()
	return discretise(t, income.Tauchen{Points: points, Span: span}, income.AR1{Autocorrelation: rho, InnovationSD: sd})
}

func discretise(t testing.TB, d income.Discretiser, p income.AR1) *income.Chain {
	t.Helper()
	c, err := d.Discretise(p)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s is %.15g, want %.15g within %g", what, got, want, tolerance)
	}
}

// Φ at the cuts, from memory: Abramowitz & Stegun (1964), Table 26.1.
const (
	phiFifth        = 0.579259709439103 // Φ(0.2)
	phiHalf         = 0.691462461274013 // Φ(0.5)
	phiOne          = 0.841344746068543 // Φ(1)
	phiElevenFifths = 0.986096552486502 // Φ(2.2)
)

// With ρ = ±0.6 the stationary sd is 1.25σ; three nodes on ±1.6 of them lie at
// −2σ, 0, 2σ, cells meet at ±σ, and from −2σ the mean goes to ∓1.2σ.
func TestTauchenCellsByHand(t *testing.T) {
	tests := []struct {
		name   string
		points int
		span   float64
		ar     income.AR1
		row    int
		want   []float64
	}{
		{"no persistence", 3, 1, income.AR1{InnovationSD: 7}, 2, []float64{1 - phiHalf, 2*phiHalf - 1, 1 - phiHalf}},
		{"two nodes", 2, 1, income.AR1{Autocorrelation: 1 / math.Sqrt(5), InnovationSD: 0.2}, 0, []float64{phiHalf, 1 - phiHalf}},
		{"lowest node", 3, 1.6, income.AR1{Autocorrelation: 0.6, InnovationSD: 0.5}, 0, []float64{phiFifth, phiElevenFifths - phiFifth, 1 - phiElevenFifths}},
		{"middle node", 3, 1.6, income.AR1{Autocorrelation: 0.6, InnovationSD: 0.5}, 1, []float64{1 - phiOne, 2*phiOne - 1, 1 - phiOne}},
		{"highest node", 3, 1.6, income.AR1{Autocorrelation: 0.6, InnovationSD: 0.5}, 2, []float64{1 - phiElevenFifths, phiElevenFifths - phiFifth, phiFifth}},
		{"lowest node, alternating", 3, 1.6, income.AR1{Autocorrelation: -0.6, InnovationSD: 0.5}, 0, []float64{1 - phiElevenFifths, phiElevenFifths - phiFifth, phiFifth}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			c := discretise(t, income.Tauchen{Points: tt.points, Span: tt.span}, tt.ar)
			for j, want := range tt.want {
				near(t, fmt.Sprintf("chance of node %d", j), c.Row(tt.row)[j], want, 2e-15)
			}
		})
	}
}

func TestTauchenNodes(t *testing.T) {
	c := tauchen(t, 3, 1.6, 0.6, 0.5)
	for i, want := range []float64{-1, 0, 1} { // derived: ±1.6 · 0.5/0.8
		near(t, "node", c.Nodes[i], want, 1e-15)
	}
}

// The chance of a far cell is a difference of numbers near 1 unless it is taken in
// the tail it lies in. Derived: the normal density integrated over the cell.
func TestTauchenTailsKeepTheirDigits(t *testing.T) {
	for _, rho := range []float64{0.5, 0.9, 0.99, 0.999} {
		p := income.AR1{Autocorrelation: rho, InnovationSD: 0.1}
		c := discretise(t, income.Tauchen{Points: 9, Span: 3}, p)
		half := (c.Nodes[1] - c.Nodes[0]) / 2
		for i := range c.Nodes {
			for j := 1; j < c.Len()-1; j++ {
				got, mean := c.Row(i)[j], rho*c.Nodes[i]
				a, b := (c.Nodes[j]-half-mean)/0.1, (c.Nodes[j]+half-mean)/0.1
				want := normalMass(a, b)
				if want > 1e-300 && math.Abs(got/want-1) > 1e-11 {
					t.Errorf("ρ = %g: from %d to %d %.15g, want %.15g", rho, i, j, got, want)
				}
			}
		}
	}
}

// normalMass integrates the standard normal density over [a, b], over at most the
// twelve units (or, in a tail, the fifty scale lengths) that hold all of it.
func normalMass(a, b float64) float64 {
	if b < 0 {
		a, b = -b, -a
	}
	a = max(a, -12)
	b = min(b, max(a, 0)+min(12, 50/max(a, 1)))
	const pieces = 40
	sum := 0.0
	for k := range pieces {
		lo, hi := a+(b-a)*float64(k)/pieces, a+(b-a)*float64(k+1)/pieces
		sum += quad.Fixed(func(x float64) float64 { return math.Exp(-x*x/2) / math.Sqrt(2*math.Pi) }, lo, hi, 20, quad.Legendre{}, 0)
	}
	return sum
}

func TestTauchenRefusesAChainThatFallsApart(t *testing.T) {
	for _, rho := range []float64{0.999999, -0.999999} { // stays for ever; alternates for ever
		_, err := income.Tauchen{Points: 9, Span: 3}.Discretise(income.AR1{Autocorrelation: rho, InnovationSD: 0.1})
		checkFaults(t, err, "Points")
	}
	// Short of it the chain is poor but whole.
	law := tauchen(t, 9, 3, 0.9995, 0.1).Stationary()
	for j, p := range law {
		if !(p > 0) {
			t.Errorf("stationary law %v has no mass on node %d", law, j)
		}
	}
	near(t, "total", total(law), 1, 1e-14)
}
