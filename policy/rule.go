package policy

import (
	"fmt"
	"math"
	"sort"
)

// A Curve is consumption as a function of cash-on-hand at one age and node.
//
// Between neighbouring nodes it is the cubic Hermite polynomial with the slopes
// Right[j] and Left[j+1]; the two slopes at one node differ where a later
// borrowing limit puts a kink. Above the last node it is the line with slope
// Right[last]. Below Cash[0] the household is at the limit and consumes
// m − Bound, exactly; where Bound is −Inf (no limit) it is the line with slope
// Left[0].
type Curve struct {
	Cash        []float64 // m, ascending, money
	Consumption []float64 // c, money
	Left, Right []float64 // dc/dm from below and from above
	Bound       float64   // lowest assets allowed at the end of the year, −b_t
}

// At returns consumption (money) and the marginal propensity to consume at
// cash-on-hand m; at a kink the propensity from above.
func (c *Curve) At(m float64) (consumption, propensity float64) {
	n := len(c.Cash)
	if m < c.Cash[0] {
		if math.IsInf(c.Bound, -1) {
			return c.Consumption[0] + c.Left[0]*(m-c.Cash[0]), c.Left[0]
		}
		return m - c.Bound, 1
	}
	j := sort.Search(n, func(i int) bool { return c.Cash[i] > m }) - 1
	if j == n-1 {
		return c.Consumption[j] + c.Right[j]*(m-c.Cash[j]), c.Right[j]
	}
	c1, c2, c3 := c.cubic(j)
	u := m - c.Cash[j]
	return c.Consumption[j] + u*(c1+u*(c2+u*c3)), c1 + u*(2*c2+3*u*c3)
}

// cubic returns the coefficients of (m−m_j), (m−m_j)², (m−m_j)³ on segment j.
// A segment whose end slopes equal its secant gets exact zeros: it is a line.
func (c *Curve) cubic(j int) (c1, c2, c3 float64) {
	h := c.Cash[j+1] - c.Cash[j]
	k := (c.Consumption[j+1] - c.Consumption[j]) / h
	a, b := c.Right[j], c.Left[j+1]
	return a, (3*k - 2*a - b) / h, (a + b - 2*k) / (h * h)
}

// Top returns the highest node of the curve: above it the rule is extrapolated.
func (c *Curve) Top() float64 { return c.Cash[len(c.Cash)-1] }

// Rule is the solution of a household's problem: consumption as a function of
// age, persistent node, accrued entitlement and cash-on-hand. It is immutable and
// safe for concurrent use.
type Rule struct {
	Household    Household
	Curves       [][]Curve         // [t][node·K+k], k of the K = Entitlements[t].Len() entitlement nodes; [t][node] without an entitlement
	Entitlements []EntitlementGrid // [T]; nil without an entitlement
	Bounds       []float64         // [T] lowest assets at the end of year t over the nodes (a node's own: Curve.Bound); −Inf without limit
	Updates      int64             // evaluations of next year's rule that solving took
}

// At returns consumption (money) and the marginal propensity to consume in year t
// (from FirstAge) at a persistent node with entitlement e, this year's credit
// included, and cash-on-hand m. Without an entitlement e does not matter.
func (r *Rule) At(t, node int, e Entitlement, m float64) (consumption, propensity float64) {
	g := r.accruing(t)
	if g == nil {
		return r.Curves[t][node].At(m)
	}
	var b blend
	g.blend(e, &b)
	n := g.Len()
	return g.read(r.Curves[t][node*n:(node+1)*n], &b, m)
}

// Lowest returns the lowest assets, in money, that a household may hold at the end
// of year t at a persistent node with entitlement e; −Inf without limit.
func (r *Rule) Lowest(t, node int, e Entitlement) float64 {
	g := r.accruing(t)
	if g == nil {
		return r.Curves[t][node].Bound
	}
	var b blend
	g.blend(e, &b)
	bound := 0.0
	for i := range b.n {
		bound += b.weight[i] * r.Curves[t][node*g.Len()+b.node[i]].Bound
	}
	return bound
}

// accruing returns the entitlement grid of year t, nil without an entitlement.
func (r *Rule) accruing(t int) *EntitlementGrid {
	if r.Entitlements == nil {
		return nil
	}
	return &r.Entitlements[t]
}

// Consumption returns c, in money, in year t (from FirstAge) at a persistent node
// with cash-on-hand m, of a rule without an entitlement.
func (r *Rule) Consumption(t, node int, m float64) float64 {
	c, _ := r.Curves[t][node].At(m)
	return c
}

// Assets returns the assets kept, m − c, in money.
func (r *Rule) Assets(t, node int, m float64) float64 { return m - r.Consumption(t, node, m) }

// Propensity returns the marginal propensity to consume dc/dm.
func (r *Rule) Propensity(t, node int, m float64) float64 {
	_, d := r.Curves[t][node].At(m)
	return d
}

// check looks for values that no rule can have. They would come from a problem
// whose numbers overflow, and would otherwise spread in silence.
func (c *Curve) check(floor float64, age, node, entitlement int) error {
	for i, x := range c.Consumption {
		bad := math.IsNaN(x) || math.IsInf(x, 0) || x < floor || math.IsNaN(c.Left[i]) || math.IsNaN(c.Right[i])
		if bad || i > 0 && !(c.Cash[i] > c.Cash[i-1]) {
			return &RuleError{Age: age, Node: node, Entitlement: entitlement, Cash: c.Cash[i], Consumption: x}
		}
	}
	return nil
}

// A RuleError is a consumption rule that came out impossible: not a number,
// infinite, at or below the consumption that utility allows, or falling assets.
type RuleError struct {
	Age, Node         int
	Entitlement       int     // entitlement node
	Cash, Consumption float64 // money
}

func (e *RuleError) Error() string {
	return fmt.Sprintf("policy: the rule at age %d, persistent node %d is impossible: consumption %v at cash-on-hand %v; "+
		"preferences this strong against these amounts of money exceed what can be computed", e.Age, e.Node, e.Consumption, e.Cash)
}
