package policy

import (
	"math"
	"slices"
)

// entitlementGrids returns the grid of every year, [T]; nil for a household
// without an entitlement.
//
// A working year's nodes run from the least to the highest entitlement that can be
// reached, which at first lie close together. From the last working year on, when
// nothing but the pension depends on the entitlement, and it stays as it is, rules
// are cheap (lines between kinks that move with the pension), so there are many more
// nodes. Where pensions bend there is a node, and in the years before there are more
// where the bend will be met.
func (h Household) entitlementGrids(o Options) []EntitlementGrid {
	pillars := h.pillars()
	if pillars == 0 {
		return nil
	}
	reach := h.reach()
	_, middle := h.career()
	last := h.WorkingYears() - 1
	reached := func(t, p int) float64 { // share of what can be accrued in the end
		return (reach[t].high[p] - reach[t].low[p]) / (reach[last].high[p] - reach[last].low[p])
	}
	var bends [MaxPillars][]window
	grids := make([]EntitlementGrid, h.Years())
	for t := len(grids) - 1; t >= 0; t-- {
		frozen := !h.Moves(t)
		if frozen && t < len(grids)-1 {
			grids[t] = grids[t+1]
			continue
		}
		var axes [MaxPillars][]float64
		var seen [MaxPillars][]window
		for p := range pillars {
			axes[p] = o.EntitlementNodes[p]
			switch {
			case axes[p] != nil:
				continue
			case frozen:
				bends[p] = h.bends(p)
			default:
				bends[p] = h.carryBack(bends[p], t, p, middle[t])
			}
			axes[p] = entitlementNodes(reach[t].low[p], reach[t].high[p], reach[t].likely[p], middle[t][p], h.entitlementPoints(o, t, reached(t, p)))
			seen[p] = nil
			for _, w := range bends[p] {
				if extra := w.nodes(axes[p]); extra != nil {
					axes[p] = withExtra(axes[p], extra)
					seen[p] = append(seen[p], w)
				}
			}
		}
		grids[t] = newEntitlementGrid(axes, seen, o.Interpolation == Cubic && !frozen, o.Interpolation == Cubic)
	}
	return grids
}

// entitlementPoints returns the number of entitlement nodes of year t: those that
// the options ask for once half of the range that is reached in the end is there,
// down to four tenths of them before; twice as many in the two years before nothing
// is risky any more, which see its kinks least blurred; many more from then on.
func (h Household) entitlementPoints(o Options, t int, reached float64) int {
	n := float64(o.EntitlementPoints)
	switch {
	case o.Interpolation == Linear:
	case !h.Moves(t):
		n *= frozenRefinement[h.pillars()-1]
	case h.pillars() == 1 && t >= h.WorkingYears()-3:
		n *= 2
	case reached < 0.5:
		n *= 0.4 + 1.2*reached
	}
	return max(2, int(math.Ceil(n)))
}

// frozenRefinement is how many times more entitlement nodes, by number of pillars,
// there are once the entitlement does not change any more.
var frozenRefinement = [MaxPillars]float64{8, 2}

// entitlementNodes returns n nodes from low to high, denser below middle, where
// most households are, the last but one at likely if high is far beyond it; a single
// node if low and high are the same to rounding.
func entitlementNodes(low, high, likely, middle float64, n int) []float64 {
	if !(high-low > 1e-9*math.Max(math.Abs(low), math.Abs(high))) {
		return []float64{low}
	}
	beyond := n > 4 && high-likely > (likely-low)/float64(n-2)
	top := high
	if beyond {
		n--
		top = likely
	}
	width := top - low
	scale := math.Max((math.Min(middle, top)-low)/2, 0.01*width)
	x := make([]float64, n)
	step := math.Log1p(width/scale) / float64(n-1)
	for i := range x {
		x[i] = low + scale*math.Expm1(float64(i)*step)
	}
	x[n-1] = top
	if beyond {
		x = append(x, high)
	}
	return x
}

