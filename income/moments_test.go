package income_test

import (
	"fmt"
	"math"
	"testing"

	"cistern/income"
)

// Published: Tauchen (1986), Table 1, innovations of sd 0.1, span 3; the printed
// values (from memory) agree in all three digits with the recomputed ones, which
// come from an independent program.
func TestTauchenPublishedMoments(t *testing.T) {
	tests := []struct {
		points                        int
		lambda                        float64
		printedLambda, printedSigma   float64 // three digits; 0 where the table has no row
		computedLambda, computedSigma float64
	}{
		{9, 0.1, 0.100, 0.103, 0.099786, 0.102658},
		{9, 0.8, 0.798, 0.176, 0.798382, 0.176200},
		{9, 0.9, 0.898, 0.253, 0.898419, 0.253329},
		{5, 0.9, 0.932, 0.291, 0.931525, 0.291181},
		{5, 0.1, 0, 0, 0.099862, 0.109485},
		{5, 0.8, 0, 0, 0.808562, 0.200820},
	}
	for _, tt := range tests {
		t.Run(fmt.Sprintf("points=%d,lambda=%g", tt.points, tt.lambda), func(t *testing.T) {
			c := tauchen(t, tt.points, 3, tt.lambda, 0.1)
			m := c.Moments(c.Stationary())
			near(t, "autocorrelation", m.Autocorrelation, tt.computedLambda, 1e-6)
			near(t, "sd", m.SD, tt.computedSigma, 1e-6)
			if tt.printedSigma > 0 {
				near(t, "printed autocorrelation", m.Autocorrelation, tt.printedLambda, 5.1e-4)
				near(t, "printed sd", m.SD, tt.printedSigma, 5.1e-4)
			}
		})
	}
}

// Derived: an independent program. Chain's sd over the process's and implied
// autocorrelation, Tauchen with span 3.
func TestTauchenAccuracyByPersistence(t *testing.T) {
	tests := []struct {
		rho                float64
		points             int
		ratio, persistence float64
	}{
		{0.5, 5, 1.115953, 0.499299}, {0.5, 9, 1.028041, 0.498922}, {0.5, 15, 1.007099, 0.498803}, {0.5, 25, 1.000302, 0.498762},
		{0.9, 5, 1.269228, 0.931525}, {0.9, 9, 1.104233, 0.898419}, {0.9, 15, 1.031261, 0.898677}, {0.9, 25, 1.006369, 0.898813},
		{0.98, 5, 1.348132, 0.999885}, {0.98, 9, 1.248228, 0.988978}, {0.98, 15, 1.138844, 0.979625}, {0.98, 25, 1.048067, 0.979437},
		{0.99, 5, 1.361979, 1.000000}, {0.99, 9, 1.284794, 0.998631}, {0.99, 15, 1.200693, 0.991750}, {0.99, 25, 1.096192, 0.989587},
	}
	for _, tt := range tests {
		t.Run(fmt.Sprintf("rho=%g,points=%d", tt.rho, tt.points), func(t *testing.T) {
			p := income.AR1{Autocorrelation: tt.rho, InnovationSD: 1}
			c := discretise(t, income.Tauchen{Points: tt.points, Span: 3}, p)
			m := c.Moments(c.Stationary())
			near(t, "sd ratio", m.SD/p.StationarySD(), tt.ratio, 1e-6)
			near(t, "autocorrelation", m.Autocorrelation, tt.persistence, 1e-6)
		})
	}
}

