package pension_test

import (
	"fmt"
	"testing"

	"cistern/policy/pension"
)

// quayside are rules with every part that touches net income, at the wage level of
// year 20, the base year: contributions 10 % to 60000, half deductible, 5 % on
// pensions, tax free to 10000, 20 % to 40000, 40 % above, four fifths of pensions
// taxable, a minimum of 9000 tapered by half, assistance.
func quayside() pension.Rules {
	r := rules()
	r.Contributions = pension.Contributions{Employee: constant(0.1), Employer: constant(0.15), Pensioner: constant(0.05),
		Ceiling: constant(60000), Uprating: pension.WithWages(), Deductible: constant(0.5)}
	r.Taxes = pension.Taxes{Pensions: constant(0.8), Interest: constant(0.25), Consumption: constant(0.2), Income: pension.IncomeTax{Uprating: pension.WithWages(),
		Brackets: []pension.Bracket{{From: constant(0), Rate: constant(0)}, {From: constant(10000), Rate: constant(0.2)}, {From: constant(40000), Rate: constant(0.4)}}}}
	r.Minimum = &pension.MinimumPension{Amount: constant(9000), Taper: constant(0.5), Uprating: pension.WithWages()}
	r.Assistance = &pension.Assistance{Amount: constant(14000), FromAge: constant(60), Uprating: pension.WithWages(),
		Income: pension.Test{Exempt: constant(2000), Taper: constant(0.6)}, Assets: pension.Test{Exempt: constant(20000), Taper: constant(0.1)}}
	r.Floor = &pension.ConsumptionFloor{Amount: constant(3000)}
	return r
}

// By hand, in 2020.
func TestNetByHand(t *testing.T) {
	l := law(t, quayside(), cohort(makeham(0, 0.001, 1.1, 20, 100)))
	tests := []struct {
		name string
		r    pension.Receipts
		want pension.Account
	}{
		{"earnings below the free bracket", pension.Receipts{Earnings: 8000, Employed: true},
			pension.Account{Earnings: 8000, Employee: 800, Employer: 1200, Net: 7200}},
		// Taxable 50000 − ½·5000 = 47500: 6000 + 0.4·7500 = 9000.
		{"earnings in the last bracket", pension.Receipts{Earnings: 50000, Employed: true},
			pension.Account{Earnings: 50000, Employee: 5000, Employer: 7500, Tax: 9000, Net: 36000}},
		// Contributions on 60000; taxable 100000 − 3000 = 97000: 6000 + 0.4·57000 = 28800.
		{"earnings above the ceiling", pension.Receipts{Earnings: 100000, Employed: true},
			pension.Account{Earnings: 100000, Employee: 6000, Employer: 9000, Tax: 28800, Net: 65200}},
		// No contributions on the benefit: taxable 20000, tax 2000.
		{"job loss", pension.Receipts{Earnings: 20000},
			pension.Account{Earnings: 20000, Tax: 2000, Net: 18000}},
		// Top-up 9000 − 5000 = 4000; contribution 700; taxable 0.8·(14000 − 350) = 10920, tax 184.
		{"a pension that is topped up", pension.Receipts{Pension: 10000, Claimed: true},
			pension.Account{Pension: 10000, TopUp: 4000, Pensioner: 700, Tax: 184, Net: 13116}},
		// Contribution 1500; taxable 0.8·(30000 − 750) = 23400, tax 2680.
		{"a pension beyond it", pension.Receipts{Pension: 30000, Claimed: true},
			pension.Account{Pension: 30000, Pensioner: 1500, Tax: 2680, Net: 25820}},
		// Taxable 20000 − 1000 + 23400 = 42400, tax 6960; contributions 2000 and 1500.
		{"earnings beside a pension", pension.Receipts{Earnings: 20000, Employed: true, Pension: 30000, Claimed: true},
			pension.Account{Earnings: 20000, Employee: 2000, Employer: 3000, Pension: 30000, Pensioner: 1500, Tax: 6960, Net: 39540}},
	}
	for _, tt := range tests {
		got := l.Account(20, tt.r, 0)
		for _, x := range []struct {
			what      string
			got, want float64
		}{{"earnings", got.Earnings, tt.want.Earnings}, {"pension", got.Pension, tt.want.Pension}, {"top-up", got.TopUp, tt.want.TopUp},
			{"employee", got.Employee, tt.want.Employee}, {"employer", got.Employer, tt.want.Employer}, {"pensioner", got.Pensioner, tt.want.Pensioner},
			{"tax", got.Tax, tt.want.Tax}, {"net", got.Net, tt.want.Net}, {"net by itself", l.Net(20, tt.r), tt.want.Net},
			{"assistance at 40", got.Assistance, 0}, {"funded", got.Funded, 0}} {
			near(t, tt.name+": "+x.what, x.got, x.want, 1e-10)
		}
	}
	// Ten years later everything is 1.01^10 times as large, being uprated with wages.
	k := l.Wage(30) / l.Wage(20)
	near(t, "uprated", l.Net(30, pension.Receipts{Earnings: 50000 * k, Employed: true}), 36000*k, 1e-9)
	r := quayside()
	r.Contributions.OnBenefits = true
	near(t, "contributions on benefits", law(t, r, cohort(makeham(0, 0.001, 1.1, 20, 100))).Net(20, pension.Receipts{Earnings: 20000}), 20000-2000-0.2*(20000-1000-10000), 1e-10)

	near(t, "interest after tax", l.Interest(20, 0.04), 0.03, 1e-17)
	near(t, "what consumption costs", l.Spending(20, 100), 120, 1e-12)
	near(t, "what an outlay buys", l.Bought(20, 120), 100, 1e-12)
	floor, ok := l.Floor(20)
	if !ok {
		t.Error("there is no floor")
	}
	near(t, "floor", floor, 3000, 0)
	if _, ok := law(t, rules(), cohort(makeham(0, 0.001, 1.1, 20, 100))).Floor(20); ok {
		t.Error("a floor that nobody asked for")
	}
}

