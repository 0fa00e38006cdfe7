package pension_test

import (
	"fmt"
	"math"
	"testing"

	"cistern/policy/pension"
)

// work returns the entitlement of years from … to−1 at earnings, a multiple of
// average earnings.
func work(l *pension.Law, e pension.Entitlement, from, to int, earnings float64) pension.Entitlement {
	for t := from; t < to; t++ {
		e = l.Next(t, e, earnings*l.Wage(t), true)
	}
	return e
}

// mortal is a survival curve from 20 to 110.
func mortal() []float64 { return makeham(3e-4, 8e-6, 1.115, 20, 110) }

// By hand: 45 years at one and a half times average earnings under accrual of 1 % a
// year, revalued with wages, are 67.5 % of average earnings in the year of claim; half
// of what was credited in the first 20 years is left where revaluation is with prices
// and wages grow.
func TestCareerAverageByHand(t *testing.T) {
	r := rules()
	r.CareerAverage = &pension.CareerAverage{Accrual: constant(0.01), Revaluation: pension.WithWages()}
	l := law(t, r, cohort(mortal()))
	e := work(l, pension.Entitlement{}, 0, 45, 1.5)
	near(t, "accrued", e[0], 0.675, 1e-14)
	near(t, "pension", l.Pension(45, 45, e, 0), 0.675*l.Wage(45), 1e-10)

	r.CareerAverage.Revaluation = pension.WithPrices()
	l = law(t, r, cohort(mortal()))
	e = work(l, pension.Entitlement{}, 0, 45, 1.5)
	sum := 0.0 // real earnings of each year, in real money
	for t := range 45 {
		sum += 1.5 * 30000 * math.Pow(1.01, float64(t-20))
	}
	near(t, "with prices", l.Pension(45, 45, e, 0), 0.01*sum, 1e-10)

	r.Contributions.Ceiling, r.Contributions.Uprating = constant(36000), pension.WithWages() // 1.2 times average earnings
	r.CareerAverage.Revaluation = pension.WithWages()
	l = law(t, r, cohort(mortal()))
	near(t, "up to the ceiling", work(l, pension.Entitlement{}, 0, 45, 1.5)[0], 0.01*45*1.2, 1e-14)
	near(t, "unemployed", l.Next(20, pension.Entitlement{0.5, 0}, 15000, false)[0], 0.5, 1e-15)
	r.Contributions.OnBenefits = true
	near(t, "unemployed, benefits credited", law(t, r, cohort(mortal())).Next(20, pension.Entitlement{0.5, 0}, 15000, false)[0], 0.505, 1e-15)
}

// Published: US Social Security Administration, primary insurance amount: 90 % of
// average indexed monthly earnings to the first bend point, 32 % to the second, 15 %
// beyond; its examples 4010 under 885/5336 give 1796.50, 8843 under 791/4768 give
// 2595.79.
func TestBenefitFormulaPublished(t *testing.T) {
	for _, tt := range []struct{ average, first, second, want float64 }{{4010, 885, 5336, 1796.50}, {8843, 791, 4768, 2595.79}, {500, 885, 5336, 450}} {
		r := rules()
		r.Wages = pension.Wages{Average: 1, BaseYear: 2020}
		r.CareerAverage = &pension.CareerAverage{Accrual: constant(1. / 35), Revaluation: pension.WithWages(), Formula: []pension.Step{
			{From: constant(0), Rate: constant(0.9)}, {From: constant(tt.first), Rate: constant(0.32)}, {From: constant(tt.second), Rate: constant(0.15)}}}
		l := law(t, r, cohort(mortal()))
		e := work(l, pension.Entitlement{}, 10, 45, tt.average)
		near(t, "average earnings of 35 years", e[0], tt.average, 1e-9)
		near(t, "pension", l.Pension(45, 45, e, 0), tt.want, 0.0051)
		d, _ := l.PensionSlopes(45, 45, e, 0, pension.Above)
		want := 0.15
		if tt.average < tt.first {
			want = 0.9
		} else if tt.average < tt.second {
			want = 0.32
		}
		near(t, "slope", d[0], want, 1e-15)
		if got := fmt.Sprint(l.PensionKinks(45)); got != fmt.Sprintf("[[0 %v %v] []]", tt.first, tt.second) {
			t.Errorf("kinks %s", got)
		}
	}
}

