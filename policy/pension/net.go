package pension

// Receipts is what a household receives in a year before public rules take their
// part, in money.
type Receipts struct {
	Earnings float64 // gross earnings, or without employment the benefit
	Employed bool
	Pension  float64 // gross, before any minimum; at least 0
	Claimed  bool    // a pension has been claimed: the minimum applies
}

// Net returns what is left of a year's receipts after the top-up of the pension,
// contributions and income tax, before assistance; money:
//
//	P* = P + top-up,
//	net = y + P* − κ_y(y) − κ_P(P*) − T(y − δ·κ_y(y) + σ·(P* − δ·κ_P(P*))),
//
// κ_y and κ_P the contributions on earnings and pension, δ their deductible share, σ
// the taxable share of pensions, T the tax. It rises with earnings and does not fall
// with the pension.
func (l *Law) Net(t int, r Receipts) float64 {
	y := &l.years[t]
	pension := r.Pension
	if r.Claimed {
		pension += y.minimum.at(pension)
	}
	paid, taxable := r.Earnings, r.Earnings
	if r.Employed || y.onBenefits {
		c := float64(y.employee * capped(r.Earnings, y.ceiling))
		paid -= c
		taxable -= float64(y.deductible * c)
	}
	if pension != 0 {
		c := float64(y.pensioner * capped(pension, y.ceiling))
		paid += pension - c
		taxable += float64(y.taxablePensions * (pension - float64(y.deductible*c)))
	}
	switch {
	case y.brackets != nil:
		paid -= y.brackets.At(taxable)
	case y.tax != nil:
		paid -= y.tax.Tax(taxable)
	}
	return paid
}

// taxable returns taxable income and the topped-up pension.
func (y *year) taxable(r Receipts) (taxable, pension float64) {
	pension = r.Pension
	if r.Claimed {
		pension += y.minimum.at(pension)
	}
	taxable = r.Earnings
	if r.Employed || y.onBenefits {
		taxable -= float64(y.deductible * float64(y.employee*capped(r.Earnings, y.ceiling)))
	}
	c := float64(y.pensioner * capped(pension, y.ceiling))
	return taxable + float64(y.taxablePensions*(pension-float64(y.deductible*c))), pension
}

// NetSlopes returns the slopes of [Law.Net] in earnings and in the pension, each on
// one side: 1 less the marginal rates.
func (l *Law) NetSlopes(t int, r Receipts, side Side) (earnings, pension float64) {
	y := &l.years[t]
	taxable, topped := y.taxable(r)
	marginal := 0.0
	if y.tax != nil {
		marginal = y.tax.Marginal(taxable, side)
	}
	c := 0.0
	if r.Employed || y.onBenefits {
		c = y.employee * cappedSlope(r.Earnings, y.ceiling, side)
	}
	earnings = 1 - c - marginal*(1-y.deductible*c)
	rises := 1.0
	if r.Claimed {
		rises += y.minimum.slope(r.Pension, side)
	}
	if rises == 0 {
		return earnings, 0
	}
	c = y.pensioner * cappedSlope(topped, y.ceiling, side)
	pension = rises * (1 - c)
	if y.taxablePensions > 0 {
		pension -= rises * marginal * y.taxablePensions * (1 - y.deductible*c)
	}
	return earnings, pension
}

// Support returns the assistance of year t; it pays nothing where there is none.
// The caller must not change it.
func (l *Law) Support(t int) *Support { return &l.years[t].support }

// Resources returns net income with assistance in year t, of a household that kept
// assets at the end of the year before; money. Cash-on-hand is that plus assets with
// their return, and where there is a floor the floor at least ([Law.Floor]). It does
// not fall with earnings or pension; it falls with assets by the taper at most.
func (l *Law) Resources(t int, r Receipts, assets float64) float64 {
	net := l.Net(t, r)
	return net + l.years[t].support.At(net, 0, assets)
}

// ResourcesSlopes returns the slopes of [Law.Resources] in earnings, pension and
// assets, each on one side.
func (l *Law) ResourcesSlopes(t int, r Receipts, assets float64, side Side) (earnings, pension, asset float64) {
	earnings, pension = l.NetSlopes(t, r, side)
	byIncome, asset := l.years[t].support.Slopes(l.Net(t, r), 0, assets, side)
	keeps := 1 + byIncome
	if keeps == 0 {
		return 0, 0, asset
	}
	return earnings * keeps, pension * keeps, asset
}
