package pension_test

import (
	"fmt"
	"math"
	"testing"

	"cistern/policy/pension"
)

// Published: United States, Internal Revenue Service, Revenue Procedure 2022-38, tax
// rate schedule of 2023 for unmarried individuals (from memory): 10 % to 11,000, 12 %
// to 44,725, 22 % to 95,375, 24 % to 182,100, 32 % to 231,250, 35 % to 578,125, 37 %
// beyond; the amounts of tax at the edges are printed there.
func TestBracketsPublished(t *testing.T) {
	p, err := pension.NewPiecewise([]float64{0, 11000, 44725, 95375, 182100, 231250, 578125}, []float64{.10, .12, .22, .24, .32, .35, .37})
	if err != nil {
		t.Fatal(err)
	}
	for _, tt := range []struct{ x, tax float64 }{{0, 0}, {-5, 0}, {11000, 1100}, {44725, 5147}, {95375, 16290}, {182100, 37104}, {231250, 52832}, {578125, 174238.25}, {600000, 174238.25 + 0.37*21875}} {
		near(t, fmt.Sprintf("tax on %v", tt.x), p.Tax(tt.x), tt.tax, 1e-9)
	}
	for _, tt := range []struct{ x, below, above float64 }{{-1, 0, 0}, {0, 0, .10}, {5000, .10, .10}, {44725, .12, .22}, {1e6, .37, .37}} {
		near(t, fmt.Sprintf("rate below %v", tt.x), p.Marginal(tt.x, pension.Below), tt.below, 0)
		near(t, fmt.Sprintf("rate above %v", tt.x), p.Marginal(tt.x, pension.Above), tt.above, 0)
	}
	if got := fmt.Sprint(p.Kinks()); got != "[0 11000 44725 95375 182100 231250 578125]" {
		t.Errorf("kinks %s", got)
	}
	free, err := pension.NewPiecewise([]float64{0, 10, 20}, []float64{0, 0, 0.2})
	if err != nil {
		t.Fatal(err)
	}
	if got := fmt.Sprint(free.Kinks()); got != "[20]" {
		t.Errorf("kinks %s, want only where the rate changes", got)
	}
	_, err = pension.NewPiecewise([]float64{1, 1, inf()}, []float64{0.1, math.NaN()})
	wantFaults(t, err, "From[0]: is 1, want 0", "From[1]: above 1", "From[2]: finite and above 1", "Rate: 2 rates", "Rate[1]: finite")
	_, err = pension.NewPiecewise(nil, nil)
	wantFaults(t, err, "From[0]: at least one bracket")
}

// Derived: T at average earnings is (1−λ)·W; the elasticity of what is kept with
// respect to income is 1−τ everywhere; proportional at τ = 0; T′ is the derivative
// (fourth-order central differences, h = 1e-3 of x: error 1e-12 and rounding).
func TestPower(t *testing.T) {
	const w = 30000.0
	for _, tt := range []struct{ λ, τ float64 }{{0.9, 0.181}, {0.8, 0}, {1.1, -0.2}, {0.85, 0.5}} {
		p, err := pension.NewPower(tt.λ, tt.τ, w)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "tax on average earnings", p.Tax(w), (1-tt.λ)*w, 1e-10*w)
		for _, x := range []float64{100, 5000, 30000, 250000} {
			kept := x - p.Tax(x)
			near(t, "kept, against e to the power of logs", kept/w, tt.λ*math.Exp((1-tt.τ)*math.Log(x/w)), 1e-12*kept)
			h := 1e-3 * x
			want := (8*(p.Tax(x+h)-p.Tax(x-h)) - (p.Tax(x+2*h) - p.Tax(x-2*h))) / (12 * h)
			near(t, fmt.Sprintf("marginal rate at %v, τ = %v", x, tt.τ), p.Marginal(x, pension.Above), want, 1e-10)
			near(t, "marginal rate from below", p.Marginal(x, pension.Below), want, 1e-10)
			near(t, "elasticity of what is kept", (1-p.Marginal(x, pension.Above))*x/kept, 1-tt.τ, 1e-13)
			if tt.τ == 0 {
				near(t, "proportional", p.Tax(x), 0.2*x, 1e-10*x)
			}
		}
		near(t, "nothing", p.Tax(0), 0, 0)
		near(t, "less than nothing", p.Tax(-100), 0, 0)
		near(t, "rate below 0", p.Marginal(0, pension.Below), 0, 0)
	}
	p, _ := pension.NewPower(0.9, 0.2, w)
	if got := p.Marginal(0, pension.Above); !math.IsInf(got, -1) {
		t.Errorf("the first crown is taxed at %v, want -Inf", got)
	}
	_, err := pension.NewPower(0, 1, -1)
	wantFaults(t, err, "Level: positive", "Progressivity: above -1 and below 1", "Average: positive")
}
