package decomposition

import (
	"fmt"
	"math"

	"cistern/policy"
	"cistern/sim"
)

// Premium returns the equivalent premium of income risk of every group, a share of
// consumption. p holds the rules with risk and, as twins, those without.
func Premium(p *sim.Population) ([]float64, error) {
	var out []float64
	for _, g := range p.Groups {
		var risky, certain []*policy.Rule
		for _, i := range g.Types {
			if p.Types[i].Twin == nil {
				return nil, fmt.Errorf("decomposition: group %s has no certain twins", g.Name)
			}
			risky, certain = append(risky, p.Types[i].Rule), append(certain, p.Types[i].Twin)
		}
		premium, err := policy.EquivalentPremium(risky, certain, begins(p.Types[g.Types[0]].Start))
		if err != nil {
			return nil, fmt.Errorf("group %s: %w", g.Name, err)
		}
		out = append(out, premium)
	}
	return out, nil
}

// begins is the law of start assets as points: its mass at zero, and the lognormal
// part at even distances of six standard deviations either way (the trapezoid rule,
// whose error for a smooth function falls faster than any power).
func begins(s sim.Start) []policy.Begin {
	if !(s.Median > 0) {
		return []policy.Begin{{Assets: s.Constant, Probability: 1}}
	}
	if s.LogSD == 0 {
		return []policy.Begin{{Assets: 0, Probability: s.ZeroShare}, {Assets: s.Median, Probability: 1 - s.ZeroShare}}
	}
	const points, reach = 97, 6.0
	list := []policy.Begin{{Assets: 0, Probability: s.ZeroShare}}
	total := 0.0
	for i := range points {
		x := reach * (2*float64(i)/(points-1) - 1)
		w := math.Exp(-x * x / 2)
		total += w
		list = append(list, policy.Begin{Assets: s.Median * math.Exp(s.LogSD*x), Probability: w})
	}
	for i := range list[1:] {
		list[i+1].Probability *= (1 - s.ZeroShare) / total
	}
	return list
}
