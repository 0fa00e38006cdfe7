package policy

import (
	"fmt"
	"math"
)

// Begin is a way in which life may begin: with assets at the end of the year before
// the first, in money, with what is accrued by then, and a probability.
type Begin struct {
	Assets      float64
	Entitlement Entitlement
	Probability float64
}

// Expected returns the value of life as it is seen before it begins: the
// expectation over begins, the persistent node and the income of the first year.
func (v *Value) Expected(begins []Begin) float64 { return v.expected(begins, v.felicity.neutral()) }

// expected is Expected relative to a reference.
func (v *Value) expected(begins []Begin, ref float64) float64 {
	sum := 0.0
	v.firstYears(begins, func(q, probability float64) {
		x, _ := v.felicity.at(q, ref)
		sum += probability * x
	})
	return v.horizon[0] * sum
}

// lowest returns the lowest Q with which life may begin.
func (v *Value) lowest(begins []Begin) float64 {
	least := math.Inf(1)
	v.firstYears(begins, func(q, _ float64) { least = math.Min(least, q) })
	return least
}

// firstYears calls yield with Q and the probability of every state that the first year
// may have.
func (v *Value) firstYears(begins []Begin, yield func(q, probability float64)) {
	h := &v.Rule.Household
	for _, b := range begins {
		for j, p := range h.Earnings.Distribution[0] {
			if p == 0 || b.Probability == 0 {
				continue
			}
			h.forEachOutcome(0, j, b.Entitlement, func(income float64, next Entitlement, weight float64) {
				if weight > 0 {
					q, _ := v.equivalent(0, j, next, float64((1+h.ReturnIn(0))*b.Assets)+income)
					yield(q, b.Probability*p*weight)
				}
			})
		}
	}
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
	λ, err := EquivalentVariation(certain, risky, begins)
	return 0 - λ, err
}

// EquivalentVariation returns the share λ by which consumption in every year of the
// lives that follow the rules base would have to be higher (negative: lower) for them
// to be worth what the lives that follow the rules other are worth,
//
//	Σ_k E V^{base_k}_{1+λ} = Σ_k E V^{other_k},
//
// expectations and sums as in [EquivalentPremium]. Estates are not scaled. Rules of
// one index belong to one type; all have the same utility, and where it is
// logarithmic the same survival and discounting.
func EquivalentVariation(base, other []*Rule, begins []Begin) (float64, error) {
	if len(base) != len(other) || len(base) == 0 {
		return 0, fmt.Errorf("policy: %d rules to be worth %d others", len(base), len(other))
	}
	values := make([]*Value, len(other))
	ref := math.Inf(1)
	for i, r := range other {
		values[i] = NewValue(r, 1)
		ref = math.Min(ref, values[i].lowest(begins))
	}
	ref = values[0].felicity.reference(ref)
	target := 0.0
	for _, v := range values {
		target += v.expected(begins, ref)
	}
	if math.IsNaN(target) || math.IsInf(target, 0) {
		return 0, fmt.Errorf("policy: a life in which consumption is as low as utility allows, or lower, is possible: it is worth %v", target)
	}
	gap := func(λ float64) (sum float64) { // falls in λ, the share given up
		for _, r := range base {
			sum += NewValue(r, 1-λ).expected(begins, ref)
		}
		return sum - target
	}
	switch g := gap(0); {
	case g == 0:
		return 0, nil
	case math.IsNaN(g):
		return 0, fmt.Errorf("policy: the value of a life is no number")
	}
	low, high := 0.0, 0.5
	for gap(low) < 0 { // the other lives are better
		if low -= 0.5; low < -64 {
			return 0, fmt.Errorf("policy: no scale of consumption makes one life worth as much as the other")
		}
	}
	for gap(high) > 0 {
		if high = 1 - (1-high)/2; high > 1-1e-9 {
			return 0, fmt.Errorf("policy: a life is worth less than one with hardly any consumption")
		}
	}
	return 0 - root(gap, low, high), nil
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
