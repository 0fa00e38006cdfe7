package policy

import "math"

// CARA is utility with constant absolute risk aversion α,
//
//	u(c) = −exp(−αc)/α,
//
// for any real c, negative ones too. Absolute prudence is α as well. Make one
// with [NewCARA].
type CARA struct{ alpha float64 }

// NewCARA returns the utility with absolute risk aversion α > 0 per unit of
// money.
func NewCARA(absoluteRiskAversion float64) (CARA, error) {
	if !positive(absoluteRiskAversion) {
		return CARA{}, outOfRange("AbsoluteRiskAversion", absoluteRiskAversion, "positive and finite")
	}
	return CARA{absoluteRiskAversion}, nil
}

// Family returns "cara".
func (u CARA) Family() string { return "cara" }

// Value returns −exp(−αc)/α.
func (u CARA) Value(c float64) float64 { return -math.Exp(-u.alpha*c) / u.alpha }

// Marginal returns exp(−αc).
func (u CARA) Marginal(c float64) float64 { return math.Exp(-u.alpha * c) }

// Inverse returns −ln(u)/α.
func (u CARA) Inverse(marginal float64) float64 { return -math.Log(marginal) / u.alpha }

// AbsoluteRiskAversion returns α.
func (u CARA) AbsoluteRiskAversion(float64) float64 { return u.alpha }

// RelativeRiskAversion returns αc.
func (u CARA) RelativeRiskAversion(c float64) float64 { return u.alpha * c }

// AbsolutePrudence returns α.
func (u CARA) AbsolutePrudence(float64) float64 { return u.alpha }

// RelativePrudence returns αc.
func (u CARA) RelativePrudence(c float64) float64 { return u.alpha * c }

// Infimum returns −Inf.
func (u CARA) Infimum() float64 { return math.Inf(-1) }
