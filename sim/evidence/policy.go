package evidence

import (
	"context"
	"fmt"

	"cistern/income"
	"cistern/policy"
)

// lifetime is a household that works for the given years and then dies, its
// income in form level.
type lifetime struct {
	years   int
	income  func(t int) float64
	chain   *income.Chain
	shock   income.Transitory
	utility policy.Utility
	beta, r float64
	limit   policy.Limit
}

func (l lifetime) solve(ctx context.Context) (*policy.Rule, error) {
	if l.chain == nil {
		l.chain = income.Degenerate()
	}
	if l.shock.Nodes == 0 {
		l.shock.Nodes = 1
	}
	profile := make([]float64, l.years)
	for t := range profile {
		profile[t] = l.income(t)
	}
	e, err := income.Process{FirstAge: 20, Profile: profile, Form: income.Level, Chain: l.chain, Initial: l.chain.Stationary(), Transitory: l.shock}.Build()
	if err != nil {
		return nil, err
	}
	return policy.Solve(ctx, policy.Household{FirstAge: 20, Survival: income.Certain(20, 20+l.years-1), Utility: l.utility,
		DiscountFactor: l.beta, Return: l.r, Limit: l.limit, Earnings: e, Pension: policy.Pension{ClaimAge: 20 + l.years}}, policy.DefaultOptions())
}

// certainPaths compares the solver with closed forms where income is known.
func certainPaths(ctx context.Context) ([]Check, error) {
	hump := func(t int) float64 {
		if t >= 40 {
			return 0.6
		}
		return 1 + 0.03*float64(t) - 0.0006*float64(t*t)
	}
	var out []Check
	for _, x := range []struct{ gamma, c0 float64 }{{0.5, 1.754613219589}, {2, 1.297219940881}, {5, 1.211329512512}} {
		u, err := policy.NewCRRA(x.gamma)
		if err != nil {
			return nil, err
		}
		rule, err := lifetime{years: 61, income: hump, utility: u, beta: 0.96, r: 0.03, limit: policy.Limit{Kind: policy.LimitNatural}}.solve(ctx)
		if err != nil {
			return nil, err
		}
		out = append(out, Check{"policy", fmt.Sprintf("certain income, natural limit, risk aversion %g: first consumption", x.gamma),
			"derived: consumption is a fixed share of lifetime resources", x.c0, rule.Consumption(0, 0, 1.5), 1e-10})
		out = append(out, budget(rule, hump, x.gamma))
	}
	return out, nil
}

// budget is the lifetime budget constraint along the path from cash-on-hand 1.5.
func budget(rule *policy.Rule, income func(int) float64, gamma float64) Check {
	m, spent, resources, discount := 1.5, 0.0, 1.5-income(0), 1.0
	for t := range rule.Curves {
		c := rule.Consumption(t, 0, m)
		spent += c * discount
		resources += income(t) * discount
		discount /= 1.03
		m = 1.03*(m-c) + income(t+1)
	}
	return Check{"policy", fmt.Sprintf("certain income, natural limit, risk aversion %g: present value of consumption over that of resources", gamma),
		"derived: lifetime budget constraint", 1, spent / resources, 1e-10}
}

// exponential compares the solver with the closed form of exponential utility
// under normal income risk.
func exponential(ctx context.Context) ([]Check, error) {
	u, err := policy.NewCARA(2)
	if err != nil {
		return nil, err
	}
	var out []Check
	for _, x := range []struct {
		ahead int
		c     float64
	}{{1, 1.4904589144}, {2, 1.3290495658}, {5, 1.1779067104}, {20, 1.1069261805}, {60, 1.1523991551}} {
		rule, err := lifetime{years: x.ahead + 1, income: func(int) float64 { return 1 }, utility: u, beta: 0.96, r: 0.03,
			shock: income.Transitory{SD: 0.2, Nodes: 31, Rule: income.GaussHermite}, limit: policy.Limit{Kind: policy.LimitNone}}.solve(ctx)
		if err != nil {
			return nil, err
		}
		out = append(out, Check{"policy", fmt.Sprintf("exponential utility, normal shocks, %d years ahead: consumption", x.ahead),
			"derived: closed form after Caballero (1990), Journal of Monetary Economics 25", x.c, rule.Consumption(0, 0, 2), 1e-9})
	}
	return out, nil
}

// limits compares the solver with problems in which a borrowing limit binds.
func limits(ctx context.Context) ([]Check, error) {
	u, err := policy.NewCRRA(2)
	if err != nil {
		return nil, err
	}
	hump := func(t int) float64 {
		if t >= 42 {
			return 0.5
		}
		return 1 + 0.05*float64(t) - 0.0009*float64(t*t)
	}
	certain, err := lifetime{years: 61, income: hump, utility: u, beta: 0.94, r: 0.03}.solve(ctx)
	if err != nil {
		return nil, err
	}
	const envelope = "derived: least consumption over the dates at which the limit could bind"
	out := []Check{
		{"policy", "certain income, limit 0: consumption at cash-on-hand 4", envelope, 1.637794781603, certain.Consumption(0, 0, 4), 1e-10},
		{"policy", "certain income, limit 0: consumption at cash-on-hand 20", envelope, 2.694664449157, certain.Consumption(0, 0, 20), 1e-10},
	}
	chain := &income.Chain{Nodes: []float64{-0.5, 0.5}, Transition: []float64{0.8, 0.2, 0.3, 0.7}}
	risky, err := lifetime{years: 3, income: func(int) float64 { return 1 }, chain: chain, utility: u, beta: 0.96, r: 0.03}.solve(ctx)
	if err != nil {
		return nil, err
	}
	const bisection = "derived: nested bisection of the Euler equation, without any grid"
	for _, x := range []struct {
		node    int
		m, want float64
	}{{0, 0.4, 0.4}, {0, 1, 0.73270147812}, {0, 5, 2.16083195053}, {1, 0.8, 0.78957403590}, {1, 2, 1.27586435331}} {
		out = append(out, Check{"policy", fmt.Sprintf("two-state income, limit 0, state %d: consumption at cash-on-hand %g", x.node, x.m), bisection,
			x.want, risky.Consumption(0, x.node, x.m), 1e-6})
	}
	return out, nil
}
