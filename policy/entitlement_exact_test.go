package policy

import (
	"math"
	"slices"
	"testing"

	"cistern/income"
)

// certainAccrual is a household of certain income that can begin with any
// entitlement up to 1 and accrues a tenth of each year's earnings of the 30 that it
// works; it lives for 45.
func certainAccrual(t *testing.T, u Utility, limit Limit, laws careerAverage) Household {
	h := certainHousehold(t, u, hump, 45, 0.95, 0.03, limit)
	p := h.Earnings.Process
	p.Profile = p.Profile[:30]
	e, err := p.Build()
	if err != nil {
		t.Fatal(err)
	}
	h.Earnings, h.Pension, h.Laws = e, Pension{ClaimAge: 55}, laws
	return h
}

// lifetimeWith is what h faces from year t on with the given entitlement then.
func lifetimeWith(h Household, t int, e Entitlement) Lifetime {
	var l Lifetime
	for year := t; year < h.Years(); year++ {
		y := 0.0
		switch {
		case year > t && h.Working(year):
			y, e = h.Laws.Work(year, e, h.Earnings.Mean(year), true)
		case year > t:
			y = h.Laws.Pension(year, e, h.Earnings.Final(0))
		}
		l.Income = append(l.Income, y)
		if year > t {
			l.Discount, l.Gross = append(l.Discount, h.DiscountFactor*h.Survival[year-1]), append(l.Gross, 1+h.ReturnIn(year))
		}
	}
	return l
}

// With certain income and no limit that binds, an entitlement is worth the present
// value of the pension that it brings: consumption is the closed form's whatever
// the split of wealth between cash and entitlement (derived: CertainCRRA and its
// like, of the income that follows from the entitlement).
func TestEntitlementAsCash(t *testing.T) {
	laws := careerAverage{rate: 0.02, ceiling: 1.3, growth: 0.01, flat: 0.1, high: 1}
	for _, tt := range []struct {
		utility   Utility
		limit     Limit
		tolerance float64 // near the floor of utility the plain rule is no better either
		exact     func(l Lifetime) LinearRule
	}{
		{CRRA{2}, Limit{Kind: LimitNatural}, 1e-9, func(l Lifetime) LinearRule { return CertainCRRA(CRRA{2}, l) }},
		{StoneGeary{0.7, 0.05}, Limit{Kind: LimitNatural}, 1e-5, func(l Lifetime) LinearRule { return CertainStoneGeary(StoneGeary{0.7, 0.05}, l) }},
		{CARA{1.5}, Limit{Kind: LimitNone}, 1e-9, func(l Lifetime) LinearRule { return CertainCARA(CARA{1.5}, l) }},
		{Quadratic{30}, Limit{Kind: LimitNone}, 1e-9, func(l Lifetime) LinearRule { return CertainQuadratic(Quadratic{30}, l) }},
	} {
		t.Run(tt.utility.Family(), func(t *testing.T) {
			h := certainAccrual(t, tt.utility, tt.limit, laws)
			o := DefaultOptions()
			o.AssetPoints = 50
			rule := solve(t, h, o)
			for _, year := range []int{0, 7, 28, 29, 30, 43} {
				axis := rule.Entitlements[year].Axes[0]
				for _, share := range []float64{0, 0.3, 0.55, 0.97} {
					x := axis[0] + share*(axis[len(axis)-1]-axis[0])
					e := Entitlement{x}
					exact := tt.exact(lifetimeWith(h, year, e))
					for _, m := range []float64{-0.05, 0.7, 2, 9, 40} {
						if m < rule.Lowest(year, 0, e)+0.2 || m < 0 && tt.utility.Infimum() > 0 {
							continue
						}
						got, want := consumptionAt(rule, year, e, m), exact.Consumption(0, 0, m)
						if math.Abs(got-want) > tt.tolerance*(1+math.Abs(want)) {
							t.Fatalf("year %d: c(%g, %g) = %.12f, want %.12f", year, x, m, got, want)
						}
					}
					if tt.limit.Kind == LimitNatural {
						l := lifetimeWith(h, year, e)
						if got, want := rule.Lowest(year, 0, e), -l.less(tt.utility.Infimum()).HumanWealth()[0]; math.Abs(got-want) > 1e-11 {
							t.Errorf("year %d: at %g debt may be %.12f, want %.12f", year, x, -got, -want)
						}
					}
				}
			}
		})
	}
}

// consumptionAt is consumption at persistent node 0.
func consumptionAt(r *Rule, t int, e Entitlement, m float64) float64 {
	c, _ := r.At(t, 0, e, m)
	return c
}

// funded is a funded pillar: a share of earnings is paid into an account that earns
// the market return and is paid out in equal instalments from the claim age to the
// last year. Nobody dies before. A share of 0 is no pillar.
type funded struct {
	share, gross, instalment float64 // of earnings; R; of the balance
	high                     float64
}

func (l funded) Pillars() int { return 1 }

func (l funded) Initial() (_, high Entitlement) { return Entitlement{}, Entitlement{l.high} }

