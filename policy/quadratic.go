package policy

import "math"

// Quadratic is the utility
//
//	u(c) = −(B − c)²/2,
//
// with bliss point B, for any real c. Its marginal utility is linear, so there is
// no prudence: risk leaves consumption alone (certainty equivalence). Beyond the
// bliss point more consumption is worse and risk aversion is negative; a
// scenario should keep B well above any consumption it meets. Make one with
// [NewQuadratic].
type Quadratic struct{ bliss float64 }

// NewQuadratic returns the utility with the given bliss point, in money.
func NewQuadratic(blissPoint float64) (Quadratic, error) {
	if !finite(blissPoint) {
		return Quadratic{}, outOfRange("BlissPoint", blissPoint, "finite")
	}
	return Quadratic{blissPoint}, nil
}

// Family returns "quadratic".
func (u Quadratic) Family() string { return "quadratic" }

// Value returns −(B − c)²/2.
func (u Quadratic) Value(c float64) float64 { return -(u.bliss - c) * (u.bliss - c) / 2 }

// Marginal returns B − c.
func (u Quadratic) Marginal(c float64) float64 { return u.bliss - c }

// Inverse returns B − u.
func (u Quadratic) Inverse(marginal float64) float64 { return u.bliss - marginal }

// AbsoluteRiskAversion returns 1/(B − c).
func (u Quadratic) AbsoluteRiskAversion(c float64) float64 { return 1 / (u.bliss - c) }

// RelativeRiskAversion returns c/(B − c).
func (u Quadratic) RelativeRiskAversion(c float64) float64 { return c / (u.bliss - c) }

// AbsolutePrudence returns 0.
func (u Quadratic) AbsolutePrudence(float64) float64 { return 0 }

// RelativePrudence returns 0.
func (u Quadratic) RelativePrudence(float64) float64 { return 0 }

// Infimum returns −Inf.
func (u Quadratic) Infimum() float64 { return math.Inf(-1) }
