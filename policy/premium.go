package policy

import (
	"fmt"
	"math"
)

// Begin is a way in which life may begin: with assets at the end of the year before
// the first, in money, and a probability.
type Begin struct{ Assets, Probability float64 }

// Expected returns the value of life as it is seen before it begins: the
// expectation over begins, the persistent node and the income of the first year.
func (v *Value) Expected(begins []Begin) float64 {
	h := &v.Rule.Household
	sum := 0.0
	for _, b := range begins {
		for j, p := range h.Earnings.Distribution[0] {
			if p == 0 || b.Probability == 0 {
				continue
			}
			incomes, weights := h.Income(0, j)
			for k, y := range incomes {
				if weights[k] > 0 {
					value, _ := v.At(0, j, float64((1+h.ReturnIn(0))*b.Assets)+y)
					sum += b.Probability * p * weights[k] * value
				}
			}
		}
	}
	return sum
}

// EquivalentPremium returns the share λ of consumption that a household would give
// up in every year of a life without income risk to be rid of that risk: with the
// certain lives' consumption scaled by 1 − λ,
//
//	Σ_k E V^{certain_k}_{1−λ} = Σ_k E V^{risky_k},
//
// the expectations at the start of life, before anything is known, sums over types
// of households that are equally likely. Under CRRA utility γ ≠ 1 without a bequest
// motive 1 − λ = (V_risky/V_certain)^(1/(1−γ)). (Pratt 1964, Econometrica 32, for a
// single risk; Lucas 1987, Models of Business Cycles, for a stream of consumption.)
// It is found to 1e-12.
//
// The certain twin may owe more than the household under a natural limit: λ then
// contains what that is worth.
func EquivalentPremium(risky, certain []*Rule, begins []Begin) (float64, error) {
	if len(risky) != len(certain) || len(risky) == 0 {
		return 0, fmt.Errorf("policy: %d rules with risk and %d without", len(risky), len(certain))
	}
	worth := func(rules []*Rule, k float64) (sum float64) {
		for _, r := range rules {
			sum += NewValue(r, k).Expected(begins)
		}
		return sum
	}
	target := worth(risky, 1)
	if math.IsNaN(target) || math.IsInf(target, 0) {
		return 0, fmt.Errorf("policy: the value of a risky life is %v", target)
	}
	gain := func(λ float64) float64 { return worth(certain, 1-λ) - target }
	switch g := gain(0); {
	case g == 0:
		return 0, nil
	case math.IsNaN(g):
		return 0, fmt.Errorf("policy: the value of a certain life is no number")
	}
	low, high := 0.0, 0.5
	for gain(low) < 0 { // risk that is worth having: the other limit is at work
		if low -= 0.5; low < -64 {
			return 0, fmt.Errorf("policy: no scale of certain consumption is worth as much as the risky life")
		}
	}
	for gain(high) > 0 {
		if high = 1 - (1-high)/2; high > 1-1e-9 {
			return 0, fmt.Errorf("policy: a household would give up all it consumes to be rid of its risk")
		}
	}
	return root(gain, low, high), nil
}

// root finds where a falling function crosses 0 between low and high to 1e-12, by
// false position with the end that stays put halved (the Illinois method; Dowell and
// Jarratt 1971, BIT 11), and by halving where that is slow.
func root(f func(float64) float64, low, high float64) float64 {
	a, b := f(low), f(high)
	for side, n := 0, 0; high-low > 1e-12; n++ {
		x := (low*b - high*a) / (b - a)
		if n%4 == 3 || !(x > low && x < high) {
			x = low + (high-low)/2
		}
		switch y := f(x); {
		case y == 0:
			return x
		case y > 0:
			low, a = x, y
			if side > 0 {
				b /= 2
			}
			side = 1
		default:
			high, b = x, y
			if side < 0 {
				a /= 2
			}
			side = -1
		}
	}
	return low + (high-low)/2
}
