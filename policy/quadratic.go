package policy

import "math"

// Quadratic is quadratic utility around a bliss point B,
//
//	u(c) = −(B − c)²/2,   any c.
//
// Marginal utility is linear, so risk does not move saving: certainty equivalence.
type Quadratic struct{ bliss float64 }

// NewQuadratic returns quadratic utility with the given bliss point, money a year.
func NewQuadratic(bliss float64) (Quadratic, error) {
	if math.IsNaN(bliss) || math.IsInf(bliss, 0) {
		return Quadratic{}, &FieldError{"BlissPoint", bliss, "a finite number"}
	}
	return Quadratic{bliss}, nil
}

// Family returns "quadratic".
func (u Quadratic) Family() string { return "quadratic" }

// Value returns u(c).
func (u Quadratic) Value(c float64) float64 { return -(u.bliss - c) * (u.bliss - c) / 2 }

// Marginal returns B − c, negative beyond the bliss point.
func (u Quadratic) Marginal(c float64) float64 { return u.bliss - c }

// Inverse returns B − marginal.
func (u Quadratic) Inverse(marginal float64) float64 { return u.bliss - marginal }

// AbsoluteRiskAversion returns 1/(B − c).
func (u Quadratic) AbsoluteRiskAversion(c float64) float64 { return 1 / (u.bliss - c) }

// RelativeRiskAversion returns c/(B − c).
func (u Quadratic) RelativeRiskAversion(c float64) float64 { return c / (u.bliss - c) }

// AbsolutePrudence returns 0.
func (u Quadratic) AbsolutePrudence(float64) float64 { return 0 }

// RelativePrudence returns 0.
func (u Quadratic) RelativePrudence(float64) float64 { return 0 }

// Infimum returns −Inf: consumption may be negative.
func (u Quadratic) Infimum() float64 { return math.Inf(-1) }
