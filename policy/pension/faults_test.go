package pension_test

import (
	"math"
	"testing"

	"cistern/policy/pension"
)

// Every rule out of range is reported, with its field, value and allowed range.
func TestRuleFaults(t *testing.T) {
	nan := math.NaN()
	bad := pension.Index{Wages: constant(1.5), Rate: constant(-1)}
	tests := []struct {
		name string
		set  func(*pension.Rules)
		want []string
	}{
		{"wages", func(r *pension.Rules) { r.Wages.Average, r.Wages.Growth = 0, constant(-1) },
			[]string{"Wages.Average: is 0, want positive and finite", "Wages.Growth: is -1, want above -1"}},
		{"wages to infinity", func(r *pension.Rules) { r.Wages.Growth = constant(1e300) },
			[]string{"Wages.Growth: average earnings of"}},
		{"contributions", func(r *pension.Rules) {
			r.Contributions = pension.Contributions{Employee: constant(1), Employer: constant(-0.1), Pensioner: constant(nan), Ceiling: constant(0), Deductible: constant(2), Uprating: bad}
		}, []string{"Contributions.Employee: is 1, want at least 0 and below 1", "Contributions.Employer: at least 0", "Contributions.Pensioner: is NaN", "Contributions.Ceiling: is 0, want positive, +Inf for none",
			"Contributions.Deductible: is 2, want from 0 to 1", "Contributions.Uprating.Wages: is 1.5, want from 0 to 1", "Contributions.Uprating.Rate: is -1, want above -1 and finite"}},
		{"career average", func(r *pension.Rules) {
			r.CareerAverage = &pension.CareerAverage{Accrual: constant(1.1), Revaluation: bad, Indexation: pension.AtRate(nan), Formula: []pension.Step{{From: constant(0), Rate: constant(-1)}, {From: constant(inf()), Rate: constant(1)}}}
		}, []string{"CareerAverage.Accrual: is 1.1", "CareerAverage.Revaluation.Wages: is 1.5", "CareerAverage.Revaluation.Rate: is -1", "CareerAverage.Indexation.Rate: is NaN", "CareerAverage.Formula[0].Rate: is -1", "CareerAverage.Formula[1].From: is +Inf"}},
		{"formula out of order", func(r *pension.Rules) {
			r.CareerAverage = &pension.CareerAverage{Formula: []pension.Step{{From: constant(0), Rate: constant(1)}, {From: constant(0), Rate: constant(0.5)}}}
		}, []string{"CareerAverage.Formula[1].From: is 0, want finite and above 0, where the one before it begins (in 2045)"}},
		{"points", func(r *pension.Rules) {
			r.Points = &pension.Points{Cap: constant(0), Value: constant(-1), Indexation: bad}
		}, []string{"Points.Cap: is 0", "Points.Value: is -1", "Points.Indexation.Wages: is 1.5", "Points.Indexation.Rate: is -1"}},
		{"notional account", func(r *pension.Rules) {
			r.NotionalAccount = &pension.NotionalAccount{Credit: constant(2), Return: bad, DivisorRate: constant(-2), Indexation: bad}
		}, []string{"NotionalAccount.Credit: is 2", "NotionalAccount.Return.Wages: is 1.5", "NotionalAccount.Return.Rate: is -1", "NotionalAccount.DivisorRate: is -2", "NotionalAccount.Indexation.Wages: is 1.5", "NotionalAccount.Indexation.Rate: is -1"}},
		{"funded account", func(r *pension.Rules) {
			minus := constant(-1)
			r.FundedAccount = &pension.FundedAccount{Credit: constant(-1), Return: &minus, Charge: constant(1), AnnuityRate: &minus, DrawdownYears: 151, Indexation: bad}
		}, []string{"FundedAccount.Credit: is -1", "FundedAccount.Return: is -1", "FundedAccount.Charge: is 1", "FundedAccount.AnnuityRate: is -1", "FundedAccount.AnnuityRate: is set, want nothing beside a drawdown", "FundedAccount.DrawdownYears: is 151", "FundedAccount.Indexation.Wages: is 1.5", "FundedAccount.Indexation.Rate: is -1"}},
		{"more credited than paid", func(r *pension.Rules) {
			r.Contributions.Employee, r.Contributions.Employer = constant(0.02), constant(0.01)
			r.FundedAccount = &pension.FundedAccount{Credit: constant(0.05)}
		}, []string{"FundedAccount.Credit: is 0.05, want at most what employee and employer pay in 2000, 0.03"}},
		{"final earnings and flat", func(r *pension.Rules) {
			r.FinalEarnings = &pension.FinalEarnings{Rate: constant(-1), Indexation: bad}
			r.Flat = &pension.Flat{Amount: constant(-1), Uprating: bad}
		}, []string{"FinalEarnings.Rate: is -1", "FinalEarnings.Indexation.Wages: is 1.5", "FinalEarnings.Indexation.Rate: is -1", "Flat.Amount: is -1", "Flat.Uprating.Wages: is 1.5", "Flat.Uprating.Rate: is -1"}},
		{"too many pillars", func(r *pension.Rules) {
			r.CareerAverage, r.Points = &pension.CareerAverage{}, &pension.Points{Cap: constant(inf())}
			r.NotionalAccount = &pension.NotionalAccount{}
		}, []string{"Pillars: is career_average, points, notional_account, want at most 2 that accrue an entitlement"}},
		{"guarantees", func(r *pension.Rules) {
			r.Minimum = &pension.MinimumPension{Amount: constant(inf()), Taper: constant(1.5), Uprating: bad}
			r.Assistance = &pension.Assistance{Amount: constant(-1), FromAge: constant(0), Income: pension.Test{Exempt: constant(-1), Taper: constant(1.01)}, Assets: pension.Test{Exempt: constant(nan), Taper: constant(-0.1)}, Uprating: bad}
			r.Floor = &pension.ConsumptionFloor{Amount: constant(-1), Uprating: bad}
		}, []string{"Minimum.Amount: is +Inf", "Minimum.Taper: is 1.5, want from 0 to 1", "Minimum.Uprating.Wages: is 1.5", "Minimum.Uprating.Rate: is -1",
			"Assistance.Amount: is -1", "Assistance.FromAge: is 0", "Assistance.Income.Exempt: is -1", "Assistance.Income.Taper: is 1.01, want from 0 to 1", "Assistance.Assets.Exempt: is NaN", "Assistance.Assets.Taper: is -0.1", "Assistance.Uprating.Wages: is 1.5", "Assistance.Uprating.Rate: is -1",
			"Floor.Amount: is -1", "Floor.Uprating.Wages: is 1.5", "Floor.Uprating.Rate: is -1"}},
		{"taxes", func(r *pension.Rules) {
			r.Taxes = pension.Taxes{Pensions: constant(1.1), Interest: constant(1), Consumption: constant(-0.1), Income: pension.IncomeTax{Uprating: bad, Brackets: []pension.Bracket{{From: constant(-1), Rate: constant(1)}}}}
		}, []string{"Taxes.Income.Uprating.Wages: is 1.5", "Taxes.Income.Uprating.Rate: is -1", "Taxes.Income.Brackets[0].From: is -1", "Taxes.Income.Brackets[0].Rate: is 1, want above -1 and below 1", "Taxes.Pensions: is 1.1", "Taxes.Interest: is 1", "Taxes.Consumption: is -0.1"}},
		{"two income taxes", func(r *pension.Rules) {
			r.Taxes.Income = pension.IncomeTax{Brackets: []pension.Bracket{{}}, Power: &pension.PowerTax{Level: constant(0), Progressivity: constant(1)}}
		}, []string{"Taxes.Income: is brackets and power, want one of them", "Taxes.Income.Power.Level: is 0", "Taxes.Income.Power.Progressivity: is 1"}},
		{"brackets out of order", func(r *pension.Rules) {
			r.Taxes.Income.Brackets = []pension.Bracket{{From: constant(5)}, {From: constant(4)}}
		}, []string{"Taxes.Income.Brackets[0].From: is 5, want 0: the first bracket begins there (in 2000)", "Taxes.Income.Brackets[1].From: is 4, want finite and above 5"}},
		{"tax and contributions take all", func(r *pension.Rules) {
			r.Contributions.Employee = constant(0.2)
			r.Taxes.Income.Brackets = []pension.Bracket{{Rate: constant(0.2)}, {From: constant(40000), Rate: constant(0.85)}}
		}, []string{"Contributions.Employee: is 0.2, want less: with the highest tax rate of 2000, 0.85, it takes 1.05 of a further crown, want below 1"}},
		{"power tax and contributions without end", func(r *pension.Rules) {
			r.Contributions.Employee = constant(0.2)
			r.Taxes.Income.Power = &pension.PowerTax{Level: constant(0.9), Progressivity: constant(0.5)}
		}, []string{"Contributions.Employee: is 0.2, want less, or more of it deductible: with the tax of 2000"}},
		{"the same for pensioners", func(r *pension.Rules) {
			r.Contributions.Pensioner = constant(0.2)
			r.Taxes.Income.Power = &pension.PowerTax{Level: constant(0.9), Progressivity: constant(0.5)}
		}, []string{"Contributions.Pensioner: is 0.2, want less, or more of it deductible"}},
		{"nothing wrong", func(r *pension.Rules) {
			r.Contributions = pension.Contributions{Employee: constant(0.2), Ceiling: constant(50000), Deductible: constant(0)}
			r.Taxes.Income.Power = &pension.PowerTax{Level: constant(0.9), Progressivity: constant(0.181)}
		}, nil},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			r := rules()
			tt.set(&r)
			_, err := r.For(cohort(mortal()))
			wantFaults(t, err, tt.want...)
		})
	}
}

