package policy

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// utilityDraw is a utility with a consumption level inside its domain, both of
// ordinary size.
type utilityDraw struct {
	u Utility
	c float64
}

// anyUtility draws one of the four families. Consumption keeps a tenth of its
// scale away from subsistence and bliss, where differences lose their digits.
func anyUtility(t *rapid.T) utilityDraw {
	gamma := rapid.OneOf(rapid.Float64Range(0.2, 12), rapid.SampledFrom([]float64{1, 2, 5})).Draw(t, "gamma")
	x := math.Exp(rapid.Float64Range(math.Log(0.1), math.Log(20)).Draw(t, "log x"))
	var u Utility
	var err error
	c := x
	switch rapid.SampledFrom([]string{"crra", "cara", "quadratic", "stone_geary"}).Draw(t, "family") {
	case "crra":
		u, err = NewCRRA(gamma)
	case "cara":
		u, err = NewCARA(gamma / 4)
		c = x - 5
	case "quadratic":
		u, err = NewQuadratic(30)
		c = 30 - x
	case "stone_geary":
		floor := rapid.Float64Range(0, 3).Draw(t, "floor")
		u, err = NewStoneGeary(gamma, floor)
		c = floor + x
	}
	if err != nil {
		t.Fatal(err)
	}
	return utilityDraw{u, c}
}

// difference is the fourth-order central difference of f at x.
func difference(f func(float64) float64, x, h float64) float64 {
	return (8*(f(x+h)-f(x-h)) - (f(x+2*h) - f(x-2*h))) / (12 * h)
}

// Marginal is the derivative of Value, and the measures of risk aversion and
// prudence are the ratios of derivatives that define them (derived: central
// differences; tolerance h⁴ times the growth of the derivatives, and rounding
// over h).
func TestUtilityDerivatives(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := anyUtility(t)
		u, c := d.u, d.c
		h := 2e-3 * math.Min(1, 1/math.Max(math.Abs(u.AbsoluteRiskAversion(c)), u.AbsolutePrudence(c)))
		near := func(what string, got, want, scale float64) {
			if !(math.Abs(got-want) <= 1e-6*scale) {
				t.Errorf("%s %s at %g: %.12g, by differences %.12g", u.Family(), what, c, got, want)
			}
		}
		marginal := u.Marginal(c)
		near("marginal utility", marginal, difference(u.Value, c, h), marginal)
		second := difference(u.Marginal, c, h)
		near("absolute risk aversion", u.AbsoluteRiskAversion(c), -second/marginal, math.Abs(u.AbsoluteRiskAversion(c)))
		near("relative risk aversion", u.RelativeRiskAversion(c), -c*second/marginal, math.Abs(c*second/marginal))
		third := difference(func(x float64) float64 { return u.AbsoluteRiskAversion(x) * u.Marginal(x) }, c, h)
		near("absolute prudence", u.AbsolutePrudence(c), -third/-second, 1/h*2e-3)
		near("relative prudence", u.RelativePrudence(c), -c*third/-second, math.Abs(c)/h*2e-3)
	})
}

func TestUtilityInverse(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := anyUtility(t)
		// rounding of u′ by one unit moves c by 1/(absolute risk aversion) units
		scale := math.Abs(d.c) + 1/d.u.AbsoluteRiskAversion(d.c)*(1+math.Abs(d.u.RelativeRiskAversion(d.c)))
		if got := d.u.Inverse(d.u.Marginal(d.c)); math.Abs(got-d.c) > 1e-14*scale {
			t.Errorf("%s: inverse of marginal utility at %.15g is %.15g", d.u.Family(), d.c, got)
		}
	})
}

// The measures by hand from their closed forms (derived: differentiate u).
func TestUtilityMeasures(t *testing.T) {
	for _, tt := range []struct {
		name                                string
		u                                   Utility
		c                                   float64
		absolute, relative, prudence, ratio float64
		infimum                             float64
	}{
		{"crra", family(t)(NewCRRA(2.5)), 4, 0.625, 2.5, 0.875, 3.5, 0},
		{"crra, log", family(t)(NewCRRA(1)), 4, 0.25, 1, 0.5, 2, 0},
		{"cara", family(t)(NewCARA(0.5)), 4, 0.5, 2, 0.5, 2, math.Inf(-1)},
		{"cara, negative consumption", family(t)(NewCARA(0.5)), -4, 0.5, -2, 0.5, -2, math.Inf(-1)},
		{"quadratic", family(t)(NewQuadratic(9)), 4, 0.2, 0.8, 0, 0, math.Inf(-1)},
		{"stone_geary", family(t)(NewStoneGeary(2, 3)), 4, 2, 8, 3, 12, 3},
		{"stone_geary without subsistence", family(t)(NewStoneGeary(2, 0)), 4, 0.5, 2, 0.75, 3, 0},
	} {
		t.Run(tt.name, func(t *testing.T) {
			for _, x := range []struct {
				what      string
				got, want float64
			}{
				{"absolute risk aversion", tt.u.AbsoluteRiskAversion(tt.c), tt.absolute},
				{"relative risk aversion", tt.u.RelativeRiskAversion(tt.c), tt.relative},
				{"absolute prudence", tt.u.AbsolutePrudence(tt.c), tt.prudence},
				{"relative prudence", tt.u.RelativePrudence(tt.c), tt.ratio},
				{"infimum", tt.u.Infimum(), tt.infimum},
			} {
				if x.got != x.want {
					t.Errorf("%s = %g, want %g", x.what, x.got, x.want)
				}
			}
		})
	}
}