// By hand: amount 14000, income above 2000 counts 0.6, assets above 20000 count 0.1.
func TestAssistanceByHand(t *testing.T) {
	sum := pension.Support{Amount: 14000, IncomeExempt: 2000, IncomeTaper: 0.6, AssetsExempt: 20000, AssetsTaper: 0.1}
	stricter := sum
	stricter.Stricter = true
	tests := []struct {
		s                      pension.Support
		pension, other, assets float64
		want, dIncome, dAssets float64
	}{
		{sum, 0, 0, 0, 14000, 0, 0},
		{sum, 2000, 0, 20000, 14000, -0.6, -0.1}, // slopes above the exempt amounts
		{sum, 5000, 2000, 0, 11000, -0.6, 0},
		{sum, 5000, 2000, 50000, 8000, -0.6, -0.1},
		{sum, 0, 0, 159000, 100, 0, -0.1},
		{sum, 0, 0, 161000, 0, 0, 0},
		{sum, 26000, 0, 0, 0, 0, 0},
		{sum, 0, 0, -5000, 14000, 0, 0},
		{stricter, 5000, 2000, 50000, 11000, -0.6, 0}, // income takes 3000, assets 3000: above, both
		{stricter, 5000, 2000, 60000, 10000, 0, -0.1},
		{stricter, 15000, 0, 60000, 6200, -0.6, 0},
	}
	for _, tt := range tests {
		name := fmt.Sprintf("pension %v, other %v, assets %v, stricter %v", tt.pension, tt.other, tt.assets, tt.s.Stricter)
		near(t, name, tt.s.At(tt.pension, tt.other, tt.assets), tt.want, 1e-9)
		if tt.want == 11000 && tt.s.Stricter {
			continue // at the kink
		}
		y, a := tt.s.Slopes(tt.pension, tt.other, tt.assets, pension.Above)
		near(t, name+": slope in income", y, tt.dIncome, 0)
		near(t, name+": slope in assets", a, tt.dAssets, 0)
	}
	for _, tt := range []struct {
		name string
		got  []float64
		want string
	}{
		{"income, no assets", sum.IncomeKinks(0), "[2000.000 25333.333]"},
		{"income, assets 50000", sum.IncomeKinks(50000), "[2000.000 20333.333]"},
		{"income, too many assets", sum.IncomeKinks(200000), "[]"},
		{"assets, no income", sum.AssetKinks(0), "[20000.000 160000.000]"},
		{"income under the stricter test, assets 50000", stricter.IncomeKinks(50000), "[7000.000 25333.333]"},
		{"assets under the stricter test, income 7000", stricter.AssetKinks(7000), "[50000.000 160000.000]"},
	} {
		if got := fmt.Sprintf("%.3f", tt.got); got != tt.want {
			t.Errorf("kinks, %s: %s, want %s", tt.name, got, tt.want)
		}
	}
	// From 60 on, and on top of net income. 13116 net of the pension above: 14000 − 0.6·11116 − 0.1·10000.
	l := law(t, quayside(), cohort(makeham(0, 0.001, 1.1, 20, 100)))
	k := l.Wage(40) / l.Wage(20)
	r := pension.Receipts{Pension: 10000 * k, Claimed: true}
	near(t, "resources at 60", l.Resources(40, r, 30000*k), (13116+14000-0.6*11116-1000)*k, 1e-8)
	near(t, "resources at 59", l.Resources(39, pension.Receipts{}, 0), 0, 0)
}