// Published: German pension law (section 77 SGB VI): points times access factor times
// pension value; 45 points, 36 months early at 0.3 % a month, pension value 34.19 euro a
// month from July 2020: 45·0.892·34.19 = 1372.3866 a month.
func TestPointsPublished(t *testing.T) {
	r := rules()
	r.Wages = pension.Wages{Average: 40551, BaseYear: 2020}
	r.Claim = pension.Claim{Statutory: constant(67), Earliest: constant(63), Latest: constant(70), Reduction: pension.FlatRate(0.036), Increase: pension.FlatRate(0.06)}
	r.Points = &pension.Points{Cap: constant(2), Value: constant(12 * 34.19 / 40551)}
	l := law(t, r, cohort(mortal()))
	e := work(l, pension.Entitlement{}, 0, 40, 1)
	e = work(l, e, 40, 44, 1.25)
	near(t, "points", e[0], 45, 1e-12)
	near(t, "pension a month", l.Pension(44, 44, e, 0)/12, 1372.3866, 1e-9)
	near(t, "points of a year above the cap", l.Next(20, pension.Entitlement{}, 3*40551, true)[0], 2, 1e-14)
}

// Points worth α and a career average with accrual α, revalued with wages, are the
// same law.
func TestPointsAreACareerAverage(t *testing.T) {
	r := rules()
	r.CareerAverage = &pension.CareerAverage{Accrual: constant(0.012), Revaluation: pension.WithWages(), Indexation: pension.Index{Wages: constant(0.5)}}
	r.Points = &pension.Points{Cap: constant(inf()), Value: constant(0.012), Indexation: pension.Index{Wages: constant(0.5)}}
	l := law(t, r, cohort(mortal()))
	var e pension.Entitlement
	for t := range 45 {
		e = l.Next(t, e, 20000+1000*float64(t%7), true)
	}
	for _, k := range []int{45, 60} {
		p := l.Parts(45, k, e, 0)
		near(t, "pensions", p.Pillars[0], p.Pillars[1], 1e-10)
	}
	if !(l.Pension(45, 45, e, 0) > 20000) {
		t.Errorf("pension %v", l.Pension(45, 45, e, 0))
	}
}

// Derived: credits of 18.5 % over 40 years whose return is wage growth make 7.4 times
// last earnings, and, the divisor at 65 and 1.6 % being 16.8195468770 under the hazard
// of TestAnnuityAgainstAHazard, a pension of 7.4/16.8195468770 of average earnings.
func TestNotionalAccountByHand(t *testing.T) {
	r := rules()
	r.NotionalAccount = &pension.NotionalAccount{Credit: constant(0.185), Return: pension.WithWages(), DivisorRate: constant(0.016)}
	l := law(t, r, cohort(makeham(3e-4, 8e-6, 1.115, 20, 130)))
	e := work(l, pension.Entitlement{}, 5, 45, 1)
	near(t, "balance over last earnings", e[0], 7.4, 1e-13)
	near(t, "pension over average earnings", l.Pension(45, 45, e, 0)/l.Wage(45), 7.4/16.8195468770, 1e-10)

	// Deaths shared: what 1000 people have paid in is what the survivors own.
	r.NotionalAccount.ShareDeaths = true
	s := makeham(3e-4, 8e-6, 1.115, 20, 130)
	l = law(t, r, cohort(s))
	var own pension.Entitlement
	paid, alive := 0.0, 1000.0
	for t := range 45 {
		own = l.Next(t, own, l.Wage(t), true)
		paid += alive * 0.185 // in average earnings, growing with wages
		if t < 44 {
			alive *= s[t]
		}
	}
	near(t, "paid in by all, owned by survivors", alive*own[0], paid, 1e-9)
}

