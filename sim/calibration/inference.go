package calibration

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"
)

// Moments is what inference at an estimate needs. m moments, k parameters,
// 1 ≤ k ≤ m.
type Moments struct {
	Gap        []float64     // [moment] d − μ(θ̂), in the units of the moments
	Jacobian   *mat.Dense    // [moment][parameter] ∂μ/∂θ
	Weight     *mat.SymDense // [moment][moment] W, positive definite
	Covariance *mat.SymDense // [moment][moment] Ω of the data's moments, positive semidefinite
	Panels     float64       // S: simulated panels of the size of the data; +Inf: no simulation error
}

// Inference is what can be said about an estimate.
type Inference struct {
	Objective   float64       // g′Wg
	Covariance  *mat.SymDense // [parameter][parameter] of the estimate
	Errors      []float64     // [parameter] standard errors
	Sensitivity *mat.Dense    // [parameter][moment] Λ: change of the estimate per unit of a moment of the data
	GapErrors   []float64     // [moment] standard error of the gap at the estimate
	T           []float64     // [moment] gap over its standard error; NaN where that is 0
	J           float64       // test of overidentification; NaN where m = k
	Degrees     int           // m − k
	PValue      float64       // chance of a larger J if the model is right; NaN where m = k

	// Singular are the singular values of the Jacobian in standard units, each
	// moment over its standard error and each parameter over its Scale, descending.
	// A value near 0 is a direction in which the moments do not move.
	Singular []float64
}

// An IdentificationError is a Jacobian whose columns are not independent: the
// moments cannot tell the parameters apart.
type IdentificationError struct {
	Ratio     float64   // smallest over largest singular value
	Direction []float64 // [parameter] the change that leaves the moments where they are, length 1 in units of scale
}

func (e *IdentificationError) Error() string {
	return fmt.Sprintf("calibration: the moments do not identify the parameters: along %.3g they do not move (singular values differ by a factor of %.1g)", e.Direction, 1/e.Ratio)
}

// identified is the ratio of singular values below which a Jacobian counts as
// singular: the square root of the machine epsilon, what finite differences leave.
const identified = 1.5e-8

// Infer returns standard errors, test and sensitivity at an estimate. scale is a
// typical size of each parameter, above 0, for the singular values only. A
// Jacobian without full rank is an *IdentificationError; sizes that do not fit,
// or a weighting matrix that is not positive definite, are errors.
func Infer(in Moments, scale []float64) (*Inference, error) {
	if err := in.check(scale); err != nil {
		return nil, err
	}
	m, k := in.Jacobian.Dims()
	out := &Inference{Objective: quadratic(in.Weight, in.Gap), Degrees: m - k, J: math.NaN(), PValue: math.NaN()}
	if err := out.identify(in, scale); err != nil {
		return nil, err
	}
	out.sensitivity(in)
	noise := 1 + 1/in.Panels
	out.Covariance = sandwich(out.Sensitivity, in.Covariance, noise)
	for i := range k {
		out.Errors = append(out.Errors, math.Sqrt(out.Covariance.At(i, i)))
	}
	var residual mat.Dense
	residual.Mul(in.Jacobian, out.Sensitivity)
	residual.Scale(-1, &residual)
	for i := range m {
		residual.Set(i, i, residual.At(i, i)+1)
	}
	gap := sandwich(&residual, in.Covariance, noise)
	for i, g := range in.Gap {
		se := math.Sqrt(max(0, gap.At(i, i)))
		t := math.NaN()
		if se > 1e-12*math.Sqrt(in.Covariance.At(i, i)) {
			t = g / se
		}
		out.GapErrors, out.T = append(out.GapErrors, se), append(out.T, t)
	}
	if m > k {
		return out, out.overidentification(gap, in)
	}
	return out, nil
}

func (in Moments) check(scale []float64) error {
	m, k := in.Jacobian.Dims()
	switch {
	case k < 1 || m < k:
		return fmt.Errorf("calibration: %d moments and %d parameters, want at least one parameter and as many moments", m, k)
	case len(in.Gap) != m || in.Weight.SymmetricDim() != m || in.Covariance.SymmetricDim() != m || len(scale) != k:
		return fmt.Errorf("calibration: %d gaps, weights of %d, covariance of %d and %d scales, want %d moments and %d parameters throughout",
			len(in.Gap), in.Weight.SymmetricDim(), in.Covariance.SymmetricDim(), len(scale), m, k)
	case !(in.Panels > 0):
		return fmt.Errorf("calibration: %v simulated panels a data set, want more than 0", in.Panels)
	}
	for j, s := range scale {
		if !(s > 0) || math.IsInf(s, 1) {
			return fmt.Errorf("calibration: scale of parameter %d is %v, want above 0", j, s)
		}
	}
	for i := range m {
		if !(in.Covariance.At(i, i) >= 0) {
			return fmt.Errorf("calibration: variance of moment %d is %v, want at least 0", i, in.Covariance.At(i, i))
		}
	}
	var factor mat.Cholesky
	if !factor.Factorize(in.Weight) {
		return fmt.Errorf("calibration: the weighting matrix is not positive definite")
	}
	return nil
}

