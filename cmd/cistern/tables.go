package main

import (
	"context"

	"cistern/configs"
	"cistern/output"
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
	return r.write("accuracy.csv", r.accuracy.table(r.sc.LastAge-r.sc.FirstAge+1).WriteCSV)
}

// policyTable is policy.parquet: the rules at their nodes.
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
				c := &rules[k].Curves[year][node]
				for i, m := range c.Cash {
					column("group").AppendString(sc.Groups[p.Group].Name)
					if types {
						column("discount_factor").AppendFloat(h.DiscountFactor)
					}
					column("age").AppendInt(int64(h.FirstAge + year))
					column("persistent").AppendFloat(z)
					column("cash_on_hand").AppendFloat(m)
					column("consumption").AppendFloat(c.Consumption[i])
					column("assets").AppendFloat(m - c.Consumption[i])
					column("propensity").AppendFloat(c.Right[i])
				}
			}
		}
	}
	return t
}
