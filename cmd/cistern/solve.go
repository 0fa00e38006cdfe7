package main

import (
	"context"

	"github.com/spf13/cobra"

	"cistern/configs"
	"cistern/output"
	"cistern/policy"
)

func newSolveCommand(g *globals) *cobra.Command {
	return &cobra.Command{
		Use:   "solve [SCENARIO]",
		Short: "Solve the consumption rules; print them, their accuracy and risk attitudes",
		Long: `solve finds the consumption rule of every household type without simulating,
and prints consumption and the propensity to consume at chosen ages and amounts
of cash-on-hand (multiples of mean income at that age, at the middle persistent
node), with risk aversion and prudence there. --out writes the whole rule as
policy.parquet and its Euler-equation errors as accuracy.csv.`,
		Example:           "  cistern solve\n  cistern solve my-port.yaml --out runs/rule\n  cistern solve quayside --format csv",
		Args:              atMostOne("scenario"),
		ValidArgsFunction: completeScenario,
		RunE: func(cmd *cobra.Command, args []string) error {
			return solve(cmd.Context(), g, args)
		},
	}
}

func solve(ctx context.Context, g *globals, args []string) error {
	sc, err := g.scenario(args)
	if err != nil {
		return err
	}
	rules := *sc
	rules.Panel.Write = false
	if err := affordable(&rules, g.workers, g.out); err != nil {
		return err
	}
	r := &run{g: g, sc: sc, problems: sc.Problems(), hash: scenarioHash(sc)}
	if g.out != "" {
		if r, err = startRun(g, sc, g.out); err != nil {
			return err
		}
	}
	if err := r.solve(ctx); err != nil {
		return err
	}
	if err := r.judgeRules(ctx); err != nil {
		return err
	}
	if g.out != "" {
		if err := r.writeRules(ctx); err != nil {
			return err
		}
	}
	if err := g.render(ruleTable(sc, r.problems, r.rules)); err != nil {
		return err
	}
	g.say("accuracy: %s", r.accuracy.rulesSentence())
	if g.out != "" {
		g.say("files:    %s", g.out)
	}
	return nil
}

// judgeRules judges the rules between their nodes up to 20 times mean income.
func (r *run) judgeRules(ctx context.Context) error {
	highest := 0.0
	groups := make([]int, len(r.problems))
	for i, p := range r.problems {
		groups[i] = p.Group
		for t := range p.Household.Years() {
			highest = max(highest, 20*p.Household.MeanIncome(t))
		}
	}
	r.accuracy = &accuracy{groups: r.groupNames(), firstAge: r.sc.FirstAge, cells: map[cell]*errorList{}}
	return r.accuracy.judge(ctx, r.rules, [][]state{nil, between(groups, r.rules, highest)}, r.g.workers)
}

// writeRules writes the run folder of a solution without a panel.
func (r *run) writeRules(ctx context.Context) error {
	if err := r.writeScenario(ctx); err != nil {
		return err
	}
	rule := policyTable(r.sc, r.problems, r.rules)
	rule.Provenance = r.provenance()
	if err := r.write("policy.parquet", rule.WriteParquet); err != nil {
		return err
	}
	if err := r.write("accuracy.csv", r.accuracy.table(r.sc.LastAge-r.sc.FirstAge+1).WriteCSV); err != nil {
		return err
	}
	return r.folder.Finish(output.Run{Version: version(), Title: r.sc.Title, Seed: r.sc.Seed, Scenario: r.hash,
		Counts: map[string]int64{"types": int64(len(r.problems))}, Timings: r.timings, Warnings: r.warnings, Caution: caution})
}

// multiples of mean income at which rules are printed.
var multiples = []float64{0.5, 1, 2, 5, 10}

// ruleTable has a row a type, chosen age and amount of cash-on-hand.
func ruleTable(sc *configs.Scenario, problems []configs.Problem, rules []*policy.Rule) *output.Table {
	t := output.NewTable("rule")
	group := t.AddString("group", "", "group of households")
	factor := t.AddFloat("discount_factor", "a year", "discount factor")
	age := t.AddInt("age", "year", "age")
	cash := t.AddFloat("cash_on_hand", sc.Currency, "assets with their return plus net income")
	spent := t.AddFloat("consumption", sc.Currency+" a year", "consumption")
	kept := t.AddFloat("assets", sc.Currency, "assets kept")
	propensity := t.AddFloat("propensity", "", "marginal propensity to consume")
	relative := t.AddFloat("relative_risk_aversion", "", "at that consumption: -c·u''/u'")
	prudence := t.AddFloat("relative_prudence", "", "at that consumption: -c·u'''/u''")
	absolute := t.AddFloat("absolute_risk_aversion", "per "+sc.Currency, "at that consumption: -u''/u'")
	absolutePrudence := t.AddFloat("absolute_prudence", "per "+sc.Currency, "at that consumption: -u'''/u''")
	for _, c := range t.Columns {
		c.Digits = 5
	}
	for k, p := range problems {
		h := p.Household
		for year := range h.Years() {
			if a := h.FirstAge + year; a%20 != 5 && year > 0 {
				continue
			}
			for _, x := range multiples {
				m := x * h.MeanIncome(year)
				curve := &rules[k].Curves[year][h.Nodes()/2]
				c, d := curve.At(m)
				group.AppendString(sc.Groups[p.Group].Name)
				factor.AppendFloat(h.DiscountFactor)
				age.AppendInt(int64(h.FirstAge + year))
				cash.AppendFloat(m)
				spent.AppendFloat(c)
				kept.AppendFloat(m - c)
				propensity.AppendFloat(d)
				relative.AppendFloat(h.Utility.RelativeRiskAversion(c))
				prudence.AppendFloat(h.Utility.RelativePrudence(c))
				absolute.AppendFloat(h.Utility.AbsoluteRiskAversion(c))
				absolutePrudence.AppendFloat(h.Utility.AbsolutePrudence(c))
			}
		}
	}
	return t
}
