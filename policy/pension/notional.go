package pension

// NotionalAccount credits contributions to an account that earns a notional return
// and is turned into a pension by an annuity divisor:
//
//	e_t = ν_t/(1+g_t)·[1/s_{t−1}]·e_{t−1} + κ_t·min(y_t, ceiling_t)/W_t,
//	pension claimed in year c = (balance in year c)/D_c,
//	D_c = Σ_k p_k·(I_{c+k}/I_c)/(1+d)^k,
//
// ν the factor of Return, p_k the cohort's chance to live k years from the claim on,
// I the index of pensions in payment, d the divisor's rate. The part in brackets is
// there where ShareDeaths: balances of those who die before they claim go to the
// others of their age (inheritance gains); else they lapse. With return and
// divisor at the growth of the wage bill, and shared deaths, benefits equal
// contributions in a steady state.
type NotionalAccount struct {
	Credit      Parameter // κ, share of contributory earnings, 0 to 1
	Return      Index     // [WithWages] with population growth as Rate: that of the wage bill
	DivisorRate Parameter // d, real, a year, above −1; in the year of claim
	Indexation  Index     // of pensions in payment; the divisor counts with it
	ShareDeaths bool
}

func (*NotionalAccount) kind() Kind { return NotionalKind }

func (*NotionalAccount) adjusted() bool { return false }

func (p *NotionalAccount) payment() (Index, int) { return p.Indexation, 0 }

func (p *NotionalAccount) validate(f *faults) {
	p.Credit.validate(f, "NotionalAccount.Credit", fraction)
	p.Return.validate(f, "NotionalAccount.Return")
	p.DivisorRate.validate(f, "NotionalAccount.DivisorRate", finiteRate)
	p.Indexation.validate(f, "NotionalAccount.Indexation")
}

func (p *NotionalAccount) motions(r *resolver, ceiling []float64) []motion {
	m := make([]motion, len(ceiling))
	for t := range m {
		y := r.year(t)
		grow := r.factor("NotionalAccount.Return", p.Return, y) / (1 + r.growth(y)) * r.survivors(t, p.ShareDeaths)
		m[t] = motion{grow, r.at("NotionalAccount.Credit", p.Credit, t) / r.wage[t], ceiling[t]}
	}
	return m
}

func (p *NotionalAccount) claimed(r *resolver, c int, index []float64) claimable {
	return claimable{unit: r.wage[c] / r.divisor(c, index, r.at("NotionalAccount.DivisorRate", p.DivisorRate, c))}
}

// survivors returns by what a balance grows from year t−1 to t because some of those
// who had one died; 1 where deaths are not shared, and where nobody is left.
func (r *resolver) survivors(t int, share bool) float64 {
	if !share || t == 0 || r.cohort.Survival[t-1] == 0 {
		return 1
	}
	return 1 / r.cohort.Survival[t-1]
}

// divisor returns the value in year c of 1 paid from then on for life, indexed.
func (r *resolver) divisor(c int, index []float64, rate float64) float64 {
	payments := make([]float64, len(index)-c)
	for k := range payments {
		payments[k] = index[c+k] / index[c]
	}
	return PresentValue(r.cohort.Survival[c:], payments, rate)
}