func TestCohortFaults(t *testing.T) {
	tests := []struct {
		name string
		c    pension.Cohort
		want []string
	}{
		{"no life", pension.Cohort{Birth: 1980}, []string{"Cohort.Survival: is 0 years"}},
		{"survival", pension.Cohort{Birth: 1980, FirstAge: 60, Survival: []float64{1.1, math.NaN(), 0.5}}, []string{"Cohort.Survival[0]: is 1.1", "Cohort.Survival[1]: is NaN", "Cohort.Survival[last]: is 0.5, want 0"}},
		{"when", pension.Cohort{Birth: 198, FirstAge: -1, Survival: []float64{1, 0}}, []string{"Cohort.FirstAge: is -1", "Cohort.Birth: is 198, want within 1000 years of the base year 2020"}},
		{"returns", pension.Cohort{Birth: 1980, FirstAge: 60, Survival: []float64{1, 0}, Return: -1, Returns: []float64{math.Inf(1)}}, []string{"Cohort.Return: is -1", "Cohort.Returns: is 1 returns, want 2", "Cohort.Returns[0]: is +Inf"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			_, err := rules().For(tt.c)
			wantFaults(t, err, tt.want...)
		})
	}
}

// The rules that take and give nothing do: what is earned is spent.
func TestNoRules(t *testing.T) {
	l := law(t, pension.NoRules(), cohort(mortal()))
	near(t, "net", l.Resources(20, pension.Receipts{Earnings: 12345, Employed: true}, 0), 12345, 0)
	near(t, "interest", l.Interest(20, 0.05), 0.05, 0)
	near(t, "pension", l.Pension(45, 45, pension.Entitlement{}, 12345), 0, 0)
	if kinks := l.EarningsKinks(20, pension.Receipts{Claimed: true}, 0); len(kinks) != 0 {
		t.Errorf("kinks %v", kinks)
	}
	if len(l.Kinds()) != 0 {
		t.Errorf("pillars %v", l.Kinds())
	}
}