// A span is the range of entitlements after a year's credit: the least and the
// highest that the solver's outcomes of earnings can lead to, and one that hardly
// anybody exceeds.
type span struct{ low, high, likely Entitlement }

// sure is how many standard deviations of what transitory outcomes add up to lie
// below likely, over the expectation at the best persistent node of every year.
const sure = 3

// reach returns the span of every year, [T].
func (h Household) reach() []span {
	spans := make([]span, h.Years())
	var now span
	now.low, now.high = h.Laws.Initial()
	mean, variance := now.high, Entitlement{}
	for t := range spans {
		if h.Working(t) {
			now.low, now.high = h.extremes(t, now.low, now.high)
			mean, variance = h.best(t, mean, variance)
			for p := range now.likely {
				now.likely[p] = math.Min(now.high[p], mean[p]+sure*math.Sqrt(variance[p]))
			}
		}
		spans[t] = now
	}
	return spans
}

// extremes returns the least and the highest entitlement that year t can leave
// households with which enter it with low to high.
func (h Household) extremes(t int, low, high Entitlement) (least, highest Entitlement) {
	for p := range least {
		least[p], highest[p] = math.Inf(1), math.Inf(-1)
	}
	for j := range h.Nodes() {
		for _, from := range []Entitlement{low, high} {
			h.forEachOutcome(t, j, from, func(_ float64, next Entitlement, weight float64) {
				for p, x := range next {
					if weight > 0 {
						least[p], highest[p] = math.Min(least[p], x), math.Max(highest[p], x)
					}
				}
			})
		}
	}
	return least, highest
}

// best returns mean and variance of the entitlement after year t at the persistent
// node with the highest mean, from mean and variance before.
func (h Household) best(t int, mean, variance Entitlement) (m, v Entitlement) {
	for p := range m {
		m[p] = math.Inf(-1)
	}
	above := mean
	for p := range above {
		above[p] += math.Sqrt(variance[p])
	}
	for j := range h.Nodes() {
		var first, second, carried Entitlement
		h.forEachOutcome(t, j, mean, func(_ float64, next Entitlement, weight float64) {
			for p, x := range next {
				first[p] += weight * x
				second[p] += weight * x * x
			}
		})
		h.forEachOutcome(t, j, above, func(_ float64, next Entitlement, weight float64) {
			for p, x := range next {
				carried[p] += weight * x
			}
		})
		for p := range m {
			if first[p] > m[p] {
				kept := carried[p] - first[p] // of last year's standard deviation
				m[p], v[p] = first[p], kept*kept+math.Max(0, second[p]-first[p]*first[p])
			}
		}
	}
	return m, v
}

// A window is where, in some year, entitlements lie that will most likely end up
// where pensions bend. A single bend would have one as wide as blur.
type window struct {
	low, high, blur float64
	several         bool // bends, which together make a curve
}

// bends returns where pensions bend in pillar p.
func (h Household) bends(p int) []window {
	var kinks []float64
	for t := h.WorkingYears(); t < h.Years(); t++ {
		kinks = append(kinks, h.Laws.Bends(t)[p]...)
	}
	slices.Sort(kinks)
	var w []window
	for _, x := range slices.Compact(kinks) {
		w = append(w, window{low: x, high: x})
	}
	return w
}

// likely is the probability of all but the outermost persistent nodes.
const likely = 0.9

