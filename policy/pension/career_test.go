package pension_test

import (
	"fmt"
	"math"
	"testing"

	"cistern/policy/pension"
)

// By hand, without wage growth: accrual of 1 % over 45 years at 30000 pays 13500, that
// is 45 %; contributions 10 %, deductible; tax 20 % above 10000; a minimum of 9000.
func TestAdequacyByHand(t *testing.T) {
	s := mortal()
	r := rules()
	r.Wages.Growth = constant(0)
	r.Contributions.Employee, r.Contributions.Employer, r.Contributions.Deductible = constant(0.1), constant(0.05), constant(1)
	r.CareerAverage = &pension.CareerAverage{Accrual: constant(0.01), Revaluation: pension.WithWages(), Indexation: pension.AtRate(0.01)}
	r.Minimum = &pension.MinimumPension{Amount: constant(9000), Taper: constant(1)}
	r.Taxes.Income = pension.IncomeTax{Brackets: []pension.Bracket{{From: constant(0), Rate: constant(0)}, {From: constant(10000), Rate: constant(0.2)}}}
	l := law(t, r, cohort(s))
	for _, tt := range []struct {
		career                                     pension.Career
		years                                      int
		netEarnings, grossPension, netPension, top float64
	}{
		{pension.Career{Earnings: 1, Entry: 20}, 45, 27000 - 3400, 13500, 12800, 0},
		{pension.Career{Earnings: 2, Entry: 20}, 45, 54000 - 8800, 27000, 23600, 0},
		{pension.Career{Earnings: 0.5, Entry: 20}, 45, 13500 - 700, 9000, 9000, 2250},
		{pension.Career{Earnings: 1, Entry: 20, Breaks: []pension.Span{{From: 35, To: 39}}}, 40, 27000 - 3400, 12000, 11600, 0},
		{pension.Career{Earnings: 1, Entry: 25, Breaks: []pension.Span{{From: 20, To: 29}, {From: 60, To: 70}}}, 30, 27000 - 3400, 9000, 9000, 0},
	} {
		a, err := l.Adequacy(tt.career, 45, 0.02)
		if err != nil {
			t.Fatal(err)
		}
		gross := 30000 * tt.career.Earnings
		name := fmt.Sprintf("%v times average earnings, %d years", tt.career.Earnings, tt.years)
		if a.YearsWorked != tt.years || a.ClaimAge != 65 {
			t.Errorf("%s: %d years worked, claim age %d", name, a.YearsWorked, a.ClaimAge)
		}
		near(t, name+": gross earnings", a.GrossEarnings, gross, 1e-10)
		near(t, name+": net earnings", a.NetEarnings, tt.netEarnings, 1e-10)
		near(t, name+": gross pension", a.GrossPension, tt.grossPension, 1e-9)
		near(t, name+": net pension", a.NetPension, tt.netPension, 1e-9)
		near(t, name+": top-up", a.TopUp, tt.top, 1e-9)
		near(t, name+": gross replacement rate", a.GrossReplacement, tt.grossPension/gross, 1e-14)
		near(t, name+": net replacement rate", a.NetReplacement, tt.netPension/tt.netEarnings, 1e-14)
		if tt.top == 0 && tt.grossPension > 9000 {
			near(t, name+": gross pension wealth", a.GrossWealth, tt.grossPension/gross*pension.Annuity(s[45:], 0.02, 0.01), 1e-11)
		}
	}
	// Net wealth, year by year.
	a, err := l.Adequacy(pension.Career{Earnings: 1, Entry: 20}, 45, 0.02)
	if err != nil {
		t.Fatal(err)
	}
	sum, weight := 0.0, 1.0
	for k := 45; k < len(s); k++ {
		p := 13500 * math.Pow(1.01, float64(k-45))
		sum += weight * (p - 0.2*(p-10000))
		weight *= s[k] / 1.02
	}
	near(t, "net pension wealth", a.NetWealth, sum/30000, 1e-11)
	// At its internal return contributions are worth what pensions are.
	flow, alive := make([]float64, len(s)), 1.0
	for k := range flow {
		if flow[k] = -alive * 0.15 * 30000; k >= 45 {
			flow[k] = alive * 13500 * math.Pow(1.01, float64(k-45))
		}
		alive *= s[k]
	}
	near(t, "worth at the internal return", pension.PresentValue(nil, flow, a.InternalReturn), 0, 1e-6)
}

// The OECD's definitions for a mandatory scheme whose value is known without
// reckoning: with accrual, revaluation and indexation with wages and no taxes both
// replacement rates are accrual times years for every multiple of earnings, and pension
// wealth at the growth of wages is that times life expectancy.
func TestAdequacyWithWageGrowth(t *testing.T) {
	s := mortal()
	r := rules()
	r.CareerAverage = &pension.CareerAverage{Accrual: constant(0.0115), Revaluation: pension.WithWages(), Indexation: pension.WithWages()}
	l := law(t, r, cohort(s))
	for _, c := range pension.StandardCareers(22) {
		a, err := l.Adequacy(c, 45, 0.01)
		if err != nil {
			t.Fatal(err)
		}
		years := 43.0
		if c.Breaks != nil {
			years = 38
		}
		near(t, c.Name+": gross", a.GrossReplacement, 0.0115*years, 1e-13)
		near(t, c.Name+": net", a.NetReplacement, 0.0115*years, 1e-13)
		near(t, c.Name+": wealth", a.GrossWealth, 0.0115*years*pension.Annuity(s[45:], 0, 0), 1e-10)
		if !math.IsNaN(a.InternalReturn) {
			t.Errorf("%s: an internal return of %v on nothing paid", c.Name, a.InternalReturn)
		}
	}
	for _, tt := range []struct {
		c    pension.Career
		want string
	}{
		{pension.Career{Earnings: 0, Entry: 20}, "Career.Earnings: positive"},
		{pension.Career{Earnings: 1, Entry: 19}, "Career.Entry: from the first age, 20, to the age before the claim, 64"},
		{pension.Career{Earnings: 1, Entry: 65}, "Career.Entry: from the first age"},
		{pension.Career{Earnings: 1, Entry: 20, Breaks: []pension.Span{{From: 40, To: 39}}}, "Career.Breaks[0]: ascending"},
		{pension.Career{Earnings: 1, Entry: 20, Breaks: []pension.Span{{From: 20, To: 99}}}, "Career.Breaks: at least a year"},
	} {
		_, err := l.Adequacy(tt.c, 45, 0.02)
		wantFaults(t, err, tt.want)
	}
	_, err := l.Adequacy(pension.Career{Earnings: 1, Entry: 20}, 45, -1)
	wantFaults(t, err, "rate: above -1")
}

// Assistance counts, for a household without assets.
func TestAdequacyWithAssistance(t *testing.T) {
	r := rules()
	r.Wages.Growth = constant(0)
	r.Assistance = &pension.Assistance{Amount: constant(8000), FromAge: constant(65), Income: pension.Test{Taper: constant(0.5)}}
	r.Flat = &pension.Flat{Amount: constant(6000)}
	a, err := law(t, r, cohort(mortal())).Adequacy(pension.Career{Earnings: 1, Entry: 20}, 45, 0.02)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "assistance", a.Assistance, 5000, 1e-12)
	near(t, "gross replacement rate", a.GrossReplacement, 11000./30000, 1e-14)
	near(t, "net replacement rate", a.NetReplacement, 11000./30000, 1e-14)
}
