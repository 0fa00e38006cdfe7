package report

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"cistern/output"
)

// ruleKey says whose rule a row of policy.parquet belongs to.
type ruleKey struct {
	group string
	age   int64
	node  float64
}

// curve is a consumption rule: its nodes, cash-on-hand ascending.
type curve struct{ cash, consumption []float64 }

// readRules picks the rules of some ages and of the lowest, middle and highest
// persistent node out of the table, of the middle discount factor where there are
// several.
func readRules(t *output.Table, ages []int64) (groups []string, nodes map[string][]float64, rules map[ruleKey]*curve) {
	group, age, node := t.Column("group"), t.Column("age"), t.Column("persistent")
	cash, consumption, discount := t.Column("cash_on_hand"), t.Column("consumption"), t.Column("discount_factor")
	factors := map[string][]float64{}
	nodes = map[string][]float64{}
	for i := range t.Len() { // nodes and factors of every group, in its first age
		g := group.Strings[i]
		if !slices.Contains(groups, g) {
			groups = append(groups, g)
		}
		if z := node.Floats[i]; len(nodes[g]) == 0 || nodes[g][len(nodes[g])-1] != z && !slices.Contains(nodes[g], z) {
			nodes[g] = append(nodes[g], z)
		}
		if discount != nil && !slices.Contains(factors[g], discount.Floats[i]) {
			factors[g] = append(factors[g], discount.Floats[i])
		}
	}
	rules = map[ruleKey]*curve{}
	for g := range nodes {
		slices.Sort(nodes[g])
		slices.Sort(factors[g])
		n := nodes[g]
		nodes[g] = slices.Compact([]float64{n[0], n[len(n)/2], n[len(n)-1]})
	}
	for i := range t.Len() {
		g := group.Strings[i]
		if !slices.Contains(ages, age.Ints[i]) || !slices.Contains(nodes[g], node.Floats[i]) {
			continue
		}
		if f := factors[g]; discount != nil && discount.Floats[i] != f[len(f)/2] {
			continue
		}
		k := ruleKey{g, age.Ints[i], node.Floats[i]}
		if rules[k] == nil {
			rules[k] = &curve{}
		}
		rules[k].cash = append(rules[k].cash, cash.Floats[i])
		rules[k].consumption = append(rules[k].consumption, consumption.Floats[i])
	}
	return groups, nodes, rules
}

// until returns the curve up to cash-on-hand most, with at most n of its nodes.
func (c *curve) until(most float64, n int) (x, y []float64) {
	k := 0
	for k < len(c.cash) && c.cash[k] <= most {
		k++
	}
	every := max(1, k/n)
	for i := 0; i < k; i++ {
		if i%every == 0 || i == k-1 {
			x, y = append(x, c.cash[i]), append(y, c.consumption[i])
		}
	}
	if k > 0 && k < len(c.cash) && c.cash[k-1] < most {
		f := (most - c.cash[k-1]) / (c.cash[k] - c.cash[k-1])
		x, y = append(x, most), append(y, c.consumption[k-1]+f*(c.consumption[k]-c.consumption[k-1]))
	}
	return x, y
}

// rules shows how much is consumed out of what is at hand.
func rules(r *Run, s *summary) Section {
	section := Section{ID: "rules", Title: "The consumption rule"}
	if r.Policy == nil || r.Policy.Len() == 0 || len(s.ages) == 0 {
		return section
	}
	first, last := s.ages[0], s.ages[len(s.ages)-1]
	var ages []int64
	for i := range 4 {
		a := first + (last-first)*(2*i+1)/10
		if last-first >= 20 {
			a = (a + 2) / 5 * 5
		}
		if a = min(max(a, first), last); !slices.Contains(ages, int64(a)) {
			ages = append(ages, int64(a))
		}
	}
	groups, nodes, rules := readRules(r.Policy, ages)
	// The middle node is what a reader should see first.
	c := Chart{ID: "consumption-rule", Title: "Consumption out of cash-on-hand", Choice: "Rule of", X: money("cash-on-hand", r, false), Y: money("consumption", r, true),
		Caption: "Cash-on-hand is last year's assets with their return, and this year's income. Where the limit binds the line has slope one."}
	for _, g := range groups {
		most := reach(s, g)
		for i, z := range nodes[g] {
			option := g
			if len(nodes[g]) > 1 {
				option += []string{", lowest", ", middle", ", highest"}[i*2/(len(nodes[g])-1)] + " persistent income"
			}
			v := View{Option: option}
			for k, a := range ages {
				rule := rules[ruleKey{g, a, z}]
				if rule == nil {
					continue
				}
				name := fmt.Sprintf("age %d", a)
				line := Series{}
				line.X, line.Y = rule.until(most, 60)
				v.Series = append(v.Series, line.named(name, name, k))
			}
			c.Views = append(c.Views, v)
		}
	}
	slices.SortStableFunc(c.Views, func(a, b View) int { return middleFirst(a.Option) - middleFirst(b.Option) })
	section.add(c)
	return section
}

func middleFirst(option string) int {
	if strings.HasSuffix(option, ", lowest persistent income") || strings.HasSuffix(option, ", highest persistent income") {
		return 1
	}
	return 0
}

// reach is the cash-on-hand up to which a rule is shown: what the richest twentieth
// of the group has at its richest age.
func reach(s *summary, group string) float64 {
	most := 0.0
	for _, a := range s.ages {
		levels := s.levelsOf("assets", "percentile")
		if len(levels) == 0 {
			break
		}
		level := levels[len(levels)-1]
		for _, l := range levels {
			if l >= 90 {
				level = l
				break
			}
		}
		wealth, _ := s.at(group, a, "assets", "percentile", level)
		income, _ := s.at(group, a, "income", "mean", nan)
		if x := wealth.Value + income.Value; finite(x) {
			most = math.Max(most, x)
		}
	}
	if !(most > 0) {
		return math.Inf(1)
	}
	return most
}
