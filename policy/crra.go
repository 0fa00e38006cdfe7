package policy

import "math"

// CRRA is utility with constant relative risk aversion,
//
//	u(c) = c^(1−γ)/(1−γ),   log c at γ = 1,   c > 0.
type CRRA struct{ gamma float64 }

// NewCRRA returns CRRA utility with relative risk aversion γ > 0.
func NewCRRA(gamma float64) (CRRA, error) {
	if !positive(gamma) {
		return CRRA{}, &FieldError{"RelativeRiskAversion", gamma, "positive and finite"}
	}
	return CRRA{gamma}, nil
}

// Family returns "crra".
func (u CRRA) Family() string { return "crra" }

// Value returns u(c).
func (u CRRA) Value(c float64) float64 { return powerUtility(c, u.gamma) }

// Marginal returns c^−γ.
func (u CRRA) Marginal(c float64) float64 { return math.Pow(c, -u.gamma) }

// Inverse returns marginal^(−1/γ).
func (u CRRA) Inverse(marginal float64) float64 { return math.Pow(marginal, -1/u.gamma) }

// AbsoluteRiskAversion returns γ/c.
func (u CRRA) AbsoluteRiskAversion(c float64) float64 { return u.gamma / c }

// RelativeRiskAversion returns γ.
func (u CRRA) RelativeRiskAversion(float64) float64 { return u.gamma }

// AbsolutePrudence returns (γ+1)/c.
func (u CRRA) AbsolutePrudence(c float64) float64 { return (u.gamma + 1) / c }

// RelativePrudence returns γ+1.
func (u CRRA) RelativePrudence(float64) float64 { return u.gamma + 1 }

// Infimum returns 0.
func (u CRRA) Infimum() float64 { return 0 }

// powerUtility is x^(1−γ)/(1−γ), or log x at γ = 1.
func powerUtility(x, gamma float64) float64 {
	if gamma == 1 {
		return math.Log(x)
	}
	return math.Pow(x, 1-gamma) / (1 - gamma)
}
