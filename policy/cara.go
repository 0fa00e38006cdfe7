package policy

import "math"

// CARA is exponential utility with constant absolute risk aversion,
//
//	u(c) = −exp(−αc)/α,   any c.
type CARA struct{ alpha float64 }

// NewCARA returns exponential utility with absolute risk aversion α > 0 per unit
// of money.
func NewCARA(alpha float64) (CARA, error) {
	if !positive(alpha) {
		return CARA{}, &FieldError{"AbsoluteRiskAversion", alpha, "positive and finite"}
	}
	return CARA{alpha}, nil
}

// Family returns "cara".
func (u CARA) Family() string { return "cara" }

// Value returns u(c).
func (u CARA) Value(c float64) float64 { return -math.Exp(-u.alpha*c) / u.alpha }

// Marginal returns exp(−αc).
func (u CARA) Marginal(c float64) float64 { return math.Exp(-u.alpha * c) }

// Inverse returns −ln(marginal)/α.
func (u CARA) Inverse(marginal float64) float64 { return -math.Log(marginal) / u.alpha }

// AbsoluteRiskAversion returns α.
func (u CARA) AbsoluteRiskAversion(float64) float64 { return u.alpha }

// RelativeRiskAversion returns αc.
func (u CARA) RelativeRiskAversion(c float64) float64 { return u.alpha * c }

// AbsolutePrudence returns α.
func (u CARA) AbsolutePrudence(float64) float64 { return u.alpha }

// RelativePrudence returns αc.
func (u CARA) RelativePrudence(c float64) float64 { return u.alpha * c }

// Infimum returns −Inf: consumption may be negative.
func (u CARA) Infimum() float64 { return math.Inf(-1) }
