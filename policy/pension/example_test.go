package pension_test

import (
	"fmt"

	"cistern/income"
	"cistern/policy/pension"
)

// Quayside's points scheme: what dockers at half, one and two times average earnings
// get who begin at 20 and claim at 65.
func ExampleLaw_Adequacy() {
	r := pension.NoRules()
	r.Wages = pension.Wages{Average: 32000, Growth: pension.Constant(0.01), BaseYear: 2026}
	r.Contributions.Employee, r.Contributions.Employer = pension.Constant(0.09), pension.Constant(0.09)
	r.Contributions.Ceiling, r.Contributions.Uprating = pension.Constant(56000), pension.WithWages()
	r.Points = &pension.Points{Cap: pension.Constant(2), Value: pension.Constant(0.01)}
	r.Minimum = &pension.MinimumPension{Amount: pension.Constant(9000), Taper: pension.Constant(1), Uprating: pension.WithWages()}
	survival, err := income.Gompertz{ModalAge: 88, Dispersion: 9}.Survival(20, 100)
	if err != nil {
		fmt.Println(err)
		return
	}
	law, err := r.For(pension.Cohort{Birth: 1990, FirstAge: 20, Survival: survival, Return: 0.03})
	if err != nil {
		fmt.Println(err)
		return
	}
	claim, _, _ := law.Claims()
	for _, c := range pension.StandardCareers(20) {
		a, err := law.Adequacy(c, claim, 0.02)
		if err != nil {
			fmt.Println(err)
			return
		}
		fmt.Printf("%-40s gross %4.1f %%, net %4.1f %%, wealth %4.1f years\n", c.Name, 100*a.GrossReplacement, 100*a.NetReplacement, a.GrossWealth)
	}
	// Output:
	// half average earnings, full career       gross 56.2 %, net 61.8 %, wealth 10.3 years
	// average earnings, full career            gross 45.0 %, net 49.5 %, wealth  7.4 years
	// twice average earnings, full career      gross 39.4 %, net 42.7 %, wealth  6.5 years
	// half average earnings, broken career     gross 56.2 %, net 61.8 %, wealth 10.3 years
	// average earnings, broken career          gross 40.0 %, net 44.0 %, wealth  6.6 years
	// twice average earnings, broken career    gross 35.0 %, net 38.0 %, wealth  5.8 years
}
