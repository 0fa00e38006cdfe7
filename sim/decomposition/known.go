package decomposition

import (
	"fmt"
	"math"

	"cistern/policy"
	"cistern/sim"
)

// liveKnowing lets households live who know how long they have. Income is certain,
// so a life follows from its length, its type and what it begins with, and these from
// the usual simulation.
func (r *run) liveKnowing(k int, stage string) error {
	years := r.p.Years()
	var problems []policy.Household
	for _, h := range r.households {
		for lives := 1; lives <= years; lives++ {
			problems = append(problems, knowing(h, lives))
		}
	}
	rules, err := r.solve(problems, stage)
	if err != nil {
		return err
	}
	p := *r.p // deaths and beginnings are the same whatever the rules
	return r.simulate(&p, stage, func(b *sim.Block, s *sums) error {
		lives := make([]int, b.Households)
		for _, id := range b.Household {
			lives[id-b.First]++
		}
		for _, run := range b.Runs {
			if run.T > 0 {
				continue
			}
			R := 1 + r.p.Types[run.Type].Rule.Household.ReturnIn(0)
			for i := run.From; i < run.To; i++ {
				id := b.Household[i]
				rule := rules[run.Type*years+lives[id-b.First]-1]
				if err := follow(rule, (b.CashOnHand[i]-b.Income[i])/R, func(t int, assets float64) {
					s.cell(t, run.Group).assets[id%Parts] += assets
				}); err != nil {
					return fmt.Errorf("decomposition: household %d, group %s, %s: %w", id, r.p.Groups[run.Group].Name, stage, err)
				}
			}
		}
		return nil
	}, k)
}

// knowing is a household that lives exactly the given number of years.
func knowing(h policy.Household, lives int) policy.Household {
	h.Survival = make([]float64, lives)
	for t := range lives - 1 {
		h.Survival[t] = 1
	}
	if h.Returns != nil {
		h.Returns = h.Returns[:lives]
	}
	if h.Pension.Worth != nil {
		h.Pension.Worth = h.Pension.Worth[:lives]
	}
	return h
}

// follow goes through a certain life that begins with assets and tells what is held
// at the end of every year.
func follow(rule *policy.Rule, assets float64, hold func(t int, assets float64)) error {
	h := &rule.Household
	for t := range rule.Curves {
		income, _ := h.Income(t, 0)
		cash := float64((1+h.ReturnIn(t))*assets) + income[0]
		c := rule.Consumption(t, 0, cash)
		if !(c > h.Utility.Infimum()) || math.IsInf(c, 0) {
			return fmt.Errorf("at age %d cash-on-hand %.6g leaves consumption %.6g, which utility does not allow", h.FirstAge+t, cash, c)
		}
		assets = cash - c
		hold(t, assets)
	}
	return nil
}