// Published: Aiyagari (1994, Quarterly Journal of Economics 109), Table I, from
// memory: coefficient of variation and serial correlation of exp(z) on seven nodes
// over three stationary sds. The further digits come from an independent program.
func TestAiyagariEarningsMoments(t *testing.T) {
	tests := []struct {
		sd, rho                         float64
		printedVariation, printedSerial float64
		variation, serial, mean         float64
	}{
		{0.2, 0, 0.21, 0, .2099, 0, 1.0218},
		{0.2, 0.3, 0.21, 0.29, .2107, .2950, 1.0220},
		{0.2, 0.6, 0.21, 0.59, .2142, .5935, 1.0227},
		{0.2, 0.9, 0.24, 0.90, .2367, .8990, 1.0278},
		{0.4, 0, 0.43, 0, .4327, 0, 1.0902},
		{0.4, 0.3, 0.43, 0.28, .4343, .2822, 1.0908},
		{0.4, 0.6, 0.44, 0.58, .4416, .5777, 1.0940},
		{0.4, 0.9, 0.49, 0.89, .4885, .8913, 1.1155},
	}
	for _, tt := range tests {
		t.Run(fmt.Sprintf("sd=%g,rho=%g", tt.sd, tt.rho), func(t *testing.T) {
			c := tauchen(t, 7, 3, tt.rho, tt.sd*math.Sqrt(1-tt.rho*tt.rho))
			law := c.Stationary()
			for i, z := range c.Nodes {
				c.Nodes[i] = math.Exp(z)
			}
			m := c.Moments(law)
			near(t, "mean", m.Mean, tt.mean, 5.1e-5)
			near(t, "coefficient of variation", m.SD/m.Mean, tt.variation, 5.1e-5)
			near(t, "serial correlation", m.Autocorrelation, tt.serial, 5.1e-5)
			near(t, "printed variation", m.SD/m.Mean, tt.printedVariation, 5.1e-3)
			near(t, "printed correlation", m.Autocorrelation, tt.printedSerial, 5.1e-3)
		})
	}
}

// Derived by hand: nodes 0 and 3 with chances ⅔ and ⅓ have mean 1, variance 2,
// third moment 2 and fourth 6; the chain keeps half of the distance each year.
func TestMomentsByHand(t *testing.T) {
	c := &income.Chain{Nodes: []float64{0, 3}, Transition: []float64{5. / 6, 1. / 6, 1. / 3, 2. / 3}}
	m := c.Moments([]float64{2. / 3, 1. / 3})
	near(t, "mean", m.Mean, 1, 1e-15)
	near(t, "sd", m.SD, math.Sqrt2, 1e-15)
	near(t, "skewness", m.Skewness, 1/math.Sqrt2, 1e-14)
	near(t, "kurtosis", m.Kurtosis, 1.5, 1e-14)
	near(t, "autocorrelation", m.Autocorrelation, 0.5, 1e-15)
	k := c.Conditionals(income.AR1{Autocorrelation: 0.5, InnovationSD: 2})[1]
	near(t, "conditional mean", k.Mean, 2, 1e-15)
	near(t, "conditional sd", k.SD, math.Sqrt2, 1e-15)
	near(t, "conditional mean of the process", k.TrueMean, 1.5, 0)
	near(t, "conditional sd of the process", k.TrueSD, 2, 0)
}

// Off the stationary law the two years have different sds. Derived by hand: from
// (½, ½) the covariance is that of slope ½ on a variance of 9/4, and next year's
// chances are (7/12, 5/12), variance 9·35/144.
func TestAutocorrelationOffTheStationaryLaw(t *testing.T) {
	c := &income.Chain{Nodes: []float64{0, 3}, Transition: []float64{5. / 6, 1. / 6, 1. / 3, 2. / 3}}
	got := c.Moments([]float64{0.5, 0.5}).Autocorrelation
	near(t, "autocorrelation", got, 9./8/math.Sqrt(9./4*9*35/144), 1e-15)
}

func TestMomentsOfASingleNode(t *testing.T) {
	m := income.Degenerate().Moments([]float64{1})
	if m.Mean != 0 || m.SD != 0 || !math.IsNaN(m.Autocorrelation) || !math.IsNaN(m.Kurtosis) || !math.IsNaN(m.Skewness) {
		t.Errorf("got %+v, want mean and sd 0 and no others", m)
	}
}

func TestProcessMoments(t *testing.T) {
	got := income.AR1{Autocorrelation: 0.6, InnovationSD: 0.8}.Moments()
	if want := (income.Moments{SD: 1, Autocorrelation: 0.6, Kurtosis: 3}); got != want { // 0.8/√(1−0.36) = 1
		t.Errorf("got %+v, want %+v", got, want)
	}
}
