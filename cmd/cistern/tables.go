package main

import (
	"context"
	"math"

	"cistern/configs"
	"cistern/output"
	"cistern/output/mobility"
	"cistern/policy"
)

// writeTables writes rule, summary and accuracy.
func (r *run) writeTables(context.Context) error {
	rule := policyTable(r.sc, r.problems, r.rules)
	rule.Provenance = r.provenance()
	if err := r.write("policy.parquet", rule.WriteParquet); err != nil {
		return err
	}
	summary := r.summary.Table()
	summary.Provenance = r.provenance()
	if err := r.write("summary.parquet", summary.WriteParquet); err != nil {
		return err
	}
	if err := r.write("summary.csv", summary.WriteCSV); err != nil {
		return err
	}
	if len(r.mobility) > 0 {
		moves := mobility.Table(r.mobility)
		moves.Provenance = r.provenance()
		r.tables.mobility = moves
		if err := r.write("mobility.parquet", moves.WriteParquet); err != nil {
			return err
		}
		if err := r.write("mobility.csv", moves.WriteCSV); err != nil {
			return err
		}
	}
	errors := r.accuracy.table(r.sc.LastAge - r.sc.FirstAge + 1)
	r.tables.summary, r.tables.policy, r.tables.accuracy = summary, rule, errors
	return r.write("accuracy.csv", errors.WriteCSV)
}

// policyTable is policy.parquet: the rules at their nodes. Where a borrowing limit
// binds below the first node there is a row for the least cash-on-hand as well,
// from which the rule rises one for one.
func policyTable(sc *configs.Scenario, problems []configs.Problem, rules []*policy.Rule) *output.Table {
	types := false
	for _, g := range sc.Groups {
		types = types || len(g.Discounts) > 1
	}
	t := output.PolicyTable(sc.Currency, false, types)
	column := t.Column
	for k, p := range problems {
		h := p.Household
		for year := range rules[k].Curves {
			for node, z := range h.Earnings.Chain.Nodes {
				row := func(m, c, propensity float64) {
					column("group").AppendString(sc.Groups[p.Group].Name)
					if types {
						column("discount_factor").AppendFloat(h.DiscountFactor)
					}
					column("age").AppendInt(int64(h.FirstAge + year))
					column("persistent").AppendFloat(z)
					column("cash_on_hand").AppendFloat(m)
					column("consumption").AppendFloat(c)
					column("assets").AppendFloat(m - c)
					column("propensity").AppendFloat(propensity)
				}
				c := &rules[k].Curves[year][node]
				if least := math.Max(h.Utility.Infimum(), 0); !math.IsInf(c.Bound, -1) && c.Cash[0] > c.Bound+least {
					row(c.Bound+least, least, 1) // from here to the first node the limit binds
				}
				for i, m := range c.Cash {
					row(m, c.Consumption[i], c.Right[i])
				}
			}
		}
	}
	return t
}
