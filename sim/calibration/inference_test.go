package calibration

import (
	"errors"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// A linear moment problem μ(θ) = Xθ is generalised least squares: with W = Ω⁻¹ the
// estimate is (X′Ω⁻¹X)⁻¹X′Ω⁻¹d, its covariance (X′Ω⁻¹X)⁻¹ and J the weighted sum
// of squared residuals (Aitken 1935; any textbook, common practice). Here the
// formulas are evaluated by explicit inverses, another way than the package's.
func TestInferGLS(t *testing.T) {
	x := mat.NewDense(5, 2, []float64{1, 1, 1, 2, 1, 3, 1, 5, 1, 8})
	d := []float64{1.1, 1.9, 3.2, 5.1, 7.7}
	omega := mat.NewSymDense(5, nil)
	for i := range 5 {
		for j := i; j < 5; j++ {
			omega.SetSym(i, j, 0.04*math.Pow(0.5, float64(j-i))*math.Sqrt(float64((i+1)*(j+1))))
		}
	}
	inverse := inverseOf(t, omega)
	var xw, xwx, xwd mat.Dense
	xw.Mul(x.T(), inverse)
	xwx.Mul(&xw, x)
	xwd.Mul(&xw, mat.NewVecDense(5, d))
	var cov, theta mat.Dense
	if err := cov.Inverse(&xwx); err != nil {
		t.Fatal(err)
	}
	theta.Mul(&cov, &xwd)
	gap := make([]float64, 5)
	for i := range gap {
		gap[i] = d[i] - x.At(i, 0)*theta.At(0, 0) - x.At(i, 1)*theta.At(1, 0)
	}
	const panels = 4.0
	got, err := Infer(Moments{Gap: gap, Jacobian: x, Weight: inverse, Covariance: omega, Panels: panels}, []float64{1, 1})
	if err != nil {
		t.Fatal(err)
	}
	for i := range 2 {
		for j := range 2 {
			near(t, "covariance", got.Covariance.At(i, j), (1+1/panels)*cov.At(i, j), 1e-12)
		}
		near(t, "standard error", got.Errors[i], math.Sqrt((1+1/panels)*cov.At(i, i)), 1e-12)
		// dθ̂/dd by moving each moment and estimating again
		for j := range 5 {
			moved := append([]float64{}, d...)
			moved[j]++
			var b, at mat.Dense
			b.Mul(&xw, mat.NewVecDense(5, moved))
			at.Mul(&cov, &b)
			near(t, "sensitivity", got.Sensitivity.At(i, j), at.At(i, 0)-theta.At(i, 0), 1e-10)
		}
	}
	near(t, "objective", got.Objective, quadratic(inverse, gap), 1e-12)
	near(t, "J", got.J, quadratic(inverse, gap)/(1+1/panels), 1e-9)
	if got.Degrees != 3 {
		t.Errorf("%d degrees of freedom, want 3", got.Degrees)
	}
	// For 3 degrees of freedom P(χ² > x) = erfc(√(x/2)) + √(2x/π)·e^(−x/2) (derived).
	want := math.Erfc(math.Sqrt(got.J/2)) + math.Sqrt(2*got.J/math.Pi)*math.Exp(-got.J/2)
	near(t, "p value", got.PValue, want, 1e-12)
}

// Whatever the weights, ordinary least squares with independent errors of equal
// variance has J = Σ residual²/σ², since W ∝ I is then optimal; and with other
// weights J does not exceed the sum at those weights' own residuals (Newey 1985:
// the generalised inverse projects).
func TestInferOtherWeights(t *testing.T) {
	x := mat.NewDense(4, 1, []float64{1, 1, 1, 1})
	d := []float64{2, 3, 5, 10}
	omega := scaled(4, []float64{4, 4, 4, 4})
	got, err := Infer(Moments{Gap: []float64{-3, -2, 0, 5}, Jacobian: x, Weight: scaled(4, []float64{1, 1, 1, 1}), Covariance: omega, Panels: math.Inf(1)}, []float64{1})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "J", got.J, (9+4+0+25)/4.0, 1e-12)
	near(t, "standard error", got.Errors[0], 1, 1e-12) // 2/√4
	near(t, "gap's standard error", got.GapErrors[0], math.Sqrt(4*(1-0.25)), 1e-12)
	near(t, "t", got.T[3], 5/math.Sqrt(3), 1e-12)

	weights := []float64{4, 2, 1, 1} // mean (4·2 + 2·3 + 5 + 10)/8 = 3.625, variance 4·Σw²/(Σw)² = 4·22/64
	mean := 0.0
	for i, w := range weights {
		mean += w * d[i] / 8
	}
	var gap []float64
	for _, v := range d {
		gap = append(gap, v-mean)
	}
	got, err = Infer(Moments{Gap: gap, Jacobian: x, Weight: scaled(4, weights), Covariance: omega, Panels: math.Inf(1)}, []float64{1})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "standard error", got.Errors[0], math.Sqrt(4*22.0/64), 1e-12)
	near(t, "J", got.J, (9+4+0+25)/4.0, 1e-9) // M g has the same span of contrasts: J is that of the best residuals
}

