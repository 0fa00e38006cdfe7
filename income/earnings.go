package income

import (
	"fmt"
	"math"
	"slices"
)

// Earnings is a Process with its tables by age. It is immutable and safe for
// concurrent use. Index t counts years from FirstAge.
type Earnings struct {
	Process
	Distribution [][]float64 // [t][node] π_t, the chain's distribution
	Base         [][]float64 // [t][node] P_t·exp(z−κ_t) or P_t + z, money
	Benefit      [][]float64 // [t][node] income in a year of job loss, money
	Factor       []float64   // [k] form log: exp(ε_k−σ²/2), scaled so that its mean is 1; form level: ε_k
	Weight       []float64   // [k] quadrature weights, sum 1
	Kappa        []float64   // [t] κ_t, log points; 0 in form level and where the profile is a median

	values  [][][]float64 // [t][node][outcome]
	weights []float64     // [outcome]
	final   []float64     // [node] see Final
	changes []Change      // [t] nil where the process holds in every year
	changed [][]float64   // [t][outcome] weights where it does not
}

// Build prepares the tables. An invalid process is reported as *FieldError, all
// faults at once; so are earnings too large to be numbers. Changing the process's
// slices afterwards does not change the tables.
func (p Process) Build() (*Earnings, error) {
	if err := p.Validate(); err != nil {
		return nil, err
	}
	p.Profile, p.Initial = slices.Clone(p.Profile), slices.Clone(p.Initial)
	years := len(p.Profile)
	e := &Earnings{
		Process:      p,
		Distribution: p.Chain.ByAge(p.Initial, years),
		Kappa:        make([]float64, years),
		Base:         make([][]float64, years),
		Benefit:      make([][]float64, years),
		values:       make([][][]float64, years),
	}
	e.placeShock()
	for t := range years {
		if e.meanInLogs() {
			e.Kappa[t] = logMeanExp(e.Distribution[t], e.Chain.Nodes)
		}
		e.fillYear(t)
		if err := e.checkYear(t); err != nil {
			return nil, err
		}
	}
	e.fillFinal()
	return e, nil
}

// checkYear reports earnings that overflow.
func (e *Earnings) checkYear(t int) error {
	for j, values := range e.values[t] {
		for _, y := range values {
			if math.IsNaN(y) || math.IsInf(y, 0) {
				return &FieldError{fmt.Sprintf("earnings at age %d and z = %v", e.FirstAge+t, e.Chain.Nodes[j]), y, "a finite number: a smaller profile or smaller shocks"}
			}
		}
	}
	return nil
}

// meanInLogs reports whether mean-preserving corrections apply.
func (e *Earnings) meanInLogs() bool { return e.Form == Log && e.ProfileIs == Mean }

// placeShock sets the transitory nodes and the outcomes' probabilities.
func (e *Earnings) placeShock() {
	e.Factor, e.Weight = e.Transitory.shock()
	if e.Form == Log {
		mean := 0.0
		for k, x := range e.Factor {
			e.Factor[k] = math.Exp(x)
			mean += e.Weight[k] * e.Factor[k]
		}
		for k := range e.Factor {
			if e.meanInLogs() {
				e.Factor[k] /= mean
			}
		}
	}
	e.weights = e.weigh(e.JobLoss.Probability)
}

// weigh returns the probabilities of the outcomes where jobs are lost with
// probability p.
func (e *Earnings) weigh(p float64) []float64 {
	weights := make([]float64, 0, len(e.Weight)+1)
	for _, q := range e.Weight {
		weights = append(weights, (1-p)*q)
	}
	if p > 0 {
		weights = append(weights, p)
	}
	return weights
}

// fillYear fills the tables of year t.
func (e *Earnings) fillYear(t int) {
	n := e.Chain.Len()
	c := e.change(t)
	e.Base[t], e.Benefit[t], e.values[t] = make([]float64, n), make([]float64, n), make([][]float64, n)
	for j := range e.Chain.Nodes {
		e.Base[t][j] = c.Factor * e.supported(t, j)
		if e.Form == Log {
			e.Benefit[t][j] = c.JobLoss.BenefitRate * e.Base[t][j]
		} else {
			e.Benefit[t][j] = c.JobLoss.BenefitRate * (c.Factor * e.Profile[t])
		}
		e.values[t][j] = e.outcomes(e.Base[t][j], e.Benefit[t][j], c)
	}
}