func (l funded) Work(_ int, e Entitlement, earnings float64, _ bool) (float64, Entitlement) {
	e[0] = l.gross*e[0] + l.share*earnings
	return (1 - l.share) * earnings, e
}

func (l funded) Pension(_ int, e Entitlement, _ float64) float64 { return l.instalment * e[0] }

func (l funded) GrossPension(t int, e Entitlement, final float64) float64 {
	return l.Pension(t, e, final)
}

func (l funded) Bends(int) (_ [MaxPillars][]float64) { return }

// With certain income and no limit that binds, forced saving in an actuarially fair
// funded pillar displaces free saving one for one: consumption is the same, and
// assets and balance together are what assets would be without the pillar
// (Feldstein 1974, Journal of Political Economy 82, for the argument; derived from
// the budget). Where the limit binds the young cannot undo it and consume less.
func TestFundedPillarDisplacesSaving(t *testing.T) {
	const R = 1.03
	account := 0.0 // what an instalment of 1 over the 15 years costs at the claim age, a year after the last credit
	for k := range 15 {
		account += math.Pow(R, -float64(k+1))
	}
	path := func(share float64, limit Limit) (consumption, wealth []float64) {
		h := certainAccrual(t, CRRA{2}, limit, careerAverage{})
		h.Laws = funded{share: share, gross: R, instalment: 1 / account, high: 0.1}
		rule := solve(t, h, DefaultOptions())
		var e Entitlement
		assets, balance := 0.0, 0.0
		for year := range h.Years() {
			y := 0.0
			if h.Working(year) {
				y, e = h.Laws.Work(year, e, hump(year), true)
				balance = e[0]
			} else {
				y = h.Laws.Pension(year, e, 0)
				balance = R*balance - y
			}
			m := R*assets + y
			c := consumptionAt(rule, year, e, m)
			assets = m - c
			consumption, wealth = append(consumption, c), append(wealth, assets+balance)
		}
		return consumption, wealth
	}
	free := Limit{Kind: LimitNatural}
	want, saved := path(0, free)
	got, total := path(0.1, free)
	for year := range want {
		if relative(got[year], want[year]) > 1e-9 || math.Abs(total[year]-saved[year]) > 1e-8 {
			t.Errorf("year %d: consumption %.10f, wealth %.10f; without the pillar %.10f, %.10f", year, got[year], total[year], want[year], saved[year])
		}
	}
	want, _ = path(0, Limit{})
	got, _ = path(0.1, Limit{})
	if !(got[0] < 0.95*want[0]) || relative(got[0], 0.9*hump(0)) > 1e-12 {
		t.Errorf("at the limit the young consume %.6f with the pillar and %.6f without, want all of their net income, %.6f", got[0], want[0], 0.9*hump(0))
	}
}

// accruedOracle returns consumption in year t by solving the Euler equation of every
// later year and state anew, as oracleConsumption does, with an entitlement.
func accruedOracle(h Household, bounds func(t, node int, e Entitlement) float64, t, node int, e Entitlement, cash float64) float64 {
	most := cash - bounds(t, node, e)
	ahead := func(c float64) float64 {
		gross := 1 + h.ReturnIn(t+1)
		a, v := gross*(cash-c), 0.0
		if t < h.Years()-1 {
			visit := func(next int, q float64) {
				h.forEachOutcome(t+1, next, e, func(y float64, after Entitlement, w float64) {
					if q*w > 0 {
						v += q * w * h.Utility.Marginal(accruedOracle(h, bounds, t+1, next, after, a+y))
					}
				})
			}
			if h.Moves(t) {
				for next, q := range h.Earnings.Chain.Row(node) {
					visit(next, q)
				}
			} else {
				visit(node, 1)
			}
		}
		v *= h.Survival[t]
		if b := h.Bequest; b.Weight > 0 && h.Survival[t] < 1 {
			v += (1 - h.Survival[t]) * b.Weight * h.Utility.Marginal(a+b.Shift)
		}
		return h.DiscountFactor * gross * v
	}
	low := math.Max(h.Utility.Infimum(), -3)
	if most <= low || t == h.Years()-1 && h.Bequest.Weight == 0 || h.Utility.Marginal(most) >= ahead(most) {
		return most
	}
	high := most
	for range 46 {
		if c := low + (high-low)/2; h.Utility.Marginal(c) > ahead(c) {
			low = c
		} else {
			high = c
		}
	}
	return low + (high-low)/2
}

// shortAccrual lives for four years, of which the given number are worked, with two
// persistent nodes and the risk to lose the job.
func shortAccrual(t *testing.T, working int, transitory income.Transitory, laws Laws) Household {
	t.Helper()
	e := process{years: working, profile: func(i int) float64 { return 1 + 0.1*float64(i) }, chain: rouwenhorst(t, 2, 0.9, 0.3),
		transitory: transitory, jobLoss: income.JobLoss{Probability: 0.05, BenefitRate: 0.4}}.build(t, 61)
	return Household{FirstAge: 61, Survival: []float64{0.97, 0.95, 0.9, 0}, Utility: CRRA{2}, DiscountFactor: 0.95, Return: 0.03,
		Earnings: e, Pension: Pension{ClaimAge: 61 + working}, Laws: laws}
}

