package pension

import (
	"math"
	"slices"
)

// EarningsKinks returns the earnings at which [Law.Resources] may bend in year t
// with the pension, employment and assets given, ascending; those of [Law.NextKinks]
// are not among them. Earnings in r do not matter.
func (l *Law) EarningsKinks(t int, r Receipts, assets float64) []float64 {
	y := &l.years[t]
	var inner []float64
	if r.Employed || y.onBenefits {
		inner = append(inner, 0, y.ceiling)
	}
	with := func(x float64) Receipts { r.Earnings = x; return r }
	return l.outer(t, with, inner, math.Inf(-1), assets)
}

// ReceiptKinks returns the gross pensions, from 0 on, at which [Law.Resources] may
// bend in year t with earnings and assets given, ascending. Pension in r does not
// matter.
func (l *Law) ReceiptKinks(t int, r Receipts, assets float64) []float64 {
	y := &l.years[t]
	var inner []float64
	topped := func(p float64) float64 { return p }
	if r.Claimed {
		inner = y.minimum.kinks()
		topped = func(p float64) float64 { return p + y.minimum.at(p) }
	}
	if y.pensioner > 0 {
		inner = append(inner, preimages(topped, inner, 0, []float64{y.ceiling})...)
	}
	with := func(x float64) Receipts { r.Pension = x; return r }
	return l.outer(t, with, inner, 0, assets)
}

// outer adds to the kinks of what is taxed those of the tax and of assistance.
func (l *Law) outer(t int, with func(float64) Receipts, inner []float64, low, assets float64) []float64 {
	y := &l.years[t]
	kinks := slices.Clone(inner)
	if y.tax != nil {
		taxable := func(x float64) float64 { v, _ := y.taxable(with(x)); return v }
		kinks = append(kinks, preimages(taxable, inner, low, y.tax.Kinks())...)
	}
	net := func(x float64) float64 { return l.Net(t, with(x)) }
	kinks = append(kinks, preimages(net, kinks, low, y.support.IncomeKinks(assets))...)
	return tidy(slices.DeleteFunc(kinks, func(x float64) bool { return x < low }))
}

// AssetKinks returns the assets at which [Law.Resources] bends in year t, ascending.
func (l *Law) AssetKinks(t int, r Receipts) []float64 {
	return l.years[t].support.AssetKinks(l.Net(t, r))
}

// EntitlementKinks returns, pillar by pillar, the entitlements at which resources of
// year t may bend, ascending, of a household without earnings that claimed in year
// claim: the kinks of the benefit formula, and those of [Law.ReceiptKinks] seen
// through the pension while the other pillar is as in e.
func (l *Law) EntitlementKinks(claim, t int, e Entitlement, final, assets float64) [MaxPillars][]float64 {
	kinks := l.PensionKinks(claim)
	pensions := l.ReceiptKinks(t, Receipts{Claimed: true}, assets)
	for i := range l.pillars {
		pays := func(x float64) float64 {
			e := e
			e[i] = x
			return l.Pension(claim, t, e, final)
		}
		kinks[i] = tidy(append(kinks[i], preimages(pays, kinks[i], 0, pensions)...))
	}
	return kinks
}

// preimages returns the points from low on at which f, nondecreasing and smooth
// between the given kinks, takes the given values.
func preimages(f func(float64) float64, kinks []float64, low float64, values []float64) []float64 {
	edges := append(slices.Clone(kinks), low, math.Inf(1))
	edges = tidyAll(edges)
	var at []float64
	for _, v := range values {
		if math.IsInf(v, 0) || math.IsNaN(v) {
			continue
		}
		for i := range len(edges) - 1 {
			if edges[i] < low {
				continue
			}
			if x, ok := solve(f, edges[i], edges[i+1], v); ok {
				at = append(at, x)
			}
		}
	}
	return at
}

// solve returns the x in [low, high] with f(x) = v, f nondecreasing there: by the
// chord where f is a line, else by halving the interval until its ends are
// neighbours.
func solve(f func(float64) float64, low, high, v float64) (float64, bool) {
	step := 1 + math.Abs(v)
	if math.IsInf(low, -1) {
		for low = min(high, 0) - step; f(low) > v; low = min(high, 0) - step {
			if step *= 2; math.IsInf(step, 1) {
				return 0, false
			}
		}
	}
	if math.IsInf(high, 1) {
		step = 1 + math.Abs(v)
		for high = low + step; f(high) < v; high = low + step {
			if step *= 2; math.IsInf(step, 1) {
				return 0, false
			}
		}
	}
	a, b := f(low), f(high)
	if !(a <= v && v <= b) || a == b {
		return 0, false
	}
	if x := low + (v-a)/(b-a)*(high-low); math.Abs(f(x)-v) <= 4e-16*(math.Abs(v)+math.Abs(a)+math.Abs(b)) {
		return x, true
	}
	for {
		mid := low + (high-low)/2
		if mid <= low || mid >= high {
			return high, true
		}
		if f(mid) < v {
			low = mid
		} else {
			high = mid
		}
	}
}

// tidy sorts kinks, drops those at infinity and keeps one of each.
func tidy(kinks []float64) []float64 {
	kinks = slices.DeleteFunc(kinks, func(x float64) bool { return math.IsInf(x, 0) || math.IsNaN(x) })
	slices.Sort(kinks)
	return slices.Compact(kinks)
}

// tidyAll is tidy that keeps infinities.
func tidyAll(kinks []float64) []float64 {
	slices.Sort(kinks)
	return slices.Compact(kinks)
}