// As many moments as parameters: no test, the sensitivity is the inverse Jacobian.
func TestInferExactlyIdentified(t *testing.T) {
	g := mat.NewDense(2, 2, []float64{2, 1, 0, 4})
	got, err := Infer(Moments{Gap: []float64{0, 0}, Jacobian: g, Weight: scaled(2, []float64{3, 5}), Covariance: scaled(2, []float64{1, 16}), Panels: 1}, []float64{1, 1})
	if err != nil {
		t.Fatal(err)
	}
	for i, row := range [][]float64{{0.5, -0.125}, {0, 0.25}} {
		for j, want := range row {
			near(t, "sensitivity", got.Sensitivity.At(i, j), want, 1e-14)
		}
	}
	near(t, "standard error", got.Errors[1], math.Sqrt(2*16*0.0625), 1e-14)
	if !math.IsNaN(got.J) || !math.IsNaN(got.PValue) || !math.IsNaN(got.T[0]) || got.Degrees != 0 {
		t.Errorf("J %v, p %v, t %v, %d degrees of freedom: want none", got.J, got.PValue, got.T[0], got.Degrees)
	}
	near(t, "product of singular values", got.Singular[0]*got.Singular[1], 2, 1e-12) // |det| of {{2, 1}, {0, 1}}
}

// Parameters that move the moments alike cannot be told apart.
func TestInferUnidentified(t *testing.T) {
	g := mat.NewDense(3, 2, []float64{1, 2, 2, 4, 3, 6})
	_, err := Infer(Moments{Gap: make([]float64, 3), Jacobian: g, Weight: scaled(3, []float64{1, 1, 1}), Covariance: scaled(3, []float64{1, 1, 1}), Panels: 1}, []float64{1, 1})
	var lost *IdentificationError
	if !errors.As(err, &lost) {
		t.Fatalf("got %v, want an *IdentificationError", err)
	}
	if r := lost.Direction[0] / lost.Direction[1]; math.Abs(r+2) > 1e-9 {
		t.Errorf("direction %v, want along (2, -1)", lost.Direction)
	}
}

func TestInferFaults(t *testing.T) {
	ok := Moments{Gap: []float64{1, 1}, Jacobian: mat.NewDense(2, 1, []float64{1, 2}), Weight: scaled(2, []float64{1, 1}), Covariance: scaled(2, []float64{1, 1}), Panels: 1}
	for name, change := range map[string]func(*Moments){
		"too few moments":       func(m *Moments) { m.Jacobian = mat.NewDense(2, 3, make([]float64, 6)) },
		"gaps":                  func(m *Moments) { m.Gap = m.Gap[:1] },
		"weights":               func(m *Moments) { m.Weight = scaled(3, []float64{1, 1, 1}) },
		"indefinite weights":    func(m *Moments) { m.Weight = scaled(2, []float64{1, -1}) },
		"negative variance":     func(m *Moments) { m.Covariance = scaled(2, []float64{1, -1}) },
		"no panels":             func(m *Moments) { m.Panels = 0 },
		"moments that repeat":   func(m *Moments) { m.Covariance = mat.NewSymDense(2, []float64{1, 2, 2, 4}) },
		"Jacobian not a number": func(m *Moments) { m.Jacobian = mat.NewDense(2, 1, []float64{math.NaN(), 1}) },
	} {
		m := ok
		change(&m)
		_, k := m.Jacobian.Dims()
		scale := make([]float64, k)
		for i := range scale {
			scale[i] = 1
		}
		if _, err := Infer(m, scale); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

func scaled(n int, diagonal []float64) *mat.SymDense {
	s := mat.NewSymDense(n, nil)
	for i, v := range diagonal {
		s.SetSym(i, i, v)
	}
	return s
}

func inverseOf(t *testing.T, a *mat.SymDense) *mat.SymDense {
	t.Helper()
	var c mat.Cholesky
	if !c.Factorize(a) {
		t.Fatal("not positive definite")
	}
	out := mat.NewSymDense(a.SymmetricDim(), nil)
	if err := c.InverseTo(out); err != nil {
		t.Fatal(err)
	}
	return out
}

func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Max(1, math.Abs(want))) {
		t.Errorf("%s is %v, want %v", what, got, want)
	}
}
