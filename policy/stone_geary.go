package policy

import "math"

// StoneGeary is power utility of consumption above a subsistence level c̲,
//
//	u(c) = (c − c̲)^(1−γ)/(1−γ),   log(c − c̲) at γ = 1,   c > c̲
//
// (Stone 1954, Economic Journal 64; Geary 1950, Review of Economic Studies 18).
// Relative risk aversion γ·c/(c − c̲) falls with consumption.
type StoneGeary struct{ gamma, subsistence float64 }

// NewStoneGeary returns the family with curvature γ > 0 and subsistence ≥ 0, money
// a year.
func NewStoneGeary(gamma, subsistence float64) (StoneGeary, error) {
	if !positive(gamma) {
		return StoneGeary{}, &FieldError{"RelativeRiskAversion", gamma, "positive and finite"}
	}
	if !(subsistence >= 0) || math.IsInf(subsistence, 1) {
		return StoneGeary{}, &FieldError{"Subsistence", subsistence, "at least 0 and finite"}
	}
	return StoneGeary{gamma, subsistence}, nil
}

// Family returns "stone_geary".
func (u StoneGeary) Family() string { return "stone_geary" }

// Value returns u(c).
func (u StoneGeary) Value(c float64) float64 { return powerUtility(c-u.subsistence, u.gamma) }

// Marginal returns (c − c̲)^−γ.
func (u StoneGeary) Marginal(c float64) float64 { return math.Pow(c-u.subsistence, -u.gamma) }

// Inverse returns c̲ + marginal^(−1/γ).
func (u StoneGeary) Inverse(marginal float64) float64 {
	return u.subsistence + math.Pow(marginal, -1/u.gamma)
}

// AbsoluteRiskAversion returns γ/(c − c̲).
func (u StoneGeary) AbsoluteRiskAversion(c float64) float64 { return u.gamma / (c - u.subsistence) }

// RelativeRiskAversion returns γ·c/(c − c̲).
func (u StoneGeary) RelativeRiskAversion(c float64) float64 {
	return c * u.AbsoluteRiskAversion(c)
}

// AbsolutePrudence returns (γ+1)/(c − c̲).
func (u StoneGeary) AbsolutePrudence(c float64) float64 { return (u.gamma + 1) / (c - u.subsistence) }

// RelativePrudence returns (γ+1)·c/(c − c̲).
func (u StoneGeary) RelativePrudence(c float64) float64 { return c * u.AbsolutePrudence(c) }

// Infimum returns the subsistence level.
func (u StoneGeary) Infimum() float64 { return u.subsistence }
