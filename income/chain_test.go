package income_test

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"cistern/income"
)

// everyChain runs f on chains of both methods over sizes and persistences.
func everyChain(t *testing.T, f func(t *testing.T, p income.AR1, c *income.Chain)) {
	t.Helper()
	for _, n := range []int{2, 3, 6, 9, 25} {
		for _, d := range []income.Discretiser{income.Rouwenhorst{Points: n}, income.Tauchen{Points: n, Span: 3}, income.Tauchen{Points: n, Span: 1.5}} {
			for _, rho := range []float64{-0.9, -0.3, 0, 0.4, 0.9, 0.98, 0.999} {
				if d.Name() == "tauchen" && rho > 0.99 && n <= 3 {
					continue // refused: TestTauchenRefusesAChainThatFallsApart
				}
				t.Run(fmt.Sprintf("%+v,rho=%g", d, rho), func(t *testing.T) {
					p := income.AR1{Autocorrelation: rho, InnovationSD: 0.3}
					f(t, p, discretise(t, d, p))
				})
			}
		}
	}
}

// The battery: what must hold of any discretisation of a symmetric AR(1).
func TestEveryChain(t *testing.T) {
	everyChain(t, func(t *testing.T, p income.AR1, c *income.Chain) {
		n := c.Len()
		if err := c.Validate(); err != nil {
			t.Fatal(err) // nodes ascending, rows sum to 1 within 1e-12
		}
		law := c.Stationary()
		next := make([]float64, n)
		c.Step(next, law)
		start := c.Project(0.3)
		for i := range n {
			mirror := n - 1 - i
			near(t, "node against its mirror", c.Nodes[i], -c.Nodes[mirror], 0)
			near(t, "law against its mirror", law[i]/law[mirror], 1, 1e-10)
			near(t, "law a year on", next[i], law[i], 1e-15)
			near(t, "start against its mirror", start[i], start[mirror], 1e-15)
			for j := range n {
				near(t, "move against its mirror", c.Row(i)[j], c.Row(mirror)[n-1-j], 2e-15)
			}
		}
		near(t, "stationary law", total(law), 1, 1e-14)
		near(t, "start", total(start), 1, 1e-14)
		checkMonotone(t, p.Autocorrelation, c)
	})
}

// checkMonotone: from a higher node next year is higher in distribution if ρ > 0,
// lower if ρ < 0, the same if ρ = 0.
func checkMonotone(t *testing.T, rho float64, c *income.Chain) {
	t.Helper()
	for i := 1; i < c.Len(); i++ {
		low, high := 0.0, 0.0
		for j := range c.Len() {
			low += c.Row(i - 1)[j]
			high += c.Row(i)[j]
			switch d := high - low; {
			case rho > 0 && d > 1e-14, rho < 0 && d < -1e-14, rho == 0 && math.Abs(d) > 1e-14:
				t.Fatalf("distribution function at %d from nodes %d and %d: %.15g and %.15g", j, i-1, i, low, high)
			}
		}
	}
}

func total(p []float64) float64 {
	sum := 0.0
	for _, q := range p {
		sum += q
	}
	return sum
}

// Derived: the same law from the linear equations, solved by LU.
func TestStationaryAgainstLinearEquations(t *testing.T) {
	for _, rho := range []float64{0, 0.5, 0.9, 0.98} {
		c := tauchen(t, 9, 3, rho, 0.1)
		n := c.Len()
		a, b := mat.NewDense(n, n, nil), mat.NewVecDense(n, nil)
		for i := range n {
			for j := range n {
				a.Set(j, i, c.Row(i)[j])
			}
			a.Set(i, i, a.At(i, i)-1)
		}
		for i := range n {
			a.Set(n-1, i, 1)
		}
		b.SetVec(n-1, 1)
		var want mat.VecDense
		if err := want.SolveVec(a, b); err != nil {
			t.Fatal(err)
		}
		for i, got := range c.Stationary() {
			near(t, fmt.Sprintf("ρ = %g, node %d", rho, i), got, want.AtVec(i), 1e-12)
		}
	}
}

func TestStationaryByHand(t *testing.T) {
	tests := []struct {
		name       string
		transition []float64
		want       []float64 // derived: flow out of each part equals flow in
	}{
		{"single", []float64{1}, []float64{1}},
		{"two nodes", []float64{0.9, 0.1, 0.3, 0.7}, []float64{0.75, 0.25}},
		{"once in 1e18 years", []float64{1, 1e-18, 3e-18, 1}, []float64{0.75, 0.25}},
		{"alternating", []float64{0, 1, 1, 0}, []float64{0.5, 0.5}},
		{"cycle", []float64{0, 1, 0, 0, 0, 1, 1, 0, 0}, []float64{1. / 3, 1. / 3, 1. / 3}},
		{"left for good upwards", []float64{0.5, 0.5, 0, 1}, []float64{0, 1}},
		{"left for good downwards", []float64{1, 0, 0.5, 0.5}, []float64{1, 0}},
		{"ends in the middle", []float64{0.5, 0.5, 0, 0, 1, 0, 0, 0.5, 0.5}, []float64{0, 1, 0}},
		{"ends in two of four", []float64{0.2, 0.3, 0.5, 0, 0, 0.8, 0, 0.2, 0.5, 0, 0.5, 0, 0, 0.6, 0, 0.4}, []float64{0, 0.75, 0, 0.25}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			c := &income.Chain{Nodes: make([]float64, len(tt.want)), Transition: tt.transition}
			for i, got := range c.Stationary() {
				near(t, fmt.Sprintf("node %d", i), got, tt.want[i], 1e-15)
			}
		})
	}
}

