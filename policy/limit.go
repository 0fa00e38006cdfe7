package policy

import (
	"fmt"
	"math"
	"slices"
)

// bounds returns the lowest assets −b_t that a household may hold at the end of year
// t, [t][node·K+k], K_t the number of entitlement nodes, in money; −Inf under
// LimitNone (but 0 in the last year).
//
// What can be owed at the end of year t is what next year's lowest income and the
// debt then allowed can bear, net of the consumption that utility cannot go below,
//
//	N_t = min_{z′} ( b_{t+1}(z′) + inf y_{t+1}(z′) − c̲ ) / R_{t+1},   b_T = 0,
//
// over all nodes while the node can change, over the household's own from then on.
// Under LimitNatural b = N, the present value of all lowest income (Aiyagari 1994,
// Quarterly Journal of Economics 109, eq. 3, for an infinite horizon); under
// LimitAmount b is the smaller of N and the amount. Under LimitNatural inf y is the infimum of the continuous law, so
// that debt is repaid for certain. Under LimitAmount it is the lowest income the
// solver reckons with. With an entitlement the least is that over all outcomes of
// income with the entitlement that follows from it.
func (h Household) bounds(grids []EntitlementGrid) ([][]float64, error) {
	T, nz := h.Years(), h.Nodes()
	width := func(t int) int {
		if grids == nil {
			return 1
		}
		return grids[t].Len()
	}
	b := make([][]float64, T)
	for t := range b {
		b[t] = make([]float64, nz*width(t))
		if h.Limit.Kind == LimitNone && t < T-1 {
			for j := range b[t] {
				b[t][j] = math.Inf(-1)
			}
		}
	}
	floor := h.Utility.Infimum()
	free := math.IsInf(floor, -1) // consumption may be negative: no income is too low
	if h.Limit.Kind == LimitNone || free && h.Limit.Kind == LimitAmount && h.Limit.Amount == 0 {
		return b, nil
	}
	if free {
		floor = 0
	}
	for t := T - 2; t >= 0; t-- {
		n := width(t)
		repay := b[t] // what can be owed at the end of the year
		for i := range repay {
			e, j := h.entitlementAt(grids, t, i%n), i/n
			net, low := h.lowest(t+1, j, e, func(next Entitlement) float64 { return boundAt(grids, t+1, j, next, b[t+1]) })
			repay[i] = (net - floor) / (1 + h.ReturnIn(t+1))
			if math.IsInf(low, -1) || repay[i] < -1e-9*math.Max(math.Abs(low), floor) {
				return nil, h.infeasible(t+1, low, floor)
			}
			repay[i] = math.Max(repay[i], 0)
		}
		for k := 0; k < n && h.Moves(t); k++ {
			least := math.Inf(1)
			for i := k; i < len(repay); i += n {
				least = math.Min(least, repay[i])
			}
			for i := k; i < len(repay); i += n {
				repay[i] = least
			}
		}
		for i, x := range repay {
			if b[t][i] = -x; h.Limit.Kind == LimitAmount {
				b[t][i] = -math.Min(x, h.Limit.Amount)
			}
			b[t][i] += 0 // no negative zero in results
		}
	}
	if most := -slices.Max(b[0]); h.Limit.Kind == LimitAmount && T > 1 && most < h.Limit.Amount {
		return nil, &FieldError{"Limit.Amount", h.Limit.Amount,
			fmt.Sprintf("at most %.6g: more could not be repaid from the lowest income, whose present value at age %d is that much",
				most, h.FirstAge)}
	}
	return b, nil
}

// entitlementAt returns the entitlement at node k of year t; the least to begin
// with where there are no nodes.
func (h Household) entitlementAt(grids []EntitlementGrid, t, k int) (e Entitlement) {
	switch {
	case grids != nil:
		return grids[t].Node(k)
	case h.Laws != nil:
		e, _ = h.Laws.Initial()
	}
	return e
}

// boundAt returns the bound of year t, of bounds [node·K+k], at a persistent node
// with entitlement e.
func boundAt(grids []EntitlementGrid, t, node int, e Entitlement, bounds []float64) float64 {
	if grids == nil {
		return bounds[node]
	}
	g := &grids[t]
	var b blend
	g.blend(e, &b)
	bound := 0.0
	for i := range b.n {
		bound += b.weight[i] * bounds[node*g.Len()+b.node[i]]
	}
	return bound
}

// lowest returns the least, over the outcomes of year t at a node that a household
// with entitlement e before must reckon with, of income less the bound that follows,
// and the income that it comes of: the infimum of the continuous law under
// LimitNatural, the lowest outcome of the solver otherwise.
func (h Household) lowest(t, node int, e Entitlement, bound func(next Entitlement) float64) (net, income float64) {
	net = math.Inf(1)
	consider := func(y float64, next Entitlement, weight float64) {
		if x := y - bound(next); weight > 0 && (x < net || math.IsInf(y, -1)) {
			net, income = x, y
		}
	}
	natural := h.Limit.Kind == LimitNatural && h.Working(t)
	if !natural || h.Laws != nil {
		h.forEachOutcome(t, node, e, consider)
	}
	if natural && (h.Laws == nil || h.Earnings.TransitorySD(t) > 0 && h.Earnings.JobLossIn(t).Probability < 1) {
		y, next := h.Earnings.Infimum(t), e
		if h.Laws != nil && !math.IsInf(y, -1) {
			y, next = h.Laws.Work(t, e, y, true)
		}
		consider(y, next, 1)
	}
	return net, income
}

func (h Household) infeasible(t int, low, floor float64) error {
	want := fmt.Sprintf("an income that stays above %.6g, the consumption %s utility cannot go below, at every age", floor, h.Utility.Family())
	if h.Limit.Kind == LimitNatural {
		want += " (the natural limit reckons with the lowest income that the shocks allow at all)"
	}
	return &FieldError{"Earnings", fmt.Sprintf("%.6g at age %d in the worst case", low, h.FirstAge+t), want}
}

// LeastStart returns, in money, the assets at the end of the year before the
// first that every household must begin with more than: with these or less, the
// lowest income of the first year would leave no consumption that its utility
// allows,
//
//	(c̲ − b_0(z) − inf y_0(z)) / R   at its largest over the persistent nodes z
//
// that a household can begin at; −Inf where consumption may be negative. h must
// be valid.
func (h Household) LeastStart() float64 {
	floor := h.Utility.Infimum()
	least := math.Inf(-1)
	grids := h.entitlementGrids(DefaultOptions())
	bounds, err := h.bounds(grids)
	if err != nil || math.IsInf(floor, -1) {
		return least
	}
	e := Entitlement{}
	if h.Laws != nil {
		e, _ = h.Laws.Initial()
	}
	for j, p := range h.Earnings.Distribution[0] {
		if p > 0 {
			net, _ := h.lowest(0, j, e, func(next Entitlement) float64 { return boundAt(grids, 0, j, next, bounds[0]) })
			least = math.Max(least, (floor-net)/(1+h.ReturnIn(0)))
		}
	}
	return least
}
