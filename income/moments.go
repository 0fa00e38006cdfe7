package income

import (
	"fmt"
	"math"
)

// Moments of the persistent part under one distribution.
type Moments struct {
	Mean, SD        float64 // log points or money
	Autocorrelation float64 // between this year and the next
	Skewness        float64
	Kurtosis        float64 // 3 for a normal law
}

// Moments returns the chain's moments where nodes have the probabilities p, NaN
// where a degenerate distribution has none.
func (c *Chain) Moments(p []float64) Moments {
	var m Moments
	for i, q := range p {
		m.Mean += q * c.Nodes[i]
	}
	var m2, m3, m4 float64
	next := make([]float64, c.Len())
	c.Step(next, p)
	nextMean, nextVariance := 0.0, 0.0
	for j, q := range next {
		nextMean += q * c.Nodes[j]
	}
	cross := 0.0
	for i, q := range p {
		d := c.Nodes[i] - m.Mean
		m2 += q * d * d
		m3 += q * d * d * d
		m4 += q * d * d * d * d
		e := c.Nodes[i] - nextMean
		nextVariance += next[i] * e * e
		for j, x := range c.Row(i) {
			cross += q * d * x * (c.Nodes[j] - nextMean)
		}
	}
	m.SD = math.Sqrt(m2)
	m.Autocorrelation = cross / math.Sqrt(m2*nextVariance)
	m.Skewness = m3 / (m2 * m.SD)
	m.Kurtosis = m4 / (m2 * m2)
	return m
}

// Conditional compares the law of next year's z from one node with the process.
type Conditional struct {
	Node             float64 // z this year
	Mean, SD         float64 // of the chain
	TrueMean, TrueSD float64 // of the process
}

// Conditionals returns the conditional moments at every node.
func (c *Chain) Conditionals(p AR1) []Conditional {
	out := make([]Conditional, c.Len())
	for i, z := range c.Nodes {
		k := Conditional{Node: z, TrueMean: p.Autocorrelation * z, TrueSD: p.InnovationSD}
		for j, q := range c.Row(i) {
			k.Mean += q * c.Nodes[j]
		}
		for j, q := range c.Row(i) {
			k.SD += q * (c.Nodes[j] - k.Mean) * (c.Nodes[j] - k.Mean)
		}
		k.SD = math.Sqrt(k.SD)
		out[i] = k
	}
	return out
}

// remarkAbove is the relative error of a chain's moment that Remarks speaks of.
const remarkAbove = 0.02

// Remarks says in words where a chain is a poor stand-in for its process, or
// nothing where it is close.
func Remarks(p AR1, c *Chain) []string {
	if p.InnovationSD == 0 || c.Len() < 2 {
		return nil
	}
	var out []string
	m, truth := c.Moments(c.Stationary()), p.Moments()
	if r := m.SD/truth.SD - 1; math.Abs(r) > remarkAbove {
		out = append(out, fmt.Sprintf("the chain's standard deviation is %s than the process's (%.4f against %.4f)", offBy(r, "higher", "lower"), m.SD, truth.SD))
	}
	if d := m.Autocorrelation - truth.Autocorrelation; math.Abs(d) > remarkAbove*(1-math.Abs(truth.Autocorrelation)) {
		out = append(out, fmt.Sprintf("the chain's autocorrelation is %.4f, the process's %.4f: shocks last %s", m.Autocorrelation, truth.Autocorrelation, longer(d)))
	}
	innovation := 0.0
	stationary := c.Stationary()
	for i, k := range c.Conditionals(p) {
		innovation += stationary[i] * k.SD * k.SD
	}
	if r := math.Sqrt(innovation)/p.InnovationSD - 1; math.Abs(r) > 5*remarkAbove {
		out = append(out, fmt.Sprintf("the chain's innovations are %s than the process's (standard deviation %.4f against %.4f)", offBy(r, "larger", "smaller"), math.Sqrt(innovation), p.InnovationSD))
	}
	if len(out) > 0 {
		out = append(out, "more points, or method rouwenhorst, which is exact in all three at any persistence, would be closer")
	}
	return out
}

func offBy(r float64, more, less string) string {
	if r > 0 {
		return fmt.Sprintf("%.1f %% %s", 100*r, more)
	}
	return fmt.Sprintf("%.1f %% %s", -100*r, less)
}

func longer(d float64) string {
	if d > 0 {
		return "too long"
	}
	return "not long enough"
}
