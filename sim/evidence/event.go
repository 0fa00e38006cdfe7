package evidence

import (
	"context"
	"fmt"

	"cistern/income"
	"cistern/policy"
	"cistern/sim/stress"
)

// events compares what an unforeseen fall of the persistent part of income does to
// consumption with the closed form of exponential utility.
func events(ctx context.Context) ([]Check, error) {
	u, err := policy.NewCARA(2)
	if err != nil {
		return nil, err
	}
	chain, err := income.Rouwenhorst{Points: 5}.Discretise(income.AR1{Autocorrelation: 0.9, InnovationSD: 0.1})
	if err != nil {
		return nil, err
	}
	var out []Check
	for _, x := range []struct {
		ahead int
		psi   float64
	}{{1, 0.9509803922}, {20, 0.4846961993}, {40, 0.3563151243}} {
		usual, err := lifetime{years: x.ahead + 1, income: func(int) float64 { return 1 }, chain: chain, utility: u, beta: 0.96, r: 0.04,
			limit: policy.Limit{Kind: policy.LimitNone}}.solve(ctx)
		if err != nil {
			return nil, err
		}
		const fall = 0.1
		rule, err := stress.Rule(ctx, usual, &stress.Event{Persistent: -fall, LastAge: 200}, 0.9, 0, policy.DefaultOptions())
		if err != nil {
			return nil, err
		}
		// income of the year itself is lower, too
		lost := usual.Consumption(0, 2, 1) - rule.Consumption(0, 2, 1-fall)
		out = append(out, Check{"sim", fmt.Sprintf("unforeseen fall of persistent income, autocorrelation 0.9, %d years ahead: fall of consumption a crown", x.ahead),
			"derived: Flavin (1981), Journal of Political Economy 89, for a finite life", x.psi, lost / fall, 1e-9})
	}
	return out, nil
}
