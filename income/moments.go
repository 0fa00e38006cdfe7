package income

import "math"

// Moments of the persistent part, or of the transitory shock, under one
// distribution.
type Moments struct {
	Mean, SD        float64 // log points or money
	Autocorrelation float64 // between this year and the next
	Skewness        float64 // E(z−Ez)³ / SD³
	Kurtosis        float64 // E(z−Ez)⁴ / SD⁴; 3 for a normal law
}

// Moments returns the chain's moments in a year when nodes have the probabilities
// p; the autocorrelation is with the year after. Where all is on one node only the
// mean and the standard deviation exist and the rest is NaN.
func (c *Chain) Moments(p []float64) Moments {
	next := make([]float64, c.Len())
	c.Step(next, p)
	m, later := shape(c.Nodes, p), shape(c.Nodes, next)
	covariance := 0.0
	for i, q := range p {
		ahead := 0.0
		for j, x := range c.Row(i) {
			ahead += x * (c.Nodes[j] - later.Mean)
		}
		covariance += q * (c.Nodes[i] - m.Mean) * ahead
	}
	m.Autocorrelation = covariance / (m.SD * later.SD)
	return m
}

// shape returns the moments of values x with probabilities p; Autocorrelation is
// left at 0.
func shape(x, p []float64) Moments {
	var m Moments
	for i, q := range p {
		m.Mean += q * x[i]
	}
	var m2, m3, m4 float64
	for i, q := range p {
		d := x[i] - m.Mean
		m2 += q * d * d
		m3 += q * d * d * d
		m4 += q * d * d * d * d
	}
	m.SD = math.Sqrt(m2)
	m.Skewness = m3 / (m2 * m.SD)
	m.Kurtosis = m4 / (m2 * m2)
	return m
}

// Moments returns the moments of ε on the quadrature nodes, before the scaling of
// form log. With one node or SD 0 only the mean and the standard deviation exist.
func (s Transitory) Moments() Moments {
	return shape(s.shock())
}

// Conditional compares the law of next year's z from one node with the process.
type Conditional struct {
	Node             float64 // z this year
	Mean, SD         float64 // of the chain
	TrueMean, TrueSD float64 // of the process
}

// Conditionals returns the conditional moments at every node, in ascending order.
func (c *Chain) Conditionals(p AR1) []Conditional {
	out := make([]Conditional, c.Len())
	for i, z := range c.Nodes {
		m := shape(c.Nodes, c.Row(i))
		out[i] = Conditional{Node: z, Mean: m.Mean, SD: m.SD, TrueMean: p.Autocorrelation * z, TrueSD: p.InnovationSD}
	}
	return out
}
