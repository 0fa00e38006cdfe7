package sim

import (
	"math"
	"testing"

	"cistern/income"
)

// tally adds up a mean and its standard error (Welford 1962, Technometrics 4).
type tally struct{ n, mean, squares float64 }

func (a *tally) add(x float64) {
	a.n++
	d := x - a.mean
	a.mean += d / a.n
	a.squares += d * (x - a.mean)
}

func (a *tally) variance() float64      { return a.squares / (a.n - 1) }
func (a *tally) standardError() float64 { return math.Sqrt(a.variance() / a.n) }

// within4 reports an estimate that is more than four Monte Carlo standard errors
// from what is known.
func within4(t *testing.T, what string, at int, got, want, standardError float64, source string) {
	t.Helper()
	if !(math.Abs(got-want) <= 4*standardError) {
		t.Errorf("%s, year %d: %.6g, want %.6g ± 4·%.2g (%s)", what, at, got, want, standardError, source)
	}
}

func share(t *testing.T, what string, at int, count, n, want float64, source string) {
	t.Helper()
	within4(t, what, at, count/n, want, math.Sqrt(want*(1-want)/n), source)
}

// long skips a test of many households in short runs: with the race detector on it
// would take minutes and has nothing to race.
func long(t *testing.T) {
	t.Helper()
	if testing.Short() {
		t.Skip("many households")
	}
}

// The panel against the laws it is drawn from.
func TestPanelFollowsItsLaws(t *testing.T) {
	long(t)
	const households = 10 * Unit
	p := population(t, risky(t), households)
	h := p.Types[0].Rule.Household
	r := simulate(t, p, Options{Columns: All, Workers: 2})
	T, nodes := h.Years(), h.Nodes()
	alive, unemployed := make([]float64, T), make([]float64, T)
	earnings := make([]tally, T)
	atNode := make([][]float64, T)
	for y := range atNode {
		atNode[y] = make([]float64, nodes)
	}
	var epsilon, square tally
	for k, y := range r.t {
		alive[y]++
		atNode[y][r.Node[k]]++
		if !h.Working(y) {
			continue
		}
		earnings[y].add(r.Earnings[k])
		if r.Employed[k] {
			epsilon.add(r.Transitory[k])
			square.add(r.Transitory[k] * r.Transitory[k])
		} else {
			unemployed[y]++
		}
	}
	living := 1.0
	for y := range T {
		share(t, "share alive", y, alive[y], households, living, "derived: product of survival probabilities")
		living *= h.Survival[y]
		if !h.Working(y) {
			continue
		}
		within4(t, "mean earnings", y, earnings[y].mean, h.Earnings.Mean(y), earnings[y].standardError(), "derived: the profile is mean earnings")
		share(t, "share without work", y, unemployed[y], alive[y], 0.05, "derived: probability of job loss")
		for j, want := range h.Earnings.Distribution[y] {
			share(t, "share at a node", y, atNode[y][j], alive[y], want, "derived: the chain's distribution by age")
		}
	}
	within4(t, "mean of ε", -1, epsilon.mean, 0, epsilon.standardError(), "derived: N(0, 0.2²)")
	within4(t, "mean of ε²", -1, square.mean, 0.04, square.standardError(), "derived: N(0, 0.2²)")
}

// Transitions: the joint law of this and next year's node, and independence of the
// survivors' next node from survival (both use one draw's halves).
func TestNodesMoveAsTheChain(t *testing.T) {
	long(t)
	p := population(t, risky(t), 8*Unit)
	chain := p.Types[0].Rule.Household.Earnings.Chain
	r := simulate(t, p, Options{Columns: Identity | States | Fates, Workers: 2})
	now := make([]int, p.Households)
	var from [256]float64
	var pair [256][256]float64
	for k, y := range r.t {
		id, z := r.Household[k], int(r.Node[k])
		if y > 0 && y < 40 {
			pair[now[id]][z]++
			from[now[id]]++
		}
		now[id] = z
	}
	for i := range chain.Len() {
		for j, want := range chain.Row(i) {
			if want > 1e-4 { // beyond, counts are too small for the normal law
				share(t, "transition", i*100+j, pair[i][j], from[i], want, "derived: the chain's transition probabilities")
			}
		}
	}
}

