package income

import (
	"errors"
	"math"
)

// AR1 is the persistent part of income, z′ = ρ·z + η, η ~ N(0, σ²), once a year.
type AR1 struct {
	Autocorrelation float64 // ρ, strictly between −1 and 1
	InnovationSD    float64 // σ ≥ 0; log points (form log) or money (form level)
}

// Validate reports every fault at once, each as a *FieldError.
func (p AR1) Validate() error {
	var f faults
	if !(p.Autocorrelation > -1 && p.Autocorrelation < 1) {
		f.add("Autocorrelation", p.Autocorrelation, "strictly between -1 and 1")
	}
	if !(p.InnovationSD >= 0) || math.IsInf(p.InnovationSD, 1) {
		f.add("InnovationSD", p.InnovationSD, "at least 0 and finite")
	}
	if len(f) == 0 && math.IsInf(p.StationarySD(), 1) {
		f.add("InnovationSD", p.InnovationSD, "small enough for a finite stationary standard deviation")
	}
	return errors.Join(f...)
}

// StationarySD returns σ/√(1−ρ²), the standard deviation in the long run.
func (p AR1) StationarySD() float64 {
	return p.InnovationSD / math.Sqrt((1-p.Autocorrelation)*(1+p.Autocorrelation))
}

// Moments returns the stationary moments of the process itself, those of a normal
// law.
func (p AR1) Moments() Moments {
	return Moments{SD: p.StationarySD(), Autocorrelation: p.Autocorrelation, Kurtosis: 3}
}
