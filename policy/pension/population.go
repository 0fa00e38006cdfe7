package pension

import "fmt"

// Ages returns the weights, summing to 1, of ages in a population whose births grow
// by growth a year and whose survival does not change:
//
//	w_t ∝ p_t·(1 + growth)^{−t}.
func Ages(survival []float64, growth float64) []float64 {
	w := make([]float64, len(survival))
	alive, sum := 1.0, 0.0
	for t := range w {
		w[t] = alive
		sum += alive
		alive *= survival[t] / (1 + growth)
	}
	for t := range w {
		w[t] /= sum
	}
	return w
}

// AverageEarnings returns mean earnings in the base year of those who are of
// working age, earnings by age being the cross-section of that year, [t], in a
// population as of [Ages]: Σ_t w_t·y_t / Σ_t w_t over the working years.
func AverageEarnings(earnings, survival []float64, growth float64) float64 {
	w := Ages(survival, growth)
	sum, people := 0.0, 0.0
	for t, y := range earnings {
		sum += w[t] * y
		people += w[t]
	}
	return sum / people
}

// A SteadyState is the yearly budget of a pension system in a population whose
// births grow at a constant rate and whose wages do, under rules that do not change,
// amounts uprated with wages: every quantity grows by (1+g)(1+n) a year. All are per
// member of the population and in average earnings of the year.
type SteadyState struct {
	WageBill      float64 // gross earnings
	Contributory  float64 // earnings on which contributions are due
	Contributions float64 // of employees, employers and pensioners, less what is funded
	Benefits      float64 // pensions with top-ups, without those of funded accounts
	BalancingRate float64 // share of contributory earnings that pays for the benefits
}

// SteadyState reckons the budget with earnings by age, [t] up to the claim, of the
// cohort, in money. It is an error if there are not as many as there are years before
// the claim.
//
// The internal return of its contributions at the balancing rate is g + n + g·n
// (Samuelson 1958, Journal of Political Economy 66; Aaron 1966, Canadian Journal of
// Economics and Political Science 32).
func (l *Law) SteadyState(earnings []float64, claim int, growth float64) (SteadyState, error) {
	l.checkClaim(claim)
	if len(earnings) != claim {
		return SteadyState{}, fmt.Errorf("pension: earnings of %d years, want %d, one for each year before the claim", len(earnings), claim)
	}
	if !finiteRate.ok(growth) {
		return SteadyState{}, &FieldError{Field: "growth", Value: growth, Want: finiteRate.want}
	}
	w := Ages(l.cohort.Survival, growth)
	var s SteadyState
	var e Entitlement
	for t := range l.years {
		y := &l.years[t]
		scale := w[t] / y.wage
		if t < claim {
			a := l.Account(t, Receipts{Earnings: earnings[t], Employed: true}, 0)
			s.WageBill += scale * earnings[t]
			s.Contributory += scale * capped(earnings[t], y.ceiling)
			s.Contributions += scale * (a.Employee + a.Employer - a.Funded)
			e = l.Next(t, e, earnings[t], true)
			continue
		}
		p := l.Parts(claim, t, e, earnings[claim-1])
		a := l.Account(t, Receipts{Pension: p.Total(), Claimed: true}, 0)
		s.Contributions += scale * a.Pensioner
		s.Benefits += scale * (a.Pension + a.TopUp - l.funded(&p))
	}
	s.BalancingRate = s.Benefits / s.Contributory
	return s, nil
}

// funded returns the part of pensions that the household's own account pays.
func (l *Law) funded(p *Parts) float64 {
	for i := range l.pillars {
		if l.pillars[i].kind == FundedKind {
			return p.Pillars[i]
		}
	}
	return 0
}
