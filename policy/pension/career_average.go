package pension

import "fmt"

// CareerAverage pays a share of the revalued average of a career's earnings. The
// entitlement is the accrued pension a year, in average earnings:
//
//	e_t = ρ_t/(1+g_t)·e_{t−1} + α_t·min(y_t, ceiling_t)/W_t,
//	pension claimed in year c = factor(c)·F(ρ_c/(1+g_c)·e_{c−1})·W_c,
//
// ρ the factor of Revaluation and F the benefit formula. With F(e) = e a year adds
// α of its earnings to the pension. A formula makes the pension bend in the
// average: with α = 1/35, e is average earnings over 35 years and F the pension
// that goes with them.
type CareerAverage struct {
	Accrual     Parameter // α a year, 0 to 1
	Revaluation Index     // of what has accrued, until it is claimed
	Indexation  Index     // of pensions in payment
	Formula     []Step    // empty: F(e) = e
}

// A Step of a benefit formula: the pension rises by Rate for every unit of
// entitlement between From and the next step's From.
type Step struct {
	From Parameter // in average earnings; the first 0
	Rate Parameter // at least 0
}

func (*CareerAverage) kind() Kind { return CareerAverageKind }

func (*CareerAverage) adjusted() bool { return true }

func (p *CareerAverage) payment() (Index, int) { return p.Indexation, 0 }

func (p *CareerAverage) validate(f *faults) {
	p.Accrual.validate(f, "CareerAverage.Accrual", fraction)
	p.Revaluation.validate(f, "CareerAverage.Revaluation")
	p.Indexation.validate(f, "CareerAverage.Indexation")
	for i, s := range p.Formula {
		at := fmt.Sprintf("CareerAverage.Formula[%d]", i)
		s.From.validate(f, at+".From", notBelow0)
		s.Rate.validate(f, at+".Rate", notBelow0)
	}
}

func (p *CareerAverage) motions(r *resolver, ceiling []float64) []motion {
	m := make([]motion, len(ceiling))
	for t := range m {
		y := r.year(t)
		grow := r.factor("CareerAverage.Revaluation", p.Revaluation, y) / (1 + r.growth(y))
		m[t] = motion{grow, r.at("CareerAverage.Accrual", p.Accrual, t) / r.wage[t], ceiling[t]}
	}
	return m
}

func (p *CareerAverage) claimed(r *resolver, c int, _ []float64) claimable {
	if len(p.Formula) == 0 {
		return claimable{unit: r.wage[c]}
	}
	from, rate := make([]float64, len(p.Formula)), make([]float64, len(p.Formula))
	for i, s := range p.Formula {
		at := fmt.Sprintf("CareerAverage.Formula[%d]", i)
		from[i], rate[i] = r.at(at+".From", s.From, c), r.at(at+".Rate", s.Rate, c)
	}
	if len(*r.f) == 0 {
		validateEdges(r.f, func(i int) string { return fmt.Sprintf("CareerAverage.Formula[%d].From", i) }, r.when(c), from)
	}
	return claimable{r.wage[c], newPiecewise(from, rate)}
}