// supported returns the earnings that the persistent part supports in year t at a
// node.
func (e *Earnings) supported(t, node int) float64 {
	z := e.Chain.Nodes[node] + e.change(t).Shift
	if e.Form == Log {
		return e.Profile[t] * math.Exp(z-e.Kappa[t])
	}
	return e.Profile[t] + z
}

func (e *Earnings) fillFinal() {
	e.final = make([]float64, e.Chain.Len())
	for j := range e.final {
		e.final[j] = e.supported(e.Years()-1, j)
	}
}

// outcomes returns what can be earned at a node, in the order of the weights.
func (e *Earnings) outcomes(base, benefit float64, c Change) []float64 {
	y := make([]float64, 0, len(e.Factor)+1)
	for _, f := range e.Factor {
		if e.Form == Log {
			y = append(y, base*f)
		} else {
			y = append(y, base+float64(c.Factor*f))
		}
	}
	if c.JobLoss.Probability > 0 {
		y = append(y, benefit)
	}
	return y
}

// logMeanExp returns ln Σ p·exp(z) without overflow.
func logMeanExp(p, z []float64) float64 {
	top := z[len(z)-1]
	mean := 0.0
	for j, q := range p {
		mean += q * math.Exp(z[j]-top)
	}
	return top + math.Log(mean)
}

// Years returns the number of working years.
func (e *Earnings) Years() int { return len(e.Profile) }

// Outcomes returns what a household at a node can earn in year t as the solver
// reckons, money, with probabilities: one outcome a quadrature node and, where
// there is job loss, the benefit last. The probabilities are the same for every
// node and, but for a [Change], every t. The caller must not change either.
func (e *Earnings) Outcomes(t, node int) (values, weights []float64) {
	return e.values[t][node], e.outcomeWeights(t)
}

func (e *Earnings) outcomeWeights(t int) []float64 {
	if e.changed == nil {
		return e.weights
	}
	return e.changed[t]
}

// LogShift returns σ_ε²/2 where the profile is a mean in form log, 0 elsewhere.
func (e *Earnings) LogShift() float64 {
	if e.meanInLogs() {
		return e.Transitory.SD * e.Transitory.SD / 2
	}
	return 0
}

// At returns the earnings, in money, of an employed household at a node in year t
// whose transitory shock, as the process draws it, is epsilon.
func (e *Earnings) At(t, node int, epsilon float64) float64 {
	if e.Form == Log {
		return e.Base[t][node] * math.Exp(epsilon-e.LogShift())
	}
	return e.Base[t][node] + float64(e.change(t).Factor*epsilon)
}

// Mean returns mean earnings in year t, in money, over nodes, transitory shock and
// job loss, under the continuous law of the shock.
func (e *Earnings) Mean(t int) float64 {
	factor := 1.0
	if e.Form == Log && e.ProfileIs == Median {
		factor = math.Exp(e.Transitory.SD * e.Transitory.SD / 2)
	}
	p := e.JobLossIn(t).Probability
	mean := 0.0
	for j, q := range e.Distribution[t] {
		mean += q * ((1-p)*factor*e.Base[t][j] + p*e.Benefit[t][j])
	}
	return mean
}

// Infimum returns the greatest lower bound, in money, of earnings in year t over
// all nodes under the continuous law of the shock: 0 or below wherever a
// transitory shock is drawn, −Inf in form level.
func (e *Earnings) Infimum(t int) float64 {
	low := math.Inf(1)
	p := e.JobLossIn(t).Probability
	for j := range e.Chain.Nodes {
		if p > 0 {
			low = math.Min(low, e.Benefit[t][j])
		}
		if p == 1 {
			continue
		}
		switch {
		case e.TransitorySD(t) == 0:
			low = math.Min(low, e.Base[t][j])
		case e.Form == Log:
			low = math.Min(low, 0)
		default:
			low = math.Inf(-1)
		}
	}
	return low
}
