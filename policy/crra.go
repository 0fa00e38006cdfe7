package policy

import "math"

// CRRA is utility with constant relative risk aversion γ,
//
//	u(c) = c^(1−γ)/(1−γ),   u(c) = log c at γ = 1,   c > 0.
//
// Absolute risk aversion is γ/c and absolute prudence (γ+1)/c. Make one with
// [NewCRRA].
type CRRA struct{ gamma float64 }

// NewCRRA returns the utility with relative risk aversion γ > 0.
func NewCRRA(relativeRiskAversion float64) (CRRA, error) {
	if !positive(relativeRiskAversion) {
		return CRRA{}, outOfRange("RelativeRiskAversion", relativeRiskAversion, "positive and finite")
	}
	return CRRA{relativeRiskAversion}, nil
}

// Family returns "crra".
func (u CRRA) Family() string { return "crra" }

// Value returns u(c).
func (u CRRA) Value(c float64) float64 {
	switch {
	case c < 0:
		return math.Inf(-1)
	case u.gamma == 1:
		return math.Log(c)
	}
	return math.Pow(c, 1-u.gamma) / (1 - u.gamma)
}

// Marginal returns c^−γ.
func (u CRRA) Marginal(c float64) float64 {
	if c <= 0 {
		return math.Inf(1)
	}
	return math.Pow(c, -u.gamma)
}

// Inverse returns u^(−1/γ).
func (u CRRA) Inverse(marginal float64) float64 { return math.Pow(marginal, -1/u.gamma) }

// AbsoluteRiskAversion returns γ/c.
func (u CRRA) AbsoluteRiskAversion(c float64) float64 { return above0(u.gamma/c, c) }

// RelativeRiskAversion returns γ.
func (u CRRA) RelativeRiskAversion(c float64) float64 { return above0(u.gamma, c) }

// AbsolutePrudence returns (γ+1)/c.
func (u CRRA) AbsolutePrudence(c float64) float64 { return above0((u.gamma+1)/c, c) }

// RelativePrudence returns γ+1.
func (u CRRA) RelativePrudence(c float64) float64 { return above0(u.gamma+1, c) }

// Infimum returns 0.
func (u CRRA) Infimum() float64 { return 0 }

// above0 returns a, NaN unless x > 0.
func above0(a, x float64) float64 {
	if x > 0 {
		return a
	}
	return math.NaN()
}