// carryBack turns windows of year t+1 into those of year t: entitlements that the
// credits of year t+1 take there, from the earnings of the highest likely persistent
// node to those of the lowest. The other pillar is that of e. Windows that overlap
// become one: bends that close together, as where a threshold rises from year to year,
// come to a curve.
func (h Household) carryBack(windows []window, t, p int, e Entitlement) []window {
	if len(windows) == 0 {
		return nil
	}
	low, high := h.likelyEarnings(t + 1)
	var all []window
	for _, w := range windows {
		next := window{low: h.before(w.low, high, t+1, p, e), high: h.before(w.high, low, t+1, p, e)}
		next.blur = w.blur + math.Max(0, (next.high-next.low)-(w.high-w.low))
		next.several = w.several
		w = next
		if n := len(all); n > 0 && w.low <= all[n-1].high {
			all[n-1].high, all[n-1].blur = math.Max(all[n-1].high, w.high), math.Max(all[n-1].blur, w.blur)
			all[n-1].several = true
			continue
		}
		all = append(all, w)
	}
	return all
}

// likelyEarnings returns mean earnings of year t at the lowest and the highest
// persistent node that are likely.
func (h Household) likelyEarnings(t int) (low, high float64) {
	low, high = math.Inf(1), math.Inf(-1)
	below := 0.0
	for j, q := range h.Earnings.Distribution[t] {
		if below+q > (1-likely)/2 && below < (1+likely)/2 {
			mean := 0.0
			h.outcomes(t, j, func(y float64, _ bool, weight float64) { mean += weight * y })
			low, high = math.Min(low, mean), math.Max(high, mean)
		}
		below += q
	}
	return low, high
}

// before returns the entitlement of pillar p that earnings in year t turn into x,
// by bisection; the other pillar is that of e.
func (h Household) before(x, earnings float64, t, p int, e Entitlement) float64 {
	after := func(y float64) float64 {
		e[p] = y
		_, next := h.Laws.Work(t, e, earnings, true)
		return next[p]
	}
	low, high := x, x
	step := math.Max(math.Abs(x), 1e-6)
	for range 60 {
		if after(low) <= x {
			break
		}
		low -= step
		step *= 2
	}
	for range 60 {
		if after(high) >= x {
			break
		}
		high += step
		step *= 2
	}
	for range 60 {
		if y := low + (high-low)/2; after(y) < x {
			low = y
		} else {
			high = y
		}
	}
	return high
}

// windowNodes is how many nodes the window of a single bend gets.
const windowNodes = 7

// nodes returns the nodes that the window adds to those of an axis: none where the
// blur has become so wide that they would be hardly closer than the axis's own.
func (w window) nodes(axis []float64) []float64 {
	last := len(axis) - 1
	if w.low == w.high {
		return []float64{w.low}
	}
	middle := w.low + (w.high-w.low)/2
	if last < 1 || !(middle > axis[0] && middle < axis[last]) {
		return nil
	}
	i, _ := slices.BinarySearch(axis, middle)
	own := axis[i] - axis[i-1]
	step := w.blur / (windowNodes - 1)
	if step > 0.6*own {
		return nil
	}
	n := max(windowNodes, 1+int(math.Ceil((w.high-w.low)/math.Max(step, 0.3*own))))
	x := make([]float64, n)
	for k := range x {
		x[k] = w.low + (w.high-w.low)*float64(k)/float64(n-1)
	}
	return x
}

// withExtra returns the nodes of an axis with those of extra, ascending, that lie
// between its ends; a node close to one of them gives way.
func withExtra(axis, extra []float64) []float64 {
	last := len(axis) - 1
	all := []float64{axis[0]}
	k := 0
	for i := 1; i <= last; i++ {
		near := 0.2 * (axis[i] - axis[i-1])
		for ; k < len(extra) && extra[k] < axis[i]; k++ {
			if x := extra[k]; x > all[len(all)-1] && x > axis[0] {
				if n := len(all) - 1; all[n] == axis[i-1] && i > 1 && x-all[n] < near {
					all = all[:n]
				}
				all = append(all, x)
			}
		}
		if i == last || (axis[i]-all[len(all)-1] >= near || all[len(all)-1] == axis[i-1]) && !(k < len(extra) && extra[k] == axis[i]) {
			all = append(all, axis[i])
		}
	}
	return all
}
