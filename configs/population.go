package configs

import (
	"cistern/policy"
	"cistern/sim"
)

// Problem is one household type to solve: a group with one discount factor.
type Problem struct {
	Group     int // index into Scenario.Groups
	Household policy.Household
}

// Problems returns the household types of all groups, in the order of groups and
// discount factors: the types of Population.
func (sc *Scenario) Problems() []Problem {
	var out []Problem
	for g, group := range sc.Groups {
		for _, beta := range group.Discounts {
			h := group.Household
			h.DiscountFactor = beta
			out = append(out, Problem{g, h})
		}
	}
	return out
}

// Population returns what is to be simulated, given the rules of all Problems and,
// unless twins is nil, of their certain twins.
func (sc *Scenario) Population(rules, twins []*policy.Rule) *sim.Population {
	p := &sim.Population{Seed: sc.Seed, Households: sc.Households}
	for _, g := range sc.Groups {
		group := sim.Group{Name: g.Name, Share: g.Share}
		for range g.Discounts {
			t := sim.Type{Group: len(p.Groups), Rule: rules[len(p.Types)], Start: g.Start}
			if twins != nil {
				t.Twin = twins[len(p.Types)]
			}
			group.Types = append(group.Types, len(p.Types))
			p.Types = append(p.Types, t)
		}
		p.Groups = append(p.Groups, group)
	}
	return p
}