// Values by hand: 1/(1−γ) scaling, the logarithm at γ = 1, the edge of the domain.
func TestUtilityValues(t *testing.T) {
	inf := math.Inf(1)
	for _, tt := range []struct {
		name            string
		u               Utility
		c               float64
		value, marginal float64
	}{
		{"crra 2", family(t)(NewCRRA(2)), 4, -0.25, 0.0625},
		{"crra 0.5", family(t)(NewCRRA(0.5)), 4, 4, 0.5},
		{"crra 1", family(t)(NewCRRA(1)), math.E, 1, 1 / math.E},
		{"crra 2 at 0", family(t)(NewCRRA(2)), 0, -inf, inf},
		{"crra 1 at 0", family(t)(NewCRRA(1)), 0, -inf, inf},
		{"crra 0.5 at 0", family(t)(NewCRRA(0.5)), 0, 0, inf},
		{"crra 2 below 0", family(t)(NewCRRA(2)), -1, -inf, inf},
		{"crra 0.5 below 0", family(t)(NewCRRA(0.5)), -1, -inf, inf},
		{"cara", family(t)(NewCARA(2)), 0, -0.5, 1},
		{"quadratic", family(t)(NewQuadratic(9)), 4, -12.5, 5},
		{"quadratic beyond bliss", family(t)(NewQuadratic(9)), 10, -0.5, -1},
		{"stone_geary", family(t)(NewStoneGeary(2, 3)), 7, -0.25, 0.0625},
		{"stone_geary at subsistence", family(t)(NewStoneGeary(2, 3)), 3, -inf, inf},
	} {
		t.Run(tt.name, func(t *testing.T) {
			if got := tt.u.Value(tt.c); got != tt.value {
				t.Errorf("u(%g) = %g, want %g", tt.c, got, tt.value)
			}
			if got := tt.u.Marginal(tt.c); got != tt.marginal {
				t.Errorf("u′(%g) = %g, want %g", tt.c, got, tt.marginal)
			}
			if tt.c <= tt.u.Infimum() && !math.IsNaN(tt.u.AbsoluteRiskAversion(tt.c)+tt.u.RelativePrudence(tt.c)) {
				t.Errorf("measures below the domain are not NaN")
			}
		})
	}
}

// Stone–Geary utility is CRRA utility of consumption above subsistence (derived:
// its definition).
func TestStoneGearyIsShiftedCRRA(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		gamma := rapid.Float64Range(0.2, 12).Draw(t, "gamma")
		x := rapid.Float64Range(0.1, 20).Draw(t, "x")
		crra, _ := NewCRRA(gamma)
		shifted, _ := NewStoneGeary(gamma, 2)
		if got, want := shifted.Value(2+x), crra.Value(x); math.Abs(got-want) > 1e-13*math.Abs(want)*(1+gamma/x) {
			t.Errorf("u(2 + %g) = %.15g, want %.15g", x, got, want)
		}
	})
}

func TestUtilityParameters(t *testing.T) {
	bad := map[string]func(x float64) error{
		"crra":               func(x float64) error { _, err := NewCRRA(x); return err },
		"cara":               func(x float64) error { _, err := NewCARA(x); return err },
		"stone_geary, gamma": func(x float64) error { _, err := NewStoneGeary(x, 1); return err },
	}
	for name, try := range bad {
		for _, x := range []float64{0, -1, math.NaN(), math.Inf(1)} {
			if try(x) == nil {
				t.Errorf("%s accepts %g", name, x)
			}
		}
		if err := try(1e-3); err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
	for _, x := range []float64{-1e-300, math.NaN(), math.Inf(1)} {
		if _, err := NewStoneGeary(2, x); err == nil {
			t.Errorf("stone_geary accepts subsistence %g", x)
		}
	}
	for _, x := range []float64{math.Inf(-1), math.NaN(), math.Inf(1)} {
		if _, err := NewQuadratic(x); err == nil {
			t.Errorf("quadratic accepts bliss point %g", x)
		}
	}
	if _, err := NewStoneGeary(2, 0); err != nil {
		t.Error(err)
	}
	if _, err := NewQuadratic(-3); err != nil {
		t.Error(err)
	}
}
