package income

import (
	"errors"
	"fmt"
	"math"
)

// Form says how the parts of earnings combine.
type Form int

const (
	Log   Form = iota // Y = P·exp(z−κ)·exp(ε−σ²/2)
	Level             // Y = P + z + ε
)

// String returns the name used in scenario files.
func (f Form) String() string {
	if f == Level {
		return "level"
	}
	return "log"
}

// Meaning says what the profile of form log states.
type Meaning int

const (
	Mean   Meaning = iota // mean earnings at each age
	Median                // earnings at z = ε = 0
)

// String returns the name used in scenario files.
func (m Meaning) String() string {
	if m == Median {
		return "median"
	}
	return "mean"
}

// JobLoss is the yearly risk to lose the year's earnings.
type JobLoss struct {
	Probability float64 // a year, from 0 to 1
	BenefitRate float64 // share of what the profile and the persistent part would pay, ≥ 0
}

// Process is the earnings of one group while it works.
type Process struct {
	FirstAge   int
	Profile    []float64 // P_t from FirstAge to the last working age, money a year
	Form       Form
	ProfileIs  Meaning
	Chain      *Chain
	Initial    []float64 // distribution over the chain's nodes at FirstAge
	Transitory Transitory
	JobLoss    JobLoss
}

// Validate reports every fault at once, each as a *FieldError.
func (p Process) Validate() error {
	var f faults
	if len(p.Profile) == 0 {
		f.add("Profile", "empty", "earnings for at least one working age")
	}
	for t, y := range p.Profile {
		switch {
		case math.IsNaN(y) || math.IsInf(y, 0):
			f.add(fmt.Sprintf("Profile[%d]", t), y, "a finite number")
		case p.Form == Log && y <= 0:
			f.add(fmt.Sprintf("Profile[%d]", t), y, "positive in form log")
		}
	}
	if p.Chain == nil || p.Chain.Len() == 0 {
		f.add("Chain", nil, "a chain")
	} else if len(p.Initial) != p.Chain.Len() {
		f.add("Initial", len(p.Initial), fmt.Sprintf("%d probabilities, one for each node", p.Chain.Len()))
	} else if sum := total(p.Initial); !(math.Abs(sum-1) < 1e-9) {
		f.add("Initial", sum, "probabilities that sum to 1")
	}
	if q := p.JobLoss.Probability; !(q >= 0 && q <= 1) {
		f.add("JobLoss.Probability", q, "from 0 to 1")
	}
	if b := p.JobLoss.BenefitRate; !(b >= 0) || math.IsInf(b, 1) {
		f.add("JobLoss.BenefitRate", b, "at least 0 and finite")
	}
	return errors.Join(errors.Join(f...), p.Transitory.validate())
}

func total(p []float64) float64 {
	sum := 0.0
	for _, q := range p {
		if !(q >= 0) {
			return math.NaN()
		}
		sum += q
	}
	return sum
}
