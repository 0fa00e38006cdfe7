package policy

import "math"

// CARAChain returns the solution without limit under CARA utility when income
// follows any finite chain with any finite number of independent outcomes,
//
//	c_t(z, m) = m/A_t + g_t(z),
//	g_t(z) = −A_{t+1}/(α·R_t·A_t) · [ ln(β_t·R_t) + ln E exp(−α·(y_{t+1}/A_{t+1} + g_{t+1}(z′))) ],
//
// A the annuity factors, g_T = 0 (derived: the Euler equation with a rule linear
// in m; the idea is Caballero's 1990, Journal of Monetary Economics 25, 113–136).
// Its cost is O(T·n²·outcomes).
func CARAChain(u CARA, p Prospects) LinearRule {
	years, n := p.check()
	a, steps := AnnuityFactors(p.Gross), logs(p.Discount, p.Gross)
	r := newLinearRule(years, n)
	r.Propensity[years-1] = 1
	for t := years - 2; t >= 0; t-- {
		next := make([]float64, n) // ln E exp(−α·c_{t+1}) over outcomes at each node, without assets
		for j := range next {
			next[j] = p.logMean(t+1, j, func(y float64) float64 { return -u.alpha * (y/a[t+1] + r.Level[t+1][j]) })
		}
		r.Propensity[t] = 1 / a[t]
		for j := range n {
			mean := logSum(p.Transition[t][j*n:(j+1)*n], next)
			r.Level[t][j] = -a[t+1] / (u.alpha * p.Gross[t] * a[t]) * (steps[t] + mean)
		}
	}
	return r
}

// logMean returns ln E exp(f(y)) over the outcomes of year t at node j.
func (p Prospects) logMean(t, j int, f func(float64) float64) float64 {
	x := make([]float64, len(p.Income[t][j]))
	for k, y := range p.Income[t][j] {
		x[k] = f(y)
	}
	return logSum(p.Weight[t][j], x)
}

// logSum returns ln Σ w·exp(x) without overflow.
func logSum(w, x []float64) float64 {
	top := math.Inf(-1)
	for i := range x {
		if w[i] > 0 {
			top = math.Max(top, x[i])
		}
	}
	sum := 0.0
	for i := range x {
		if w[i] > 0 {
			sum += w[i] * math.Exp(x[i]-top)
		}
	}
	return top + math.Log(sum)
}

// CARAValue returns the expected utility over the years to come of a household
// that consumes c now and has annuity factor A_t under an unconstrained CARA
// solution: −A_t·exp(−αc)/α (derived: the Euler equation makes E u(c) shrink by
// 1/(βR) a year).
func CARAValue(u CARA, annuity, consumption float64) float64 { return annuity * u.Value(consumption) }

// QuadraticChain returns the solution without limit under quadratic utility when
// income follows any finite chain: that under certainty with human wealth
// replaced by its expectation given the node (certainty equivalence; Simon 1956,
// Econometrica 24, and Hall 1978; derived here for any β_t·R_t).
func QuadraticChain(u Quadratic, p Prospects) LinearRule {
	return quadraticRule(u, p.HumanWealth(), p.Discount, p.Gross)
}

// HumanWealth returns the expected value in year t, given the node, of income from
// year t+1 on, [T][node].
func (p Prospects) HumanWealth() [][]float64 {
	years, n := p.check()
	h := make([][]float64, years)
	h[years-1] = make([]float64, n)
	for t := years - 2; t >= 0; t-- {
		ahead := make([]float64, n)
		for j := range ahead {
			ahead[j] = h[t+1][j] + dot(p.Weight[t+1][j], p.Income[t+1][j])
		}
		h[t] = make([]float64, n)
		for j := range n {
			h[t][j] = dot(p.Transition[t][j*n:(j+1)*n], ahead) / p.Gross[t]
		}
	}
	return h
}

func dot(w, x []float64) float64 {
	sum := 0.0
	for i := range x {
		sum += w[i] * x[i]
	}
	return sum
}

// ReturnRiskCRRA returns the propensities κ, [T], of a household that lives on its
// assets alone and has independent gross returns with the given outcomes and
// probabilities, under CRRA utility,
//
//	1/κ_t = 1 + (β_t·E R^(1−γ))^(1/γ)/κ_{t+1},   κ_T = 1
//
// (Samuelson 1969, Review of Economics and Statistics 51, 239–246; re-derived).
// discount, [T−1], holds β·s_t. At γ = 1 the law of returns drops out.
func ReturnRiskCRRA(u CRRA, discount, returns, weights []float64) []float64 {
	mean := 0.0
	for i, r := range returns {
		mean += weights[i] * math.Pow(r, 1-u.gamma)
	}
	k := make([]float64, len(discount)+1)
	k[len(discount)] = 1
	for t := len(discount) - 1; t >= 0; t-- {
		k[t] = 1 / (1 + math.Pow(discount[t]*mean, 1/u.gamma)/k[t+1])
	}
	return k
}

// RiskCost returns the share λ by which a consumption stream that is lognormal
// with mean 1, independent over years, with log standard deviation sd, must be
// raised to be worth its mean for certain: λ = exp(γ·sd²/2) − 1 (Lucas 1987, Models
// of Business Cycles, from memory; derived).
func RiskCost(u CRRA, sd float64) float64 { return math.Expm1(u.gamma * sd * sd / 2) }
