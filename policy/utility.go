package policy

import "math"

// Utility is a utility family u(c), c in money a year. To add a family implement
// these methods; the solver then works with it, and a loop of its own in
// marginal.go makes it as fast as the built-in ones.
type Utility interface {
	Family() string                         // the name used in scenario files
	Value(c float64) float64                // u(c)
	Marginal(c float64) float64             // u′(c)
	Inverse(marginal float64) float64       // the c with u′(c) = marginal
	AbsoluteRiskAversion(c float64) float64 // −u″/u′ (Pratt 1964, Econometrica 32), per unit of money
	RelativeRiskAversion(c float64) float64 // −c·u″/u′
	AbsolutePrudence(c float64) float64     // −u‴/u″ (Kimball 1990, Econometrica 58), per unit of money
	RelativePrudence(c float64) float64     // −c·u‴/u″
	Infimum() float64                       // consumption lies above this; −Inf where it may be anything
}

// Linear-in-tolerance (HARA) families share one shape: risk tolerance −u′/u″ is
// linear in c. CRRA, StoneGeary and Quadratic are the power members, CARA the
// limit (Merton 1971, Journal of Economic Theory 3).

// positive reports whether x is above 0 and finite.
func positive(x float64) bool { return x > 0 && !math.IsInf(x, 1) }
