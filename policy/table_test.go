package policy

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// The table must give what the curves give: at nodes, next to them, between them,
// at the limit, above the grid, for every family of curve.
func TestTableMatchesCurves(t *testing.T) {
	natural := riskyHousehold(t)
	natural.Limit = Limit{Kind: LimitNatural}
	linear := DefaultOptions()
	linear.Interpolation = Linear
	for _, tt := range []struct {
		name string
		rule *Rule
	}{
		{"limit 0", solve(t, riskyHousehold(t), DefaultOptions())},
		{"limit 0, linear", solve(t, riskyHousehold(t), linear)},
		{"natural limit", solve(t, natural, DefaultOptions())},
		{"no limit", solve(t, exponentialHousehold(t, 1, rouwenhorst(t, 7, 0.95, 2000)), DefaultOptions())},
	} {
		t.Run(tt.name, func(t *testing.T) {
			random := rand.New(rand.NewPCG(1, 2))
			for year := range tt.rule.Curves {
				tb := tt.rule.Table(year)
				for node := range tt.rule.Curves[year] {
					compareTable(t, tb, &tt.rule.Curves[year][node], node, random)
				}
			}
		})
	}
}

func compareTable(t *testing.T, tb *Table, c *Curve, node int, random *rand.Rand) {
	t.Helper()
	var cash []float64
	span := c.Top() - c.Cash[0]
	for _, m := range c.Cash {
		cash = append(cash, m, math.Nextafter(m, math.Inf(-1)), math.Nextafter(m, math.Inf(1)))
	}
	for range 100 {
		cash = append(cash, c.Cash[0]+span*(1.1*random.Float64()-0.05), c.Cash[0]+span*math.Exp(-10*random.Float64()))
	}
	cash = append(cash, c.Top()+10*span, c.Top()+1e6*span, c.Cash[0]-span/10)
	nodes := make([]uint8, len(cash))
	for i := range nodes {
		nodes[i] = uint8(node)
	}
	only, consumption, propensity := make([]float64, len(cash)), make([]float64, len(cash)), make([]float64, len(cash))
	tb.Evaluate(nodes, cash, only, nil)
	tb.Evaluate(nodes, cash, consumption, propensity)
	for i, m := range cash {
		x, d := c.At(m)
		tolerance := 1e-13 * (math.Abs(x) + span)
		if math.Abs(only[i]-x) > tolerance || math.Abs(consumption[i]-x) > tolerance || math.Abs(propensity[i]-d) > 1e-9 {
			t.Fatalf("node %d, cash %v: consumption %v, %v, propensity %v; want %v, %v", node, m, only[i], consumption[i], propensity[i], x, d)
		}
	}
}

var evaluated float64

// BenchmarkTable evaluates a rule at states spread as those of a panel are.
func BenchmarkTable(b *testing.B) {
	for _, method := range []Interpolation{Linear, Cubic} {
		b.Run(fmt.Sprint("interpolation=", method), func(b *testing.B) {
			h, o := referenceHousehold(b, "S", 2)
			o.Interpolation = method
			rule, err := NewSolver(h.Years()).Solve(b.Context(), h, o)
			if err != nil {
				b.Fatal(err)
			}
			tb := rule.Table(20)
			random := rand.New(rand.NewPCG(1, 2))
			const n = 1024
			node, cash, consumption := make([]uint8, n), make([]float64, n), make([]float64, n)
			for i := range node {
				node[i], cash[i] = uint8(random.IntN(7)), 0.5*math.Exp(2+1.2*random.NormFloat64())
			}
			for b.Loop() {
				tb.Evaluate(node, cash, consumption, nil)
				evaluated = consumption[n-1]
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/n, "ns/state")
		})
	}
}
