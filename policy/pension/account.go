package pension

// An Account is what passes between a household and the state in a year, in money:
//
//	Net = Earnings + Pension + TopUp − Employee − Pensioner − Tax,
//	resources = Net + Assistance.
type Account struct {
	Earnings   float64 // gross, or the benefit in a year of job loss
	Pension    float64 // gross, before any minimum
	TopUp      float64 // to the minimum pension
	Employee   float64 // contributions on earnings, the household's part
	Employer   float64 // the employer's part, on top of earnings
	Pensioner  float64 // contributions on pensions
	Funded     float64 // of contributions: what goes to the household's own account
	Tax        float64 // on income; negative where it is a subsidy
	Net        float64
	Assistance float64
}

// Account returns the account of year t, of a household that kept assets at the
// end of the year before. Its Net equals [Law.Net] to rounding.
func (l *Law) Account(t int, r Receipts, assets float64) Account {
	y := &l.years[t]
	taxable, topped := y.taxable(r)
	a := Account{Earnings: r.Earnings, Pension: r.Pension, TopUp: topped - r.Pension}
	if r.Employed || y.onBenefits {
		base := capped(r.Earnings, y.ceiling)
		a.Employee, a.Employer = y.employee*base, y.employer*base
		for i, p := range l.pillars {
			if p.kind == FundedKind && !r.Claimed {
				a.Funded = y.motion[i].credit * y.wage * capped(r.Earnings, y.motion[i].cap)
			}
		}
	}
	a.Pensioner = y.pensioner * capped(topped, y.ceiling)
	if y.tax != nil {
		a.Tax = y.tax.Tax(taxable)
	}
	a.Net = l.Net(t, r)
	a.Assistance = y.support.At(a.Net, 0, assets)
	return a
}
