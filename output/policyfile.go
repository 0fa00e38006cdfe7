package output

// PolicyTable returns the empty table of policy.parquet, the consumption rule:
// one row a group, age, persistent node and cash-on-hand node, in that order,
// in the currency given. The columns are group, age, persistent, cash_on_hand,
// consumption, assets and propensity; with entitlement there is a column of
// that name after persistent.
//
// A rule with several types per group (discount factors) has one more column,
// discount_factor, after group.
func PolicyTable(currency string, entitlement, types bool) *Table {
	t := NewTable("policy")
	t.AddString("group", "", "group of households the rule is for")
	if types {
		t.AddFloat("discount_factor", "a year", "discount factor of the households the rule is for")
	}
	t.AddInt("age", "year", "age at which the rule applies")
	t.AddFloat("persistent", "", "node of the persistent part z of earnings: log points, or money a year in form level")
	if entitlement {
		t.AddFloat("entitlement", "", "node of the pension entitlement")
	}
	t.AddFloat("cash_on_hand", currency, "assets with their return plus net income, before consumption: a node of the rule")
	t.AddFloat("consumption", currency+" a year", "consumption at that cash-on-hand")
	t.AddFloat("assets", currency, "assets kept at the end of the year: cash-on-hand less consumption")
	t.AddFloat("propensity", "", "consumption out of one more unit of cash-on-hand, dc/dm")
	return t
}
