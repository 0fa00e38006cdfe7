package main

import (
	"fmt"
	"math"

	"github.com/spf13/cobra"

	"cistern/configs"
	"cistern/income"
	"cistern/output"
)

func newIncomeCommand(g *globals) *cobra.Command {
	return &cobra.Command{
		Use:   "income [SCENARIO]",
		Short: "Compare the discretised income process with the process itself",
		Long: `income prints, for every group, moments of the Markov chain that stands for the
persistent part of income beside those of the process, the chain's conditional
moments at every node, and a remark where the chain is a poor stand-in.`,
		Example:           "  cistern income\n  cistern income quayside --set income.persistent.method=tauchen --set income.persistent.autocorrelation=0.99",
		Args:              atMostOne("scenario"),
		ValidArgsFunction: completeScenario,
		RunE: func(cmd *cobra.Command, args []string) error {
			sc, err := g.scenario(args)
			if err != nil {
				return err
			}
			if err := g.render(momentsTable(sc)); err != nil {
				return err
			}
			for _, group := range sc.Groups {
				for _, remark := range remarks(group) {
					g.say("%s: %s", group.Name, remark)
				}
			}
			return nil
		},
	}
}

// remarks says where a group's chain and nodes are poor stand-ins.
func remarks(g configs.Group) []string {
	e := g.Household.Earnings
	p := income.AR1{Autocorrelation: g.Process.Autocorrelation, InnovationSD: g.Process.InnovationSD}
	out := append(income.Remarks(p, e.Chain), e.Transitory.Remarks()...)
	if sd := g.Process.InitialSD; !math.IsNaN(sd) {
		out = append(out, e.Chain.ProjectionRemarks(sd)...)
	}
	return out
}

// momentsTable has a row a group and moment, chain and process side by side.
func momentsTable(sc *configs.Scenario) *output.Table {
	t := output.NewTable("income")
	group := t.AddString("group", "", "group of households")
	moment := t.AddString("moment", "", "moment of the persistent part z")
	chain := t.AddFloat("chain", "", "of the Markov chain")
	process := t.AddFloat("process", "", "of the autoregressive process")
	row := func(g, name string, c, p float64) {
		group.AppendString(g)
		moment.AppendString(name)
		chain.AppendFloat(c)
		process.AppendFloat(p)
	}
	for _, g := range sc.Groups {
		ar := income.AR1{Autocorrelation: g.Process.Autocorrelation, InnovationSD: g.Process.InnovationSD}
		c := g.Household.Earnings.Chain
		if c.Len() == 1 {
			row(g.Name, "sd", 0, 0)
			continue
		}
		m, truth := c.Moments(c.Stationary()), ar.Moments()
		row(g.Name, "mean", m.Mean, truth.Mean)
		row(g.Name, "sd", m.SD, truth.SD)
		row(g.Name, "autocorrelation", m.Autocorrelation, truth.Autocorrelation)
		row(g.Name, "skewness", m.Skewness, truth.Skewness)
		row(g.Name, "kurtosis", m.Kurtosis, truth.Kurtosis)
		for _, k := range c.Conditionals(ar) {
			row(g.Name, fmt.Sprintf("mean next year at z = %.4g", k.Node), k.Mean, k.TrueMean)
			row(g.Name, fmt.Sprintf("sd next year at z = %.4g", k.Node), k.SD, k.TrueSD)
		}
	}
	return t
}