// Start assets: zero with the given probability, otherwise lognormal.
func TestStartAssets(t *testing.T) {
	long(t)
	const households = 10 * Unit
	p := population(t, risky(t), households)
	p.Types[0].Start = Start{Median: 3, LogSD: 0.7, ZeroShare: 0.3}
	r := simulate(t, p, Options{Columns: Identity})
	R := 1 + p.Types[0].Rule.Household.Return
	zero := 0.0
	var logs, squares tally
	for k, y := range r.t {
		if y > 0 {
			continue
		}
		a := (r.CashOnHand[k] - r.Income[k]) / R
		if math.Abs(a) < 1e-12 {
			zero++
			continue
		}
		x := math.Log(a / 3)
		logs.add(x)
		squares.add(x * x)
	}
	share(t, "share without assets", 0, zero, households, 0.3, "derived: zero share")
	within4(t, "mean log assets", 0, logs.mean, 0, logs.standardError(), "derived: the median")
	within4(t, "mean square of log assets", 0, squares.mean, 0.49, squares.standardError(), "derived: log sd 0.7")

	p.Types[0].Start = Start{Constant: 1.25}
	r = simulate(t, p, Options{Columns: Identity, To: Unit})
	for k, y := range r.t {
		if y == 0 && r.CashOnHand[k] != float64(R*1.25)+r.Income[k] {
			t.Fatalf("constant start: cash-on-hand %v, income %v, want start assets 1.25", r.CashOnHand[k], r.Income[k])
		}
	}
}

// Types of a group are equally likely; groups have their shares in every contiguous
// range of ids, far closer than by chance (derived: the points frac(i·φ) of any n
// consecutive i leave gaps of about 1/n; three-gap theorem).
func TestGroupsAndTypesHaveTheirShares(t *testing.T) {
	long(t)
	const households = 10 * Unit
	p := mixed(t, households)
	r := simulate(t, p, Options{Columns: Identity | States})
	var count [5]float64
	var persistent [5]tally
	for k, y := range r.t {
		if y == 0 {
			count[r.kind[k]]++
			persistent[r.kind[k]].add(r.Persistent[k])
		}
	}
	for i, n := range count {
		of := p.Groups[p.Types[i].Group]
		share(t, "type", i, n, of.Share*households, 1/float64(len(of.Types)), "derived: equally likely")
		within4(t, "mean persistent part by type", i, persistent[i].mean, 0, persistent[i].standardError(), "derived: type and node are independent")
	}
	for _, first := range []int64{0, 17, 4096, 1e6, 1e9, 1e12} {
		for _, n := range []int64{10, 100, 4096, 30000} {
			got := 0.0
			for id := first; id < first+n; id++ {
				if p.GroupOf(id) == 0 {
					got++
				}
			}
			if math.Abs(got-0.7*float64(n)) > 4 {
				t.Errorf("ids %d … %d: %v of %d in the first group, want %v ± 4", first, first+n-1, got, n, 0.7*float64(n))
			}
		}
	}
	for g, n := range r.result.Groups {
		if math.Abs(float64(n.Households)-p.Groups[g].Share*households) > 4 {
			t.Errorf("group %s has %d households, want %v ± 4", p.Groups[g].Name, n.Households, p.Groups[g].Share*households)
		}
	}
}

// Exponential utility, normal shocks, no limit: consumption is linear in cash with
// the annuity propensity k, and grows by ln(βR)/α + α·k²·σ²/2 a year on average,
// with standard deviation k·σ (derived: Caballero 1990, Journal of Monetary
// Economics 25, for a finite horizon: the Euler equation with normal growth).
func TestExponentialConsumptionGrowth(t *testing.T) {
	long(t)
	const households, years, sigma = 8 * Unit, 12, 0.1
	h := exponential(t, years)
	e := h.Earnings.Process
	e.Chain, e.Initial = income.Degenerate(), []float64{1}
	var err error
	if h.Earnings, err = e.Build(); err != nil {
		t.Fatal(err)
	}
	alpha := h.Utility.AbsoluteRiskAversion(1)
	if alpha != 2 {
		t.Fatalf("absolute risk aversion %v, want 2", alpha)
	}
	r := simulate(t, population(t, h, households), Options{Columns: Identity, Workers: 2})
	last := make([]float64, households)
	growth := make([]tally, years)
	for k, y := range r.t {
		id := r.Household[k]
		if y > 0 {
			growth[y].add(r.Consumption[k] - last[id])
		}
		last[id] = r.Consumption[k]
	}
	R := 1 + h.Return
	for y := 1; y < years; y++ {
		annuity := 0.0
		for j := range years - y {
			annuity += math.Pow(R, -float64(j))
		}
		k := 1 / annuity
		want := math.Log(h.DiscountFactor*R)/alpha + alpha*k*k*sigma*sigma/2
		within4(t, "mean consumption growth", y, growth[y].mean, want, growth[y].standardError(), "derived: closed form after Caballero (1990)")
		// Normal growth: the variance's standard error is its own size times √(2/n).
		v := k * k * sigma * sigma
		within4(t, "variance of consumption growth", y, growth[y].variance(), v, v*math.Sqrt(2/growth[y].n), "derived: the annuity propensity")
	}
}
