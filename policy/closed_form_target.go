package policy

import (
	"errors"
	"math"
)

// JobLossTarget is a household with CRRA utility, an endless life and no limit
// whose income grows by the factor Growth a year until, with Probability a year,
// it ends for ever. Everything is a multiple of income of the year (idea: Carroll
// & Toche 2009, A Tractable Model of Buffer Stock Saving, from memory; formulas
// re-derived here for income that is not raised to make up for the risk).
type JobLossTarget struct {
	Utility     CRRA
	Discount    float64 // β > 0
	Gross       float64 // R > 0
	Growth      float64 // G > 0, of income while it lasts
	Probability float64 // 0 < u < 1 a year
}

// Target is the state in which the household stays as long as its income lasts,
// in multiples of income.
type Target struct {
	Cash, Consumption float64
	Propensity        float64 // dc/dm there
}

// Solve returns the target. Without income c = κ·m, κ = 1 − (βR)^(1/γ)/R. With
// income the Euler equation at a constant ratio c, and m = (R/G)·(m−c) + 1, give
//
//	h = [(Θ^−γ − (1−u))/u]^(1/γ),   Θ = (βR)^(1/γ)/G,   x = R/G,
//	a = 1/(1 + hκx − x),   c = hκx·a,   m = x·a + 1,
//
// h the ratio of consumption with income to that after its loss. The propensity solves
// B·p·k² + (1 + B·q − B·p)·k − B·q = 0 with B = βR·G^−γ, p = (1−u)x, q = u·h^(γ+1)·κx
// (the Euler equation differentiated). It is an error where no target exists.
func (p JobLossTarget) Solve() (Target, error) {
	gamma := p.Utility.gamma
	growth := math.Pow(p.Discount*p.Gross, 1/gamma)
	kappa, x, theta := 1-growth/p.Gross, p.Gross/p.Growth, growth/p.Growth
	if !(kappa > 0) {
		return Target{}, errors.New("policy: no target: the household would never spend down its assets, (βR)^(1/γ) ≥ R")
	}
	h := math.Pow((math.Pow(theta, -gamma)-(1-p.Probability))/p.Probability, 1/gamma)
	spend := h * kappa * x
	if !(1+spend-x > 0) {
		return Target{}, errors.New("policy: no target: patience outweighs the growth of income")
	}
	a := 1 / (1 + spend - x)
	b := p.Discount * p.Gross * math.Pow(p.Growth, -gamma)
	stay, lose := (1-p.Probability)*x, p.Probability*math.Pow(h, gamma+1)*kappa*x
	return Target{Cash: x*a + 1, Consumption: spend * a, Propensity: upperRoot(b*stay, 1+b*lose-b*stay, -b*lose)}, nil
}

// upperRoot returns the larger root of a·k² + b·k + c, a > 0.
func upperRoot(a, b, c float64) float64 { return (-b + math.Sqrt(b*b-4*a*c)) / (2 * a) }
