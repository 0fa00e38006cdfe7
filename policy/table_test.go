package policy

import (
	"fmt"
	"math"
	"math/rand/v2"
	"sort"
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
		// The same operations in the same order: equal to the bit where products and
		// sums are not fused, to a rounding of the largest term elsewhere.
		cTerms, dTerms := terms(c, m)
		if m < c.Cash[0] && !math.IsInf(c.Bound, -1) && only[i] != m-c.Bound {
			t.Fatalf("node %d, cash %v at the limit: consumption %v, want exactly %v", node, m, only[i], m-c.Bound)
		}
		if math.Abs(only[i]-x) > 4e-16*cTerms || consumption[i] != only[i] || !(math.Abs(propensity[i]-d) <= 4e-16*dTerms) {
			t.Fatalf("node %d, cash %v: consumption %v, %v, propensity %v; want %v, %v", node, m, only[i], consumption[i], propensity[i], x, d)
		}
	}
}

// terms returns the sizes of the terms that consumption and the propensity at m are
// sums of.
func terms(c *Curve, m float64) (consumption, propensity float64) {
	j := sort.Search(len(c.Cash), func(i int) bool { return c.Cash[i] > m }) - 1
	if j < 0 || j == len(c.Cash)-1 {
		x, d := c.At(m)
		return math.Abs(x) + math.Abs(m), math.Abs(d)
	}
	c1, c2, c3 := c.cubic(j)
	u := m - c.Cash[j]
	a, b, d := math.Abs(u*c1), math.Abs(u*u*c2), math.Abs(u*u*u*c3)
	return math.Abs(c.Consumption[j]) + a + b + d, math.Abs(c1) + math.Abs(2*u*c2) + math.Abs(3*u*u*c3)
}

// Curves that no solver would give, to find where the guide fails: few and many
// nodes, spaced evenly or over many orders of magnitude, in debt, at one place or
// far apart for different persistent nodes.
func TestTableOnRandomCurves(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 4))
	for trial := range 300 {
		nodes := 1 + random.IntN(5)
		r := &Rule{Curves: [][]Curve{make([]Curve, nodes)}}
		for j := range r.Curves[0] {
			r.Curves[0][j] = randomCurve(random, 1+random.IntN(1+trial))
		}
		checkTable(t, r, random)
	}
	r := &Rule{Curves: [][]Curve{{randomCurve(random, 3), randomCurve(random, 100_000)}}}
	checkTable(t, r, random)
}

func checkTable(t *testing.T, r *Rule, random *rand.Rand) {
	t.Helper()
	tb := r.Table(0)
	for j := range r.Curves[0] {
		compareTable(t, tb, &r.Curves[0][j], j, random)
		if top := r.Curves[0][j].Top(); tb.Top(j) != top {
			t.Fatalf("top of node %d: %v, want %v", j, tb.Top(j), top)
		}
	}
}

func randomCurve(random *rand.Rand, n int) Curve {
	m := 1e3 * random.NormFloat64() * math.Exp(3*random.NormFloat64())
	c := Curve{Bound: m - random.ExpFloat64()}
	if random.IntN(3) == 0 {
		c.Bound = math.Inf(-1)
	}
	spread := 6 * random.Float64()
	for range n {
		c.Cash = append(c.Cash, m)
		c.Consumption = append(c.Consumption, random.NormFloat64())
		c.Left, c.Right = append(c.Left, random.NormFloat64()), append(c.Right, random.NormFloat64())
		m = math.Max(m+random.ExpFloat64()*math.Exp(spread*random.NormFloat64()), math.Nextafter(m, math.Inf(1)))
	}
	return c
}

// What is not a number must come out so, not as another state's consumption.
func TestTableOnNaN(t *testing.T) {
	tb := solve(t, riskyHousehold(t), DefaultOptions()).Table(3)
	out := []float64{1, 1, 1}
	tb.Evaluate([]uint8{0, 1, 2}, []float64{math.NaN(), math.NaN(), math.Inf(1)}, out, nil)
	if !math.IsNaN(out[0]) || !math.IsNaN(out[1]) || !(math.IsNaN(out[2]) || math.IsInf(out[2], 1)) {
		t.Errorf("consumption at cash-on-hand NaN, NaN, +Inf: %v", out)
	}
}

// Without nodes, the first; and any number of states at a time.
func TestTableWithoutNodes(t *testing.T) {
	r := solve(t, riskyHousehold(t), DefaultOptions())
	tb := r.Table(3)
	for _, n := range []int{0, 1, 255, 256, 257, 1000} {
		cash, out := make([]float64, n), make([]float64, n)
		for i := range cash {
			cash[i] = 0.1 + float64(i)/50
		}
		tb.Evaluate(nil, cash, out, nil)
		for i, c := range out {
			if want := r.Consumption(3, 0, cash[i]); math.Abs(c-want) > 4e-16*(want+cash[i]) {
				t.Fatalf("state %d of %d: %v, want %v", i, n, c, want)
			}
		}
	}
}

// The guide is worth its memory: hardly a state of a solved rule needs more than
// the one branch-free step.
func TestTableGuideIsSharp(t *testing.T) {
	r := solve(t, riskyHousehold(t), DefaultOptions())
	far, states := 0, 0
	for year := range r.Curves {
		tb := r.Table(year)
		for j := range r.Curves[year] {
			c := &r.Curves[year][j]
			for i := range 1000 {
				m := c.Cash[0] + (c.Top()-c.Cash[0])*math.Expm1(float64(i)/100)/math.Expm1(10)
				k := int(tb.guide[j*tb.buckets+min(tb.bucket(m), tb.buckets-1)])
				if states++; m >= tb.edges[min(k+2, len(tb.edges)-1)] {
					far++
				}
			}
		}
	}
	if share := float64(far) / float64(states); share > 0.1 {
		t.Errorf("%.1f %% of %d states need more than one step, want at most 10 %%", 100*share, states)
	} else {
		t.Logf("%.2f %% of %d states need more than one step", 100*share, states)
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
