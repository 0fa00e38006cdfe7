package policy

import (
	"fmt"
	"math"
	"slices"
)

// bounds returns the lowest assets −b_t that a household at a persistent node may
// hold at the end of year t, [t][node], in money; −Inf under LimitNone (but 0 in
// the last year).
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
// solver reckons with.
func (h Household) bounds() ([][]float64, error) {
	T, nz := h.Years(), h.Nodes()
	b := make([][]float64, T)
	for t := range b {
		b[t] = make([]float64, nz)
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
	repay := make([]float64, nz) // what can be owed at the end of the year, [node]
	for t := T - 2; t >= 0; t-- {
		for j := range repay {
			low := h.lowestIncome(t+1, j)
			repay[j] = (low - b[t+1][j] - floor) / (1 + h.ReturnIn(t+1))
			if math.IsInf(low, -1) || repay[j] < -1e-9*math.Max(math.Abs(low), floor) {
				return nil, h.infeasible(t+1, low, floor)
			}
			repay[j] = math.Max(repay[j], 0)
		}
		if h.Moves(t) {
			least := slices.Min(repay)
			for j := range repay {
				repay[j] = least
			}
		}
		for j := range repay {
			if b[t][j] = -repay[j]; h.Limit.Kind == LimitAmount {
				b[t][j] = -math.Min(repay[j], h.Limit.Amount)
			}
			b[t][j] += 0 // no negative zero in results
		}
	}
	if most := -slices.Max(b[0]); h.Limit.Kind == LimitAmount && T > 1 && most < h.Limit.Amount {
		return nil, &FieldError{"Limit.Amount", h.Limit.Amount,
			fmt.Sprintf("at most %.6g: more could not be repaid from the lowest income, whose present value at age %d is that much",
				most, h.FirstAge)}
	}
	return b, nil
}

// lowestIncome returns the lowest income of year t at a node: the infimum of the
// continuous law under LimitNatural, the lowest outcome of the solver otherwise.
func (h Household) lowestIncome(t, node int) float64 {
	if h.Limit.Kind == LimitNatural && h.Working(t) {
		return h.Earnings.Infimum(t)
	}
	low := math.Inf(1)
	values, weights := h.Income(t, node)
	for k, y := range values {
		if weights[k] > 0 {
			low = math.Min(low, y)
		}
	}
	return low
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
	bounds, err := h.bounds()
	if err != nil || math.IsInf(floor, -1) {
		return least
	}
	for j, p := range h.Earnings.Distribution[0] {
		if p > 0 {
			least = math.Max(least, (floor+bounds[0][j]-h.lowestIncome(0, j))/(1+h.ReturnIn(0)))
		}
	}
	return least
}
