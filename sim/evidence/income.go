package evidence

import (
	"context"
	"fmt"
	"math"

	"cistern/income"
)

// chains compares discretised processes with published and exact moments.
func chains(context.Context) ([]Check, error) {
	var out []Check
	const table = "published: Tauchen (1986), Economics Letters 20, Table 1 (from memory; recomputed)"
	for _, r := range []struct {
		points           int
		rho, printed, sd float64 // Table 1: autocorrelation and standard deviation of the chain
	}{
		{9, 0.1, 0.100, 0.103}, {9, 0.8, 0.798, 0.176}, {9, 0.9, 0.898, 0.253}, {5, 0.9, 0.932, 0.291},
	} {
		p := income.AR1{Autocorrelation: r.rho, InnovationSD: 0.1}
		c, err := income.Tauchen{Points: r.points, Span: 3}.Discretise(p)
		if err != nil {
			return nil, err
		}
		m := c.Moments(c.Stationary())
		name := fmt.Sprintf("Tauchen chain, %d points, persistence %g", r.points, r.rho)
		out = append(out,
			Check{"income", name + ": autocorrelation", table, r.printed, m.Autocorrelation, 5.1e-4},
			Check{"income", name + ": standard deviation", table, r.sd, m.SD, 5.1e-4})
	}
	const exact = "derived: Kopecky & Suen (2010), Review of Economic Dynamics 13: exact for every persistence"
	for _, rho := range []float64{0.5, 0.95, 0.999} {
		p := income.AR1{Autocorrelation: rho, InnovationSD: 0.15}
		c, err := income.Rouwenhorst{Points: 7}.Discretise(p)
		if err != nil {
			return nil, err
		}
		m := c.Moments(c.Stationary())
		name := fmt.Sprintf("Rouwenhorst chain, 7 points, persistence %g", rho)
		out = append(out,
			Check{"income", name + ": autocorrelation", exact, rho, m.Autocorrelation, 1e-11},
			Check{"income", name + ": standard deviation over the process's", exact, 1, m.SD / p.StationarySD(), 1e-11},
			Check{"income", name + ": kurtosis", exact, 3 - 2.0/6, m.Kurtosis, 1e-10},
			Check{"income", name + ": conditional standard deviation at the lowest node", exact, 0.15, c.Conditionals(p)[0].SD, 1e-12})
	}
	return append(out, lifeTable()...), nil
}

// lifeTable checks expectancy on a table with a known answer: the hazard
// 0.0003 + 0.000008·1.115^x, integrated exactly over each year of age.
func lifeTable() []Check {
	l := income.LifeTable{FirstAge: 20}
	for x := 20; x <= 130; x++ {
		integral := 3e-4 + 8e-6*math.Pow(1.115, float64(x))*0.115/math.Log(1.115)
		l.Q = append(l.Q, -math.Expm1(-integral))
	}
	s, err := l.Survival(20, 130)
	if err != nil {
		return nil
	}
	alive := 1.0
	for t := range 45 {
		alive *= s[t]
	}
	return []Check{{"income", "life table: share of those aged 20 who reach 65", "derived: exact integral of the hazard 3e-4 + 8e-6·1.115^x",
		0.9050456643, alive, 1e-9}}
}