// identify finds the singular values of the Jacobian in standard units.
func (out *Inference) identify(in Moments, scale []float64) error {
	m, k := in.Jacobian.Dims()
	standard := mat.NewDense(m, k, nil)
	for i := range m {
		unit := math.Sqrt(in.Covariance.At(i, i))
		if unit == 0 {
			unit = 1
		}
		for j := range k {
			standard.Set(i, j, in.Jacobian.At(i, j)*scale[j]/unit)
		}
	}
	var svd mat.SVD
	if !svd.Factorize(standard, mat.SVDThin) {
		return fmt.Errorf("calibration: the Jacobian has no singular values; is every moment a number?")
	}
	out.Singular = svd.Values(nil)
	if ratio := out.Singular[k-1] / out.Singular[0]; !(ratio > identified) {
		var v mat.Dense
		svd.VTo(&v)
		return &IdentificationError{Ratio: ratio, Direction: mat.Col(nil, k-1, &v)}
	}
	return nil
}

// sensitivity sets Λ by least squares: with W = LL′, Λ = (L′G)⁺ L′.
func (out *Inference) sensitivity(in Moments) {
	m, k := in.Jacobian.Dims()
	var factor mat.Cholesky
	factor.Factorize(in.Weight)
	var upper mat.TriDense // L′
	factor.UTo(&upper)
	var left mat.Dense
	left.Mul(&upper, in.Jacobian)
	var qr mat.QR
	qr.Factorize(&left)
	out.Sensitivity = mat.NewDense(k, m, nil)
	if err := qr.SolveTo(out.Sensitivity, false, &upper); err != nil {
		panic(fmt.Sprintf("calibration: least squares of full rank failed: %v", err))
	}
}

// overidentification sets J, its degrees of freedom being the rank of the gap's
// covariance matrix.
func (out *Inference) overidentification(gap *mat.SymDense, in Moments) error {
	m := gap.SymmetricDim()
	unit := make([]float64, m) // in standard units, so that the rank means something
	for i := range unit {
		if unit[i] = math.Sqrt(in.Covariance.At(i, i)); unit[i] == 0 {
			unit[i] = 1
		}
	}
	standard := mat.NewSymDense(m, nil)
	for i := range m {
		for j := i; j < m; j++ {
			standard.SetSym(i, j, gap.At(i, j)/(unit[i]*unit[j]))
		}
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(standard, true) {
		return fmt.Errorf("calibration: the covariance matrix of the gaps has no eigenvalues")
	}
	var vectors mat.Dense
	eigen.VectorsTo(&vectors)
	values := eigen.Values(nil) // ascending
	out.J = 0
	for r := m - out.Degrees; r < m; r++ {
		if !(values[r] > 1e-12) { // in standard units the variances of the data are 1
			return fmt.Errorf("calibration: the covariance matrix of the data's moments has rank below %d: some moments repeat others", m)
		}
		along := 0.0
		for i := range m {
			along += vectors.At(i, r) * in.Gap[i] / unit[i]
		}
		out.J += along * along / values[r]
	}
	out.PValue = distuv.ChiSquared{K: float64(out.Degrees)}.Survival(out.J)
	return nil
}

// sandwich returns factor·A·B·A′.
func sandwich(a mat.Matrix, b mat.Symmetric, factor float64) *mat.SymDense {
	var ab, aba mat.Dense
	ab.Mul(a, b)
	aba.Mul(&ab, a.T())
	n, _ := aba.Dims()
	out := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			out.SetSym(i, j, factor*(aba.At(i, j)+aba.At(j, i))/2)
		}
	}
	return out
}

// quadratic returns x′Ax.
func quadratic(a mat.Symmetric, x []float64) float64 {
	v := mat.NewVecDense(len(x), x)
	return mat.Inner(v, a, v)
}
