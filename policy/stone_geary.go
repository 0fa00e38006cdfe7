package policy

import "errors"

// StoneGeary is utility with a subsistence level c̲,
//
//	u(c) = (c − c̲)^(1−γ)/(1−γ),   u(c) = log(c − c̲) at γ = 1,   c > c̲
//
// (Stone 1954, Economic Journal 64, 511–527; Geary 1950, Review of Economic
// Studies 18). With consumption in levels, relative risk aversion γ·c/(c − c̲)
// falls towards γ as the household grows richer. Make one with [NewStoneGeary].
type StoneGeary struct{ gamma, subsistence float64 }

// NewStoneGeary returns the utility with curvature γ > 0, the relative risk
// aversion far above subsistence, and subsistence ≥ 0 in money a year.
func NewStoneGeary(relativeRiskAversion, subsistence float64) (StoneGeary, error) {
	var errs []error
	if !positive(relativeRiskAversion) {
		errs = append(errs, outOfRange("RelativeRiskAversion", relativeRiskAversion, "positive and finite"))
	}
	if !(subsistence >= 0) || !finite(subsistence) {
		errs = append(errs, outOfRange("Subsistence", subsistence, "at least 0 and finite"))
	}
	if errs != nil {
		return StoneGeary{}, errors.Join(errs...)
	}
	return StoneGeary{relativeRiskAversion, subsistence}, nil
}

// Family returns "stone_geary".
func (u StoneGeary) Family() string { return "stone_geary" }

func (u StoneGeary) excess() CRRA { return CRRA{u.gamma} }

// Value returns u(c).
func (u StoneGeary) Value(c float64) float64 { return u.excess().Value(c - u.subsistence) }

// Marginal returns (c − c̲)^−γ.
func (u StoneGeary) Marginal(c float64) float64 { return u.excess().Marginal(c - u.subsistence) }

// Inverse returns c̲ + u^(−1/γ).
func (u StoneGeary) Inverse(marginal float64) float64 {
	return u.subsistence + u.excess().Inverse(marginal)
}

// AbsoluteRiskAversion returns γ/(c − c̲).
func (u StoneGeary) AbsoluteRiskAversion(c float64) float64 {
	return u.excess().AbsoluteRiskAversion(c - u.subsistence)
}

// RelativeRiskAversion returns γ·c/(c − c̲).
func (u StoneGeary) RelativeRiskAversion(c float64) float64 { return c * u.AbsoluteRiskAversion(c) }

// AbsolutePrudence returns (γ+1)/(c − c̲).
func (u StoneGeary) AbsolutePrudence(c float64) float64 {
	return u.excess().AbsolutePrudence(c - u.subsistence)
}

// RelativePrudence returns (γ+1)·c/(c − c̲).
func (u StoneGeary) RelativePrudence(c float64) float64 { return c * u.AbsolutePrudence(c) }

// Infimum returns c̲.
func (u StoneGeary) Infimum() float64 { return u.subsistence }
