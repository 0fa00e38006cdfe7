package policy

import "math"

// CertainCRRA returns the solution without risk or limit under CRRA utility,
//
//	c_t = κ_t·(m_t + H_t),   1/κ_t = 1 + (β_t·R_t)^(1/γ)/R_t · 1/κ_{t+1},   κ_T = 1
//
// (derived: the Euler equation makes consumption grow by (βR)^(1/γ), and its
// present value is lifetime resources; textbook result).
func CertainCRRA(u CRRA, l Lifetime) LinearRule {
	h := l.HumanWealth()
	d := growingAnnuity(l.Gross, growthCRRA(u, l))
	r := newLinearRule(len(h), 1)
	for t := range h {
		r.Propensity[t] = 1 / d[t]
		r.Level[t][0] = h[t] / d[t]
	}
	return r
}

// growthCRRA returns (β_t·R_t)^(1/γ), [T−1], the growth of unconstrained
// consumption.
func growthCRRA(u CRRA, l Lifetime) []float64 {
	g := logs(l.Discount, l.Gross)
	for t := range g {
		g[t] = math.Exp(g[t] / u.gamma)
	}
	return g
}

// CertainStoneGeary returns the solution without risk or limit under Stone–Geary
// utility: that of CRRA for consumption, income and cash-on-hand less subsistence
// (derived: substitute c − c̲ in the budget).
func CertainStoneGeary(u StoneGeary, l Lifetime) LinearRule {
	r := CertainCRRA(u.excess(), l.less(u.subsistence))
	for t := range r.Level {
		r.Level[t][0] += u.subsistence * (1 - r.Propensity[t])
	}
	return r
}

// less returns l with x taken from every income.
func (l Lifetime) less(x float64) Lifetime {
	y := make([]float64, len(l.Income))
	for t := range y {
		y[t] = l.Income[t] - x
	}
	l.Income = y
	return l
}

// CertainCARA returns the solution without risk or limit under CARA utility.
// Consumption rises by ln(β_t·R_t)/α a year and its present value is lifetime
// resources,
//
//	c_t = (m_t + H_t − E_t)/A_t,   E_t = (E_{t+1} + A_{t+1}·ln(β_t·R_t)/α)/R_t,   E_T = 0,
//
// E_t the value of the rises to come (derived; the step is textbook). When an
// income arrives does not matter beyond its present value.
func CertainCARA(u CARA, l Lifetime) LinearRule {
	h, a, steps := l.HumanWealth(), AnnuityFactors(l.Gross), logs(l.Discount, l.Gross)
	r := newLinearRule(len(h), 1)
	rises := 0.0
	for t := len(h) - 1; t >= 0; t-- {
		if t < len(h)-1 {
			rises = (rises + a[t+1]*steps[t]/u.alpha) / l.Gross[t]
		}
		r.Propensity[t] = 1 / a[t]
		r.Level[t][0] = (h[t] - rises) / a[t]
	}
	return r
}

// CertainQuadratic returns the solution without risk or limit under quadratic
// utility. The distance x = B − c to bliss shrinks by the factor 1/(β_t·R_t) a
// year, so
//
//	B − c_t = (B·A_t − m_t − H_t)/D_t,   D_t = 1 + D_{t+1}/(β_t·R_t²),   D_T = 1
//
// (derived; Hall 1978, Journal of Political Economy 86, for βR = 1).
func CertainQuadratic(u Quadratic, l Lifetime) LinearRule {
	h := l.HumanWealth()
	wealth := make([][]float64, len(h))
	for t := range wealth {
		wealth[t] = []float64{h[t]}
	}
	return quadraticRule(u, wealth, l.Discount, l.Gross)
}

// quadraticRule is the certainty-equivalent rule for expected human wealth
// [T][node].
func quadraticRule(u Quadratic, wealth [][]float64, discount, gross []float64) LinearRule {
	shrink := make([]float64, len(gross))
	for t := range shrink {
		shrink[t] = 1 / (discount[t] * gross[t])
	}
	a, d := AnnuityFactors(gross), growingAnnuity(gross, shrink)
	r := newLinearRule(len(wealth), len(wealth[0]))
	for t := range wealth {
		r.Propensity[t] = 1 / d[t]
		for j, h := range wealth[t] {
			r.Level[t][j] = u.bliss - (u.bliss*a[t]-h)/d[t]
		}
	}
	return r
}

func newLinearRule(years, nodes int) LinearRule {
	r := LinearRule{Propensity: make([]float64, years), Level: make([][]float64, years)}
	for t := range r.Level {
		r.Level[t] = make([]float64, nodes)
	}
	return r
}