func TestStationaryPanicsWhereThereIsNone(t *testing.T) {
	for _, p := range [][]float64{{1, 0, 0, 1}, {0, 0.5, 0.5, 0, 1, 0, 0, 0, 1}, {1, 0, 0, 0, 1, 0, 0.5, 0.5, 0}} {
		n := int(math.Sqrt(float64(len(p))))
		mustPanic(t, func() { (&income.Chain{Nodes: make([]float64, n), Transition: p}).Stationary() })
	}
}

func mustPanic(t *testing.T, f func()) {
	t.Helper()
	defer func() {
		if message, ok := recover().(string); !ok || !strings.HasPrefix(message, "income: ") {
			t.Errorf("panic %q, want one of this package", message)
		}
	}()
	f()
}

func TestProject(t *testing.T) {
	c := &income.Chain{Nodes: []float64{-1, 0, 1}}
	even := &income.Chain{Nodes: []float64{-3, -1, 1, 3}}
	tests := []struct {
		name  string
		chain *income.Chain
		sd    float64
		want  []float64
	}{
		{"cuts at half an sd", c, 1, []float64{1 - phiHalf, 2*phiHalf - 1, 1 - phiHalf}},
		{"cuts at one sd", c, 0.5, []float64{1 - phiOne, 2*phiOne - 1, 1 - phiOne}},
		{"no spread", c, 0, []float64{0, 1, 0}},
		{"no spread, no node at 0", even, 0, []float64{0, 0.5, 0.5, 0}},
		{"hardly any spread", c, 1e-200, []float64{0, 1, 0}},
		{"no end of spread", c, 1e200, []float64{0.5, 0, 0.5}},
		{"one node", income.Degenerate(), 0.4, []float64{1}},
		{"one node, no spread", income.Degenerate(), 0, []float64{1}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			for i, got := range tt.chain.Project(tt.sd) {
				near(t, fmt.Sprintf("node %d", i), got, tt.want[i], 2e-15)
			}
		})
	}
	mustPanic(t, func() { c.Project(-1) })
	mustPanic(t, func() { c.Project(math.NaN()) })
}

// Derived: rounding to cells of width h adds h²/12 to a smooth law's variance
// (Sheppard's correction).
func TestProjectAddsTheVarianceOfACell(t *testing.T) {
	c := &income.Chain{Transition: make([]float64, 41*41)}
	for i := range 41 {
		c.Nodes = append(c.Nodes, 0.1*float64(i-20))
		c.Transition[i*41+i] = 1
	}
	for _, sd := range []float64{0.1, 0.2, 0.3} {
		near(t, fmt.Sprintf("variance at sd %g", sd), math.Pow(c.Moments(c.Project(sd)).SD, 2), sd*sd+0.01/12, 1e-8)
	}
}

func TestByAge(t *testing.T) {
	c := &income.Chain{Nodes: []float64{-1, 1}, Transition: []float64{0.9, 0.1, 0.3, 0.7}}
	start := []float64{0, 1}
	d := c.ByAge(start, 4)
	// Derived: the eigenvalue 0.6 shrinks the distance to (¾, ¼) each year.
	for year, p := range d {
		near(t, fmt.Sprintf("year %d", year), p[1], 0.25+0.75*math.Pow(0.6, float64(year)), 1e-15)
		near(t, "total", total(p), 1, 1e-15)
	}
	d[0][0] = 9
	if start[0] != 0 {
		t.Error("ByAge hands out the caller's slice")
	}
	if got := len(c.ByAge(start, 0)); got != 0 {
		t.Errorf("%d years, want 0", got)
	}
}

// The conditional variance is the same at every node, so the variance by age obeys
// the AR(1)'s own recursion V′ = ρ²V + σ². Derived.
func TestByAgeVarianceFollowsTheProcess(t *testing.T) {
	p := income.AR1{Autocorrelation: 0.97, InnovationSD: 0.12}
	c := discretise(t, income.Rouwenhorst{Points: 11}, p)
	d := c.ByAge(c.Project(0), 40)
	v := 0.0
	for year, law := range d {
		near(t, fmt.Sprintf("variance in year %d", year), math.Pow(c.Moments(law).SD, 2), v, 1e-13)
		v = p.Autocorrelation*p.Autocorrelation*v + p.InnovationSD*p.InnovationSD
	}
}

func TestWithoutInnovationsTheChainIsDegenerate(t *testing.T) {
	for _, d := range []income.Discretiser{income.Rouwenhorst{Points: 7}, income.Tauchen{Points: 7, Span: 3}} {
		c := discretise(t, d, income.AR1{Autocorrelation: 0.9})
		if !slices.Equal(c.Nodes, []float64{0}) || !slices.Equal(c.Transition, []float64{1}) {
			t.Errorf("%s gives %v", d.Name(), c)
		}
	}
}
