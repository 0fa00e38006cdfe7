package income_test

import (
	"fmt"
	"math"
	"testing"

	"cistern/income"
)

// worker is a process with every risk on; change alters it before it is built.
func worker(t testing.TB, change func(*income.Process)) *income.Earnings {
	t.Helper()
	chain := discretise(t, income.Rouwenhorst{Points: 7}, income.AR1{Autocorrelation: 0.95, InnovationSD: 0.15})
	p := income.Process{
		FirstAge:   25,
		Profile:    income.Polynomial(income.Log, []float64{10, 0.04, -0.0007}, 25, 25, 40),
		Chain:      chain,
		Initial:    chain.Project(0.2),
		Transitory: income.Transitory{SD: 0.25, Nodes: 15},
		JobLoss:    income.JobLoss{Probability: 0.04, BenefitRate: 0.5},
	}
	if change != nil {
		change(&p)
	}
	e, err := p.Build()
	if err != nil {
		t.Fatal(err)
	}
	return e
}

// nodesMean averages what the solver sees in year t.
func nodesMean(e *income.Earnings, t int) float64 {
	mean := 0.0
	for j, q := range e.Distribution[t] {
		values, weights := e.Outcomes(t, j)
		for k, y := range values {
			mean += q * weights[k] * y
		}
	}
	return mean
}

// lawMean averages At over the continuous law of the shock, by 20 001 trapezoid
// points on ±10 sds, and over job loss.
func lawMean(e *income.Earnings, t int) float64 {
	mean, p := 0.0, e.JobLoss.Probability
	for j, q := range e.Distribution[t] {
		employed := 0.0
		for k := -10000; k <= 10000; k++ {
			x := float64(k) / 1000
			employed += math.Exp(-x*x/2) / math.Sqrt(2*math.Pi) / 1000 * e.At(t, j, e.Transitory.SD*x)
		}
		mean += q * ((1-p)*employed + p*e.Benefit[t][j])
	}
	return mean
}

// Derived: with κ and σ²/2 taken out, mean earnings are P·((1−p) + p·b) at every
// age, on the solver's nodes and under the law that a simulation draws from.
func TestMeanEarningsEqualTheProfile(t *testing.T) {
	tauchenChain := tauchen(t, 9, 3, 0.98, 0.15)
	tests := []struct {
		name   string
		change func(*income.Process)
	}{
		{"every risk", nil},
		{"stationary start", func(p *income.Process) { p.Initial = p.Chain.Stationary() }},
		{"start without spread", func(p *income.Process) { p.Initial = p.Chain.Project(0) }},
		{"Tauchen", func(p *income.Process) { p.Chain, p.Initial = tauchenChain, tauchenChain.Stationary() }},
		{"Gauss–Hermite", func(p *income.Process) { p.Transitory.Rule = income.GaussHermite }},
		{"two coarse nodes", func(p *income.Process) { p.Transitory.Nodes = 2 }},
		{"no transitory shock", func(p *income.Process) { p.Transitory.SD = 0 }},
		{"no job loss", func(p *income.Process) { p.JobLoss = income.JobLoss{} }},
		{"benefit above earnings", func(p *income.Process) { p.JobLoss.BenefitRate = 1.3 }},
		{"no persistent risk", func(p *income.Process) { p.Chain, p.Initial = income.Degenerate(), []float64{1} }},
		{"huge risk", func(p *income.Process) {
			p.Chain = discretise(t, income.Rouwenhorst{Points: 7}, income.AR1{Autocorrelation: 0.5, InnovationSD: 400})
			p.Initial = p.Chain.Stationary()
		}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			e := worker(t, tt.change)
			for _, year := range []int{0, 1, 20, 39} {
				lost := e.JobLoss.Probability
				want := e.Profile[year] * (1 - lost + lost*e.JobLoss.BenefitRate)
				near(t, fmt.Sprintf("Mean in year %d, relative", year), e.Mean(year)/want, 1, 1e-12)
				near(t, fmt.Sprintf("mean on the nodes in year %d, relative", year), nodesMean(e, year)/want, 1, 1e-12)
				near(t, fmt.Sprintf("mean under the law in year %d, relative", year), lawMean(e, year)/want, 1, 1e-11)
			}
		})
	}
}