// Closed form: a funded account credited κ·y a year for n years at rate r is
// κ·y·((1+r)^n − 1)/r; charges come off the return; it is paid out as an annuity, in
// equal parts, or at once.
func TestFundedAccountClosedForm(t *testing.T) {
	s := mortal()
	r := rules()
	r.Wages = pension.Wages{Average: 30000, BaseYear: 2020}
	r.Contributions.Employee = constant(0.05)
	r.FundedAccount = &pension.FundedAccount{Credit: constant(0.05)}
	l := law(t, r, cohort(s))
	e := work(l, pension.Entitlement{}, 0, 45, 1)
	near(t, "balance", e[0], 0.05*(math.Pow(1.03, 45)-1)/0.03, 1e-11)
	balance := e[0] * 30000 * 1.03 // in the year of claim
	near(t, "annuity", l.Pension(45, 45, e, 0), balance/pension.Annuity(s[45:], 0.03, 0), 1e-8)
	near(t, "left at death before the claim", l.Balance(46, 44, e), e[0]*30000, 1e-8)
	near(t, "left by an annuity", l.Balance(45, 50, e), 0, 0)
	near(t, "credited of a year's contributions", l.Account(20, pension.Receipts{Earnings: 40000, Employed: true}, 0).Funded, 2000, 1e-10)

	r.FundedAccount.DrawdownYears, r.FundedAccount.Indexation = 20, pension.AtRate(0.01)
	l = law(t, r, cohort(s))
	first := l.Pension(45, 45, e, 0)
	near(t, "drawn down", first, balance/pension.AnnuityCertain(20, 0.03, 0.01), 1e-8)
	near(t, "drawn down, the last", l.Pension(45, 64, e, 0), first*math.Pow(1.01, 19), 1e-8)
	near(t, "and no more", l.Pension(45, 65, e, 0), 0, 0)
	left := balance
	for k := 45; k < 65; k++ { // what is left earns the return
		left -= l.Pension(45, k, e, 0)
		near(t, "left in the account", l.Balance(45, k, e), left, 1e-7)
		left *= 1.03
	}
	r.FundedAccount.DrawdownYears = 80 // beyond the last age
	near(t, "drawn down beyond the last age", law(t, r, cohort(s)).Pension(45, 45, e, 0), balance/pension.AnnuityCertain(80, 0.03, 0.01), 1e-8)
	r.FundedAccount.DrawdownYears = 1
	l = law(t, r, cohort(s))
	near(t, "lump sum", l.Pension(45, 45, e, 0), balance, 1e-8)
	near(t, "after it", l.Pension(45, 46, e, 0), 0, 0)

	five, one := constant(0.05), constant(0.01)
	r.FundedAccount = &pension.FundedAccount{Credit: constant(0.05), Return: &five, Charge: constant(0.01), AnnuityRate: &one}
	l = law(t, r, cohort(s))
	net := 1.05*0.99 - 1
	e = work(l, pension.Entitlement{}, 0, 45, 1)
	near(t, "balance after charges", e[0], 0.05*(math.Pow(1+net, 45)-1)/net, 1e-11)
	near(t, "annuity at a rate of its own", l.Pension(45, 45, e, 0), e[0]*30000*(1+net)/pension.Annuity(s[45:], 0.01, 0), 1e-7)

	c := cohort(s)
	c.Returns = make([]float64, len(s))
	c.Returns[1] = 0.5
	r.FundedAccount = &pension.FundedAccount{Credit: constant(0.05)}
	near(t, "return of a year", work(law(t, r, c), pension.Entitlement{}, 0, 2, 1)[0], 0.05*1.5+0.05, 1e-15)
}

// A career average revalued at the market return is a funded account: accrual α and a
// credit of α·D, D the annuity's divisor, pay the same pension.
func TestRevaluationAtTheInterestRateIsFunding(t *testing.T) {
	s := mortal()
	r := rules()
	D := pension.Annuity(s[45:], 0.03, 0)
	r.Contributions.Employee = constant(0.25)
	r.CareerAverage = &pension.CareerAverage{Accrual: constant(0.01), Revaluation: pension.AtRate(0.03)}
	r.FundedAccount = &pension.FundedAccount{Credit: constant(0.01 * D)}
	l := law(t, r, cohort(s))
	var e pension.Entitlement
	for t := range 45 {
		e = l.Next(t, e, 20000+1000*float64(t%7), true)
	}
	for _, k := range []int{45, 60} {
		p := l.Parts(45, k, e, 0)
		if !(p.Pillars[0] > 10000) {
			t.Errorf("pension %v", p.Pillars[0])
		}
		near(t, "pensions", p.Pillars[0]/p.Pillars[1], 1, 1e-13)
	}
}

// By hand.
func TestFinalEarningsAndFlat(t *testing.T) {
	r := rules()
	r.FinalEarnings = &pension.FinalEarnings{Rate: constant(0.4)}
	r.Flat = &pension.Flat{Amount: constant(3000)}
	l := law(t, r, cohort(mortal()))
	near(t, "pension", l.Pension(45, 45, pension.Entitlement{}, 50000), 23000, 1e-10)
	near(t, "later", l.Pension(45, 60, pension.Entitlement{}, 50000), 23000, 1e-10)
	near(t, "before the claim", l.Pension(45, 44, pension.Entitlement{}, 50000), 0, 0)
	_, d := l.PensionSlopes(45, 50, pension.Entitlement{}, 50000, pension.Above)
	near(t, "slope in final earnings", d, 0.4, 0)
	defer func() {
		if got := recover(); got != "pension: claim in year 46, outside 45 to 45" {
			t.Errorf("a claim in a year in which nobody can claim: %v", got)
		}
	}()
	l.Pension(46, 47, pension.Entitlement{}, 50000)
}
