package evidence

import (
	"context"
	"fmt"
	"math"

	"cistern/income"
	"cistern/policy"
	"cistern/sim"
)

// panelHouseholds is the size of the simulated panel: its Monte Carlo error is what
// the tolerances, four standard errors, are made of.
const panelHouseholds = 40960

// panel compares a simulated panel with what is known of its population.
func panel(ctx context.Context) ([]Check, error) {
	p, err := panelPopulation(ctx)
	if err != nil {
		return nil, err
	}
	h := p.Types[0].Rule.Household
	var earnings tally
	survivors := make([]int64, h.Years())
	broken := 0.0
	const judged = 20 // year in which mean earnings are compared
	_, err = sim.Simulate(ctx, p, sim.Options{Columns: sim.Sources | sim.States}, func(_ int, b *sim.Block) (func() error, error) {
		for _, r := range b.Runs {
			survivors[r.T] += int64(r.To - r.From)
			for k := r.From; k < r.To; k++ {
				if r.T == judged {
					earnings.add(b.Earnings[k])
				}
				want := p.Types[0].Rule.Consumption(r.T, int(b.Node[k]), b.CashOnHand[k])
				broken = math.Max(broken, math.Abs(b.Consumption[k]/want-1))
				broken = math.Max(broken, math.Abs(b.CashOnHand[k]-b.Consumption[k]-b.Assets[k]))
			}
		}
		return nil, nil
	})
	if err != nil {
		return nil, err
	}
	out := []Check{
		{"sim", "panel: largest departure of a row from the rule and the budget", "derived: accounting of the model", 0, broken, 1e-12},
		{"sim", fmt.Sprintf("panel: mean earnings at age %d over the profile", h.FirstAge+judged), "derived: the profile is mean earnings; 4 standard errors",
			1, earnings.mean() / h.Earnings.Mean(judged), 4 * earnings.standardError() / h.Earnings.Mean(judged)},
	}
	alive := 1.0
	for t, s := range h.Survival[:60] {
		if age := h.FirstAge + t; age == 65 || age == 80 {
			share := float64(survivors[t]) / panelHouseholds
			out = append(out, Check{"sim", fmt.Sprintf("panel: share alive at age %d", age), "derived: product of the survival probabilities; 4 standard errors",
				alive, share, 4 * math.Sqrt(alive*(1-alive)/panelHouseholds)})
		}
		alive *= s
	}
	return out, nil
}

func panelPopulation(ctx context.Context) (*sim.Population, error) {
	chain, err := income.Rouwenhorst{Points: 7}.Discretise(income.AR1{Autocorrelation: 0.95, InnovationSD: 0.15})
	if err != nil {
		return nil, err
	}
	e, err := income.Process{FirstAge: 25, Profile: income.Polynomial(income.Log, []float64{0, 0.04, -0.0007}, 25, 25, 40), Chain: chain,
		Initial: chain.Project(0.3), Transitory: income.Transitory{SD: 0.2, Nodes: 15}, JobLoss: income.JobLoss{Probability: 0.04, BenefitRate: 0.5}}.Build()
	if err != nil {
		return nil, err
	}
	survival, err := income.Gompertz{ModalAge: 88, Dispersion: 10}.Survival(25, 100)
	if err != nil {
		return nil, err
	}
	u, err := policy.NewCRRA(2)
	if err != nil {
		return nil, err
	}
	rule, err := policy.Solve(ctx, policy.Household{FirstAge: 25, Survival: survival, Utility: u, DiscountFactor: 0.96, Return: 0.03, Earnings: e,
		Pension: policy.Pension{ClaimAge: 65, FinalEarningsRate: 0.4, Flat: 0.1}}, policy.DefaultOptions())
	if err != nil {
		return nil, err
	}
	return &sim.Population{Seed: 1, Households: panelHouseholds, Groups: []sim.Group{{Name: "pilots", Share: 1, Types: []int{0}}},
		Types: []sim.Type{{Rule: rule, Start: sim.Start{Median: 0.5, LogSD: 1, ZeroShare: 0.3}}}}, nil
}

// tally adds up a mean and its standard error (Welford 1962, Technometrics 4).
type tally struct{ n, m, s float64 }

func (t *tally) add(x float64) {
	t.n++
	d := x - t.m
	t.m += d / t.n
	t.s += d * (x - t.m)
}

func (t *tally) mean() float64          { return t.m }
func (t *tally) standardError() float64 { return math.Sqrt(t.s / (t.n - 1) / t.n) }