// Derived: form level is additive, its shocks have mean zero; benefits leave z out.
func TestMeanEarningsInFormLevel(t *testing.T) {
	e := worker(t, func(p *income.Process) {
		p.Form = income.Level
		p.Profile = []float64{30, 20, -5}
	})
	for year, p := range e.Profile {
		want := p * (0.96 + 0.04*0.5)
		near(t, "Mean", e.Mean(year), want, 1e-13)
		near(t, "mean on the nodes", nodesMean(e, year), want, 1e-13)
		near(t, "mean under the law", lawMean(e, year), want, 1e-10)
	}
}

// Derived: with the profile a median, nothing is corrected: the middle node without
// a shock earns P, and the mean is P·Σπ·e^z·e^(σ²/2).
func TestMedianProfile(t *testing.T) {
	e := worker(t, func(p *income.Process) { p.ProfileIs = income.Median })
	near(t, "middle node", e.At(3, 3, 0)/e.Profile[3], 1, 1e-15)
	near(t, "shift", e.LogShift(), 0, 0)
	near(t, "κ", e.Kappa[3], 0, 0)
	near(t, "middle factor", e.Factor[7], 1, 0)
	near(t, "top factor", e.Factor[14], math.Exp(4*0.25), 1e-15)
	want := 0.0
	for j, z := range e.Chain.Nodes {
		want += e.Distribution[3][j] * e.Profile[3] * math.Exp(z) * (0.96*math.Exp(0.25*0.25/2) + 0.04*0.5)
	}
	near(t, "mean, relative", e.Mean(3)/want, 1, 1e-14)
	near(t, "mean under the law, relative", lawMean(e, 3)/want, 1, 1e-11)
}

// Published: Aiyagari (1994)'s seven-node chain; E exp(z) = 1.0278 at sd 0.2 and
// persistence 0.9 from an independent program. κ is its logarithm.
func TestKappa(t *testing.T) {
	e := worker(t, func(p *income.Process) {
		p.Chain = tauchen(t, 7, 3, 0.9, 0.2*math.Sqrt(1-0.81))
		p.Initial = p.Chain.Stationary()
	})
	for year := range e.Years() {
		near(t, "exp κ", math.Exp(e.Kappa[year]), 1.0278, 5.1e-5)
	}
}

// By hand: nodes ±ln 2 with equal chances have E e^z = 1.25; benefit ½; two
// Gauss–Hermite nodes at ±σ with σ = ln 3 have mean factor 5/3.
func TestTablesByHand(t *testing.T) {
	chain := &income.Chain{Nodes: []float64{-math.Ln2, math.Ln2}, Transition: []float64{0.5, 0.5, 0.5, 0.5}}
	p := income.Process{FirstAge: 30, Profile: []float64{100, 200}, Chain: chain, Initial: []float64{0.5, 0.5},
		Transitory: income.Transitory{SD: math.Log(3), Nodes: 2, Rule: income.GaussHermite}, JobLoss: income.JobLoss{Probability: 0.1, BenefitRate: 0.5}}
	tests := []struct {
		name          string
		form          income.Form
		meaning       income.Meaning
		base, benefit float64 // second year, upper node
		outcomes      []float64
	}{
		{"log, mean", income.Log, income.Mean, 320, 160, []float64{320. / 5, 320. * 9 / 5, 160}},
		{"log, median", income.Log, income.Median, 400, 200, []float64{400. / 3, 1200, 200}},
		{"level", income.Level, income.Mean, 200 + math.Ln2, 100, []float64{200 + math.Ln2 - math.Log(3), 200 + math.Ln2 + math.Log(3), 100}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			p.Form, p.ProfileIs = tt.form, tt.meaning
			e, err := p.Build()
			if err != nil {
				t.Fatal(err)
			}
			near(t, "base", e.Base[1][1], tt.base, 1e-12)
			near(t, "benefit", e.Benefit[1][1], tt.benefit, 1e-12)
			values, weights := e.Outcomes(1, 1)
			if len(values) != 3 || len(weights) != 3 {
				t.Fatalf("outcomes %v, %v", values, weights)
			}
			for k, want := range tt.outcomes {
				near(t, fmt.Sprintf("outcome %d", k), values[k], want, 1e-12)
				near(t, "its chance", weights[k], []float64{0.45, 0.45, 0.1}[k], 1e-15)
			}
			if e.Years() != 2 {
				t.Errorf("%d years, want 2", e.Years())
			}
		})
	}
}