// againstOracle returns relative differences of the rule from nested bisection
// (derived; bisection is good to 1e-12) at some states.
func againstOracle(t *testing.T, h Household, o Options, cash []float64) []float64 {
	t.Helper()
	rule := solve(t, h, o)
	var misses []float64
	for year := range h.Years() - 1 {
		for _, x := range []float64{0.33, 0.47, 0.71} {
			for i, m := range cash {
				if e, node := (Entitlement{x}), (year+i)%2; year > 0 || x < 0.5 {
					got, _ := rule.At(year, node, e, m)
					want := accruedOracle(h, rule.Lowest, year, node, e, m)
					misses = append(misses, math.Abs(got-want)/math.Max(0.1, math.Abs(want)))
				}
			}
		}
	}
	slices.Sort(misses)
	return misses
}

// The solver meets nested bisection, which shares no method with it. Where nothing
// smooths them, kinks of later limits move with the entitlement and blur between its
// nodes: with 320 of them most states agree to 1e-8 and the rest are near a kink.
func TestEntitlementAgainstOracle(t *testing.T) {
	if testing.Short() {
		t.Skip("nested bisection takes seconds")
	}
	taxed := func(y float64) float64 { return y - 0.2*math.Max(0, y-0.4) - 0.2*math.Max(0, y-1) }
	average := careerAverage{rate: 0.3, ceiling: 1.4, growth: 0.02, flat: 0.1, high: 0.4}
	for _, tt := range []struct {
		name    string
		working int
		utility Utility
		limit   Limit
		bequest Bequest
		laws    careerAverage
	}{
		{"crra", 2, CRRA{2.5}, Limit{}, Bequest{}, average},
		{"crra, three years of work", 3, CRRA{1.5}, Limit{}, Bequest{}, average},
		{"crra, taxes", 2, CRRA{2}, Limit{}, Bequest{}, careerAverage{rate: 0.3, ceiling: 9, flat: 0.2, net: taxed, high: 0.4}},
		{"crra, final earnings too", 2, CRRA{2}, Limit{}, Bequest{}, careerAverage{rate: 0.2, ceiling: 9, flat: 0.1, final: 0.2, high: 0.3}},
		{"natural limit", 2, CRRA{1}, Limit{Kind: LimitNatural}, Bequest{}, average},
		{"debt and bequest", 2, CRRA{0.8}, Limit{Amount: 0.2}, Bequest{Weight: 2, Shift: 0.5}, average},
		{"stone_geary", 2, StoneGeary{2, 0.05}, Limit{}, Bequest{}, average},
		{"cara", 2, CARA{1.5}, Limit{Amount: 0.2}, Bequest{}, average},
		{"quadratic", 2, Quadratic{8}, Limit{}, Bequest{}, average},
	} {
		t.Run(tt.name, func(t *testing.T) {
			h := shortAccrual(t, tt.working, income.Transitory{Nodes: 1}, tt.laws)
			h.Utility, h.Limit, h.Bequest = tt.utility, tt.limit, tt.bequest
			if tt.bequest.Weight > 0 { // the last year is a bisection too
				h.Survival = []float64{0.97, 0.95, 0}
			}
			o := DefaultOptions()
			o.AssetPoints, o.HighestAssets, o.KinkThreshold, o.EntitlementPoints = 800, 30, 0, 320
			misses := againstOracle(t, h, o, []float64{0.4, 0.8, 1.1, 1.9})
			n := len(misses)
			t.Logf("relative differences: median %.1e, four fifths up to %.1e, largest %.1e", misses[n/2], misses[4*n/5], misses[n-1])
			if !(misses[n/2] < 1e-8 && misses[4*n/5] < 1e-7 && misses[n-1] < 1e-3) {
				t.Errorf("relative differences %.1e", misses)
			}
		})
	}
}

// With a finely resolved transitory shock the default number of nodes does, though
// the entitlement changes by a third of its range in a year here.
func TestEntitlementAgainstOracleSmooth(t *testing.T) {
	if testing.Short() {
		t.Skip("nested bisection takes seconds")
	}
	h := shortAccrual(t, 2, income.Transitory{SD: 0.2, Nodes: 81}, careerAverage{rate: 0.3, ceiling: 1.4, growth: 0.02, flat: 0.1, high: 0.4})
	h.Survival = []float64{0.97, 0.95, 0}
	misses := againstOracle(t, h, DefaultOptions(), []float64{0.4, 0.6, 0.8, 1, 1.3, 1.9, 3})
	n := len(misses)
	t.Logf("relative differences: median %.1e, largest %.1e", misses[n/2], misses[n-1])
	if !(misses[n/2] < 1e-10 && misses[n-3] < 1e-4 && misses[n-1] < 1e-3) {
		t.Errorf("relative differences %.1e", misses)
	}
}
