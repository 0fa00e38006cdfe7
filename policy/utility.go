package policy

import "math"

// Utility is a household's utility u of consumption c in one year, in money of
// the scenario's currency. It is increasing and concave and must be safe for
// concurrent use. [NewCRRA], [NewCARA], [NewQuadratic] and [NewStoneGeary] give
// the built-in families; the solver takes any other implementation too.
//
// At or below Infimum, Marginal is +Inf, Value is its limit or −Inf, and the
// measures of risk aversion and prudence are NaN.
type Utility interface {
	// Family returns the name used in scenario files.
	Family() string
	// Value returns u(c).
	Value(c float64) float64
	// Marginal returns u′(c).
	Marginal(c float64) float64
	// Inverse returns the consumption c at which u′(c) = u, for u in the range
	// of u′; +Inf or NaN outside it.
	Inverse(u float64) float64

	// AbsoluteRiskAversion returns −u″/u′ at c, per unit of money, and
	// RelativeRiskAversion c times it (Pratt 1964, Econometrica 32; Arrow 1965).
	AbsoluteRiskAversion(c float64) float64
	RelativeRiskAversion(c float64) float64
	// AbsolutePrudence returns −u‴/u″ at c, per unit of money, and
	// RelativePrudence c times it (Kimball 1990, Econometrica 58, 53–73).
	AbsolutePrudence(c float64) float64
	RelativePrudence(c float64) float64

	// Infimum returns the level that consumption must lie above: −Inf where any
	// consumption is allowed.
	Infimum() float64
}

// positive reports whether x is a positive, finite number.
func positive(x float64) bool { return x > 0 && !math.IsInf(x, 1) }

// finite reports whether x is neither infinite nor NaN.
func finite(x float64) bool { return !math.IsInf(x, 0) && !math.IsNaN(x) }

// outOfRange is the error of a constructor, a *FieldError.
func outOfRange(parameter string, value float64, want string) error {
	return &FieldError{parameter, value, want}
}