func TestOutcomesLeaveOutWhatCannotHappen(t *testing.T) {
	tests := []struct {
		name   string
		change func(*income.Process)
		want   int
	}{
		{"job loss and shock", nil, 16},
		{"no job loss", func(p *income.Process) { p.JobLoss.Probability = 0 }, 15},
		{"no shock", func(p *income.Process) { p.Transitory.SD = 0 }, 2},
		{"neither", func(p *income.Process) { p.Transitory.SD, p.JobLoss.Probability = 0, 0 }, 1},
	}
	for _, tt := range tests {
		values, weights := worker(t, tt.change).Outcomes(0, 0)
		if len(values) != tt.want || len(weights) != tt.want {
			t.Errorf("%s: %d outcomes with %d chances, want %d", tt.name, len(values), len(weights), tt.want)
		}
		near(t, tt.name+": chances", total(weights), 1, 1e-14)
	}
}

func TestInfimum(t *testing.T) {
	none, sure := income.JobLoss{}, income.JobLoss{Probability: 1, BenefitRate: 0.5}
	flat := func(form income.Form, sd float64, loss income.JobLoss) *income.Earnings {
		return worker(t, func(p *income.Process) {
			p.Form, p.Transitory.SD, p.JobLoss = form, sd, loss
			p.Profile = []float64{100}
			p.Chain = &income.Chain{Nodes: []float64{-1, 1}, Transition: []float64{0.5, 0.5, 0.5, 0.5}}
			p.Initial = []float64{0.5, 0.5}
		})
	}
	kappa := math.Log(math.Cosh(1))
	tests := []struct {
		name string
		e    *income.Earnings
		want float64
	}{
		{"log with a shock", flat(income.Log, 0.1, none), 0},
		{"log without", flat(income.Log, 0, none), 100 * math.Exp(-1-kappa)},
		{"log, benefit below", flat(income.Log, 0, income.JobLoss{Probability: 0.1, BenefitRate: 0.5}), 50 * math.Exp(-1-kappa)},
		{"log, benefit above", flat(income.Log, 0, income.JobLoss{Probability: 0.1, BenefitRate: 2}), 100 * math.Exp(-1-kappa)},
		{"log, never employed", flat(income.Log, 0.1, sure), 50 * math.Exp(-1-kappa)},
		{"level with a shock", flat(income.Level, 0.1, none), math.Inf(-1)},
		{"level without", flat(income.Level, 0, none), 99},
		{"level, benefit below", flat(income.Level, 0, income.JobLoss{Probability: 0.1, BenefitRate: 0.5}), 50},
		{"level, never employed", flat(income.Level, 0.1, sure), 50},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if got := tt.e.Infimum(0); got != tt.want && !(math.Abs(got-tt.want) < 1e-12) {
				t.Errorf("%g, want %g", got, tt.want)
			}
		})
	}
}

func TestBuildKeepsItsOwnCopies(t *testing.T) {
	profile := []float64{100, 200}
	initial := []float64{1}
	e := worker(t, func(p *income.Process) { p.Profile, p.Chain, p.Initial = profile, income.Degenerate(), initial })
	profile[1], initial[0] = 7, 7
	if e.Profile[1] != 200 || e.Base[1][0] != 200 || e.Initial[0] != 1 || e.Distribution[0][0] != 1 {
		t.Errorf("tables changed with the caller's slices: %v %v %v", e.Profile, e.Base, e.Initial)
	}
}
