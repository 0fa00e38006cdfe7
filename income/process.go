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
	if p.Form != Log && p.Form != Level {
		f.add("Form", int(p.Form), "log or level")
	}
	if p.ProfileIs != Mean && p.ProfileIs != Median {
		f.add("ProfileIs", int(p.ProfileIs), "mean or median")
	}
	f.addAll(p.validateChain())
	if q := p.JobLoss.Probability; !(q >= 0 && q <= 1) {
		f.add("JobLoss.Probability", q, "from 0 to 1")
	}
	if b := p.JobLoss.BenefitRate; !(b >= 0) || math.IsInf(b, 1) {
		f.add("JobLoss.BenefitRate", b, "at least 0 and finite")
	}
	f.addAll(p.Transitory.Validate())
	return errors.Join(f...)
}

func (p Process) validateChain() error {
	if p.Chain == nil {
		return &FieldError{"Chain", nil, "a chain; without persistent risk the degenerate one"}
	}
	if err := p.Chain.Validate(); err != nil {
		return err
	}
	if n := p.Chain.Len(); len(p.Initial) != n {
		return &FieldError{"Initial", fmt.Sprintf("%d probabilities", len(p.Initial)), fmt.Sprintf("%d, one for each node", n)}
	}
	if sum := total(p.Initial); !(math.Abs(sum-1) <= rowTolerance) {
		return &FieldError{"Initial", sum, "probabilities that sum to 1"}
	}
	return nil
}
