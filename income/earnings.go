package income

import "math"

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
}

// Build prepares the tables. An invalid process is reported as *FieldError, all
// faults at once.
func (p Process) Build() (*Earnings, error) {
	if err := p.Validate(); err != nil {
		return nil, err
	}
	e := &Earnings{Process: p, Distribution: p.Chain.ByAge(p.Initial, len(p.Profile)), Kappa: make([]float64, len(p.Profile))}
	e.placeShock()
	for t := range p.Profile {
		e.addYear(t)
	}
	return e, nil
}

// placeShock sets the transitory nodes and the outcomes' probabilities.
func (e *Earnings) placeShock() {
	x, w := NormalNodes(e.Transitory.Rule, e.Transitory.Nodes)
	e.Weight, e.Factor = w, x
	mean := 0.0
	for k := range x {
		x[k] *= e.Transitory.SD
		if e.Form == Log {
			x[k] = math.Exp(x[k])
			mean += w[k] * x[k]
		}
	}
	if e.Form == Log && e.ProfileIs == Mean {
		for k := range x {
			x[k] /= mean
		}
	}
	p := e.JobLoss.Probability
	for _, q := range w {
		e.weights = append(e.weights, (1-p)*q)
	}
	if p > 0 {
		e.weights = append(e.weights, p)
	}
}

// addYear appends year t to the tables.
func (e *Earnings) addYear(t int) {
	n := e.Chain.Len()
	if e.Form == Log && e.ProfileIs == Mean {
		mean := 0.0
		for j, q := range e.Distribution[t] {
			mean += q * math.Exp(e.Chain.Nodes[j])
		}
		e.Kappa[t] = math.Log(mean)
	}
	base, benefit, values := make([]float64, n), make([]float64, n), make([][]float64, n)
	for j, z := range e.Chain.Nodes {
		if e.Form == Log {
			base[j] = e.Profile[t] * math.Exp(z-e.Kappa[t])
			benefit[j] = e.JobLoss.BenefitRate * base[j]
		} else {
			base[j] = e.Profile[t] + z
			benefit[j] = e.JobLoss.BenefitRate * e.Profile[t]
		}
		for _, f := range e.Factor {
			if e.Form == Log {
				values[j] = append(values[j], base[j]*f)
			} else {
				values[j] = append(values[j], base[j]+f)
			}
		}
		if e.JobLoss.Probability > 0 {
			values[j] = append(values[j], benefit[j])
		}
	}
	e.Base, e.Benefit, e.values = append(e.Base, base), append(e.Benefit, benefit), append(e.values, values)
}

// Years returns the number of working years.
func (e *Earnings) Years() int { return len(e.Profile) }

// Outcomes returns what a household at a node can earn in year t as the solver
// reckons, money, with probabilities: one outcome a quadrature node and, where
// there is job loss, the benefit last. The probabilities are the same for every t
// and node. The caller must not change either.
func (e *Earnings) Outcomes(t, node int) (values, weights []float64) {
	return e.values[t][node], e.weights
}

// LogShift returns σ_ε²/2 where the profile is a mean in form log, 0 elsewhere.
func (e *Earnings) LogShift() float64 {
	if e.Form == Log && e.ProfileIs == Mean {
		return e.Transitory.SD * e.Transitory.SD / 2
	}
	return 0
}

// At returns the earnings, in money, of an employed household at a node in year t
// whose transitory shock is epsilon.
func (e *Earnings) At(t, node int, epsilon float64) float64 {
	if e.Form == Log {
		return e.Base[t][node] * math.Exp(epsilon-e.LogShift())
	}
	return e.Base[t][node] + epsilon
}

// Mean returns mean earnings in year t, in money, over nodes, transitory shock and
// job loss, under the continuous law of the shock.
func (e *Earnings) Mean(t int) float64 {
	factor := 1.0
	if e.Form == Log && e.ProfileIs == Median {
		factor = math.Exp(e.Transitory.SD * e.Transitory.SD / 2)
	}
	p := e.JobLoss.Probability
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
	p := e.JobLoss.Probability
	for j := range e.Chain.Nodes {
		if p > 0 {
			low = math.Min(low, e.Benefit[t][j])
		}
		if p == 1 {
			continue
		}
		switch {
		case e.Transitory.SD == 0:
			low = math.Min(low, e.Base[t][j])
		case e.Form == Log:
			low = math.Min(low, 0)
		default:
			low = math.Inf(-1)
		}
	}
	return low
}
