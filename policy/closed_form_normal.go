package policy

import (
	"errors"
	"math"
)

// CARANormal is a household with CARA utility and no limit whose income follows
// y′ = μ(1−ρ) + ρ·y + ε, ε ~ N(0, σ²), any real y (Caballero 1990, Journal of
// Monetary Economics 25, 113–136, and 1991, American Economic Review 81; re-derived
// with a finite life). Its consumption follows c_s = c_{s−1} + G_s + ψ_s·ε_s with
//
//	ψ_s = Σ_{j≤k} (ρ/R)^j / Σ_{j≤k} R^−j,   G_s = ln(βR)/α + α·ψ_s²·σ²/2,
//
// k the number of years after s.
type CARANormal struct {
	Utility         CARA
	Discount        float64 // β > 0
	Gross           float64 // R > 0
	Mean            float64 // μ, money
	Autocorrelation float64 // ρ, −1 < ρ ≤ 1
	InnovationSD    float64 // σ ≥ 0, money
}

// Consumption returns consumption with the given number of years still to come,
// cash-on-hand and income of this year,
//
//	c = ( m + H − Σ_{j=1..n} R^−j Σ_{i≤j} G_i ) / A_n,   H = Σ_{j=1..n} R^−j·(μ + ρ^j(y−μ)).
//
// Its cost is O(years).
func (p CARANormal) Consumption(yearsAhead int, cash, income float64) float64 {
	resources, annuity := cash, 1.0
	discount, memory, growth := 1.0, 1.0, 0.0
	for j := 1; j <= yearsAhead; j++ {
		discount /= p.Gross
		memory *= p.Autocorrelation
		growth += p.growth(ShockPropensity(p.Autocorrelation, p.Gross, yearsAhead-j))
		resources += discount * (p.Mean + memory*(income-p.Mean) - growth)
		annuity += discount
	}
	return resources / annuity
}

// Infinite returns consumption of a household that lives for ever,
//
//	c = (r/R)·(m + H) − G/r,   H = μ/r + ρ(y−μ)/(R−ρ),   ψ = r/(R−ρ).
//
// It is an error unless R > 1.
func (p CARANormal) Infinite(cash, income float64) (float64, error) {
	r := p.Gross - 1
	if !(r > 0) {
		return 0, errors.New("policy: an endless life has finite resources only if the return is positive")
	}
	h := p.Mean/r + p.Autocorrelation*(income-p.Mean)/(p.Gross-p.Autocorrelation)
	return r/p.Gross*(cash+h) - p.growth(r/(p.Gross-p.Autocorrelation))/r, nil
}

// PrecautionaryGrowth returns α·ψ²·σ²/2, the yearly rise of consumption that risk
// adds in a year with propensity ψ to consume the shock.
func (p CARANormal) PrecautionaryGrowth(psi float64) float64 {
	x := psi * p.InnovationSD
	return p.Utility.alpha * x * x / 2
}

func (p CARANormal) growth(psi float64) float64 {
	return math.Log(p.Discount*p.Gross)/p.Utility.alpha + p.PrecautionaryGrowth(psi)
}

// ShockPropensity returns the rise of consumption per unit of an income shock with
// autocorrelation rho in a household with the given number of years still to come
// and neither limit nor prudence (or with CARA utility),
//
//	ψ = Σ_{j=0..n} (ρ/R)^j / Σ_{j=0..n} R^−j
//
// (Flavin 1981, Journal of Political Economy 89, 974–1009, for an infinite life;
// derived for a finite one).
func ShockPropensity(rho, gross float64, yearsAhead int) float64 {
	return annuityDue(gross/rho, yearsAhead+1) / annuityDue(gross, yearsAhead+1)
}

// PermanentPropensity returns the rise of consumption per unit of a permanent
// income shock that lasts for the given working years, this one included, out of
// the given years of life, this one included: the ratio of the two annuity
// factors (derived; one less it is the exact insurance of permanent shocks under
// certainty equivalence with βR = 1).
func PermanentPropensity(gross float64, workingYears, years int) float64 {
	return annuityDue(gross, workingYears) / annuityDue(gross, years)
}

// annuityDue returns Σ_{j<n} R^−j; R = +Inf gives 1.
func annuityDue(gross float64, n int) float64 {
	sum, term := 0.0, 1.0
	for range n {
		sum += term
		term /= gross
	}
	return sum
}
