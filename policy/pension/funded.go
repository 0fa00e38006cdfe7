package pension

import "fmt"

// FundedAccount invests contributions at the market return:
//
//	e_t = (1+r_t)·(1−charge_t)/(1+g_t)·[1/s_{t−1}]·e_{t−1} + κ_t·min(y_t, ceiling_t)/W_t.
//
// At claim the balance buys an annuity for life, priced with the cohort's survival
// and AnnuityRate as in [NotionalAccount], or is drawn down over a number of years,
//
//	payment in year c = balance/Σ_{k<years} (I_{c+k}/I_c)/(1+r)^k,
//
// at the return of the year of claim; 1 year is a lump sum. What is left of a balance
// when its owner dies before the claim or while drawing down goes to the estate
// ([Law.Balance]), unless ShareDeaths.
type FundedAccount struct {
	Credit        Parameter  // κ, share of contributory earnings, 0 to 1; it is part of the contributions
	Return        *Parameter // r, real, a year; nil: the return of [Cohort]
	Charge        Parameter  // share of the balance a year, at least 0, below 1
	AnnuityRate   *Parameter // real, a year; nil: the return less the charge
	DrawdownYears int        // 0: an annuity for life
	Indexation    Index      // of payments
	ShareDeaths   bool       // before the claim
}

func (*FundedAccount) kind() Kind { return FundedKind }

func (*FundedAccount) adjusted() bool { return false }

func (p *FundedAccount) payment() (Index, int) { return p.Indexation, p.DrawdownYears }

func (p *FundedAccount) validate(f *faults) {
	p.Credit.validate(f, "FundedAccount.Credit", fraction)
	if p.Return != nil {
		p.Return.validate(f, "FundedAccount.Return", finiteRate)
	}
	p.Charge.validate(f, "FundedAccount.Charge", belowOne)
	if p.AnnuityRate != nil {
		p.AnnuityRate.validate(f, "FundedAccount.AnnuityRate", finiteRate)
		if p.DrawdownYears > 0 {
			f.add("FundedAccount.AnnuityRate", "set", "nothing beside a drawdown")
		}
	}
	if p.DrawdownYears < 0 || p.DrawdownYears > 150 {
		f.add("FundedAccount.DrawdownYears", p.DrawdownYears, "from 1 to 150, or 0 for an annuity")
	}
	p.Indexation.validate(f, "FundedAccount.Indexation")
}

// gross returns 1 + the return after charges of year t.
func (p *FundedAccount) gross(r *resolver, t int) float64 {
	rate := r.cohort.returnIn(t)
	if p.Return != nil {
		rate = r.at("FundedAccount.Return", *p.Return, t)
	}
	return (1 + rate) * (1 - r.at("FundedAccount.Charge", p.Charge, t))
}

func (p *FundedAccount) motions(r *resolver, ceiling []float64) []motion {
	m := make([]motion, len(ceiling))
	for t := range m {
		grow := p.gross(r, t) / (1 + r.growth(r.year(t))) * r.survivors(t, p.ShareDeaths)
		m[t] = motion{grow, r.at("FundedAccount.Credit", p.Credit, t) / r.wage[t], ceiling[t]}
	}
	return m
}

func (p *FundedAccount) claimed(r *resolver, c int, index []float64) claimable {
	rate := p.gross(r, c) - 1
	switch {
	case p.DrawdownYears > 0:
		return claimable{unit: r.wage[c] / drawdown(index, rate, c, c, p.DrawdownYears)}
	case p.AnnuityRate != nil:
		rate = r.at("FundedAccount.AnnuityRate", *p.AnnuityRate, c)
	}
	return claimable{unit: r.wage[c] / r.divisor(c, index, rate)}
}

// drawdown returns the value in year t, at a rate, of what an account drawn down
// from year c on pays from year t on, in units of year c's payment. Beyond the last
// year of life the index keeps its last growth.
func drawdown(index []float64, rate float64, c, t, years int) float64 {
	last := len(index) - 1
	value, discount, level := 0.0, 1.0, index[min(t, last)]
	for k := t; k < c+years; k++ {
		if k <= last {
			level = index[k]
		} else {
			level *= index[last] / index[last-1]
		}
		value += discount * (level / index[c])
		discount /= 1 + rate
	}
	return value
}

// checkCredit reports years in which more goes to the account than is paid in.
func (p *FundedAccount) checkCredit(r *resolver, c Contributions) {
	for t := range r.wage {
		credit := r.at("FundedAccount.Credit", p.Credit, t)
		paid := r.at("Contributions.Employee", c.Employee, t) + r.at("Contributions.Employer", c.Employer, t)
		if credit > paid+1e-12 {
			r.f.add("FundedAccount.Credit", credit, fmt.Sprintf("at most what employee and employer pay in %d, %v of contributory earnings", r.year(t), paid))
			return
		}
	}
}
