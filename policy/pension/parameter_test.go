package pension_test

import (
	"testing"

	"cistern/policy/pension"
)

// By hand: a claim age of 65 for those born before 1960, two months more for every
// birth year to 1965, 67 from 1970 on, linear between.
func TestTableByHand(t *testing.T) {
	steps := pension.Parameter{Table: &pension.Table{By: pension.BirthYear, Rows: []pension.Row{
		{From: pension.Always, To: 1959, Value: 65}, {From: 1960, To: 1964, Value: 66}, {From: 1965, To: pension.Forever, Value: 67}}}}
	linear := pension.Parameter{Table: &pension.Table{Linear: true, Rows: []pension.Row{
		{From: pension.Always, To: 2030, Value: 0.2}, {From: 2040, To: 2042, Value: 0.25}}}}
	tests := []struct {
		p           pension.Parameter
		birth, year int
		want        float64
		ok          bool
	}{
		{steps, 1900, 0, 65, true}, {steps, 1959, 0, 65, true}, {steps, 1960, 0, 66, true}, {steps, 1964, 9999, 66, true}, {steps, 1965, 0, 67, true}, {steps, 2100, 0, 67, true},
		{linear, 0, 1000, 0.2, true}, {linear, 0, 2030, 0.2, true}, {linear, 0, 2031, 0.205, true}, {linear, 0, 2035, 0.225, true}, {linear, 0, 2040, 0.25, true}, {linear, 0, 2042, 0.25, true}, {linear, 0, 2043, 0, false},
		{pension.Constant(7), 1, 2, 7, true},
		{pension.Parameter{Table: &pension.Table{Rows: []pension.Row{{From: 2020, To: 2021, Value: 1}}}}, 0, 2019, 0, false},
	}
	for _, tt := range tests {
		got, ok := tt.p.At(tt.birth, tt.year)
		if ok != tt.ok {
			t.Errorf("born %d, %d: there is a value: %v", tt.birth, tt.year, ok)
		}
		near(t, "value", got, tt.want, 1e-15)
	}
}

func TestTableFaults(t *testing.T) {
	table := func(linear bool, rows ...pension.Row) pension.Parameter {
		return pension.Parameter{Table: &pension.Table{Linear: linear, Rows: rows}}
	}
	tests := []struct {
		name string
		p    pension.Parameter
		want []string
	}{
		{"gap", table(false, pension.Row{From: 2000, To: 2009}, pension.Row{From: 2011, To: 2020}), []string{"Contributions.Employee.Table.Rows[1]: is years 2011 to 2020, want rows without a gap: the one before it ends with 2009, so this one begins with 2010"}},
		{"gap that is filled", table(true, pension.Row{From: pension.Always, To: 2009}, pension.Row{From: 2011, To: pension.Forever}), nil},
		{"overlap", table(false, pension.Row{From: 2000, To: 2009}, pension.Row{From: 2009, To: 2020}), []string{"Contributions.Employee.Table.Rows[1]: do not overlap: the one before it is for years 2000 to 2009"}},
		{"overlap, linear", table(true, pension.Row{From: 2000, To: pension.Forever}, pension.Row{From: 2009, To: 2009}), []string{"Contributions.Employee.Table.Rows[1]: do not overlap: the one before it is for years from 2000"}},
		{"not ascending", table(false, pension.Row{From: 2010, To: 2019}, pension.Row{From: 2000, To: 2009}), []string{"Contributions.Employee.Table.Rows[1]: ascending order: the one before it is for years 2010 to 2019"}},
		{"all years twice", table(false, pension.Row{From: pension.Always, To: pension.Forever}, pension.Row{From: 2010, To: 2011}), []string{"Contributions.Employee.Table.Rows[1]: is years 2010 to 2011, want rows that do not overlap: the one before it is for all years"}},
		{"a year twice", table(true, pension.Row{From: pension.Always, To: 2010}, pension.Row{From: 2010, To: 2010}), []string{"Contributions.Employee.Table.Rows[1]: is year 2010, want rows that do not overlap: the one before it is for years to 2010"}},
		{"backwards", table(false, pension.Row{From: 2010, To: 2009}), []string{"Contributions.Employee.Table.Rows[0]: years in ascending order"}},
		{"value", table(false, pension.Row{From: pension.Always, To: pension.Forever, Value: 1}), []string{"Contributions.Employee.Table.Rows[0].Value: is 1, want at least 0 and below 1"}},
		{"empty", table(false), []string{"Contributions.Employee.Table.Rows: at least one row"}},
		{"years of what", pension.Parameter{Table: &pension.Table{By: 7, Rows: []pension.Row{{From: pension.Always, To: pension.Forever}}}}, []string{"Contributions.Employee.Table.By: year or birth_year"}},
		{"begins late", table(false, pension.Row{From: 2005, To: pension.Forever}), []string{"Contributions.Employee.Table: is without year 2000, want a value for it: people born in 1980 live under these rules from 2000 to 2060"}},
		{"ends early", table(true, pension.Row{From: pension.Always, To: 2059}), []string{"Contributions.Employee.Table: is without year 2060"}},
		{"for others", pension.Parameter{Table: &pension.Table{By: pension.BirthYear, Rows: []pension.Row{{From: 1981, To: 1990}}}}, []string{"Contributions.Employee.Table: is without birth year 1980"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			r := rules()
			r.Contributions.Employee = tt.p
			_, err := r.For(cohort(makeham(3e-4, 8e-6, 1.115, 20, 80)))
			wantFaults(t, err, tt.want...)
		})
	}
}
