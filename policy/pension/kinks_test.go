package pension_test

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"cistern/policy/pension"
)

// drawRules draws rules with everything that bends; power says which tax.
func drawRules(t *rapid.T, power bool) pension.Rules {
	share := func(name string, high float64) pension.Parameter {
		return constant(rapid.OneOf(rapid.Float64Range(0, high), rapid.SampledFrom([]float64{0, high})).Draw(t, name))
	}
	money := func(name string, low, high float64) pension.Parameter {
		return constant(rapid.Float64Range(low, high).Draw(t, name))
	}
	r := rules()
	r.Contributions = pension.Contributions{Employee: share("employee", 0.2), Pensioner: share("pensioner", 0.1), Deductible: share("deductible", 1),
		Ceiling: money("ceiling", 5000, 90000), Uprating: pension.WithWages(), OnBenefits: rapid.Bool().Draw(t, "on benefits")}
	if rapid.Bool().Draw(t, "no ceiling") {
		r.Contributions.Ceiling = constant(inf())
		r.Contributions.Deductible = constant(1)
	}
	r.Taxes.Pensions = share("taxable pensions", 1)
	if power {
		r.Contributions.Deductible = constant(1)
		r.Taxes.Income.Power = &pension.PowerTax{Level: money("level", 0.7, 1), Progressivity: money("progressivity", 0.02, 0.3)}
	} else {
		edge := 0.0
		for range rapid.IntRange(0, 4).Draw(t, "brackets") {
			r.Taxes.Income.Brackets = append(r.Taxes.Income.Brackets, pension.Bracket{From: constant(edge), Rate: money("rate", -0.3, 0.7)})
			edge += rapid.Float64Range(2000, 30000).Draw(t, "width")
		}
	}
	if rapid.Bool().Draw(t, "minimum") {
		r.Minimum = &pension.MinimumPension{Amount: money("minimum", 0, 20000), Taper: share("taper", 1)}
	}
	if rapid.Bool().Draw(t, "assistance") {
		r.Assistance = &pension.Assistance{Amount: money("assistance", 0, 20000), FromAge: constant(20), Stricter: rapid.Bool().Draw(t, "stricter"),
			Income: pension.Test{Exempt: money("income exempt", 0, 10000), Taper: share("income taper", 1)},
			Assets: pension.Test{Exempt: money("assets exempt", 0, 100000), Taper: share("assets taper", 1)}}
	}
	r.CareerAverage = &pension.CareerAverage{Accrual: constant(0.01), Revaluation: pension.WithPrices(),
		Formula: []pension.Step{{From: constant(0), Rate: money("formula", 0.1, 1)}, {From: constant(0.5), Rate: money("formula above", 0.1, 1)}}}
	r.Points = &pension.Points{Cap: money("cap", 0.5, 3), Value: constant(0.01)}
	r.Flat = &pension.Flat{Amount: money("flat", 0, 5000)}
	return r
}

// lawful draws a law that can be.
func lawful(t *rapid.T, power bool) *pension.Law {
	l, err := drawRules(t, power).For(cohort(mortal()))
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// checkPieces checks f between low and high: it does not fall (unless falls), its
// slopes are those that are claimed, and it bends at the given kinks only. Where it is
// a line between them any three points lie on one; where it is only smooth a central
// difference of it is its slope.
func checkPieces(t *rapid.T, f func(float64) float64, slope func(float64, pension.Side) float64, kinks []float64, low, high float64, lines, falls bool) {
	if !slices.IsSorted(kinks) {
		t.Fatalf("kinks %v not ascending", kinks)
	}
	edges := []float64{low}
	for _, k := range kinks {
		if k > low && k < high {
			edges = append(edges, k)
		}
	}
	edges = append(edges, high)
	for i := range len(edges) - 1 {
		a, b := edges[i], edges[i+1]
		if b-a < 1e-6*(1+math.Abs(b)) {
			continue
		}
		at := func(part float64) float64 { return a + part*(b-a) }
		x, y, z := at(0.001), at(rapid.Float64Range(0.1, 0.9).Draw(t, "part")), at(0.999)
		if !lines { // away from the first crown, which the power form subsidises without bound
			h := 1e-4 * (y - a)
			x, z = y-h, y+h
		}
		chord := (f(z) - f(x)) / (z - x)
		scale := (math.Abs(f(x)) + math.Abs(f(z)) + math.Abs(z)) / (z - x) * 1e-13
		tolerance := 1e-9 + scale
		if !lines {
			tolerance = 1e-6*(1+math.Abs(chord)) + scale
		}
		for _, side := range []pension.Side{pension.Below, pension.Above} {
			if got := slope(y, side); math.Abs(got-chord) > tolerance {
				t.Fatalf("slope %v at %v on side %d, between kinks %v and %v; the chord has %v", got, y, side, a, b, chord)
			}
		}
		if inner := f(x) + chord*(y-x); lines && math.Abs(f(y)-inner) > 1e-9*(1+math.Abs(inner)) {
			t.Fatalf("f(%v) = %v between kinks %v and %v, a line has %v", y, f(y), a, b, inner)
		}
		if chord < -tolerance && !falls {
			t.Fatalf("falls with slope %v between %v and %v", chord, a, b)
		}
		// One-sided slopes at the kinks themselves are those of the pieces beside them.
		if lines && b-a > 1 {
			if got := slope(a+1e-9*(1+math.Abs(a)), pension.Above); math.Abs(got-chord) > tolerance {
				t.Fatalf("slope %v just above the kink %v, the chord has %v", got, a, chord)
			}
			if got := slope(b-1e-9*(1+math.Abs(b)), pension.Below); math.Abs(got-chord) > tolerance {
				t.Fatalf("slope %v just below the kink %v, the chord has %v", got, b, chord)
			}
		}
	}
}

// Kinks are complete and slopes right, on either side, in every direction.
func TestResourcesBendOnlyAtKinks(t *testing.T) {
	for _, power := range []bool{false, true} {
		rapid.Check(t, func(t *rapid.T) {
			l := lawful(t, power)
			k := rapid.IntRange(0, 60).Draw(t, "year")
			r := pension.Receipts{Employed: rapid.Bool().Draw(t, "employed"), Claimed: rapid.Bool().Draw(t, "claimed"),
				Earnings: rapid.Float64Range(1, 120000).Draw(t, "earnings")}
			if r.Claimed {
				r.Pension = rapid.Float64Range(1, 60000).Draw(t, "pension")
			}
			assets := rapid.OneOf(rapid.Just(0.0), rapid.Float64Range(-10000, 300000)).Draw(t, "assets")
			earnings := func(x float64) pension.Receipts { r := r; r.Earnings = x; return r }
			receipt := func(x float64) pension.Receipts { r := r; r.Pension = x; return r }
			low := -20000.0
			if power {
				low = 0
			}
			checkPieces(t, func(x float64) float64 { return l.Resources(k, earnings(x), assets) },
				func(x float64, s pension.Side) float64 {
					d, _, _ := l.ResourcesSlopes(k, earnings(x), assets, s)
					return d
				},
				l.EarningsKinks(k, r, assets), low, 200000, !power, false)
			checkPieces(t, func(x float64) float64 { return l.Resources(k, receipt(x), assets) },
				func(x float64, s pension.Side) float64 {
					_, d, _ := l.ResourcesSlopes(k, receipt(x), assets, s)
					return d
				},
				l.ReceiptKinks(k, r, assets), 0, 200000, !power, false)
			checkPieces(t, func(x float64) float64 { return l.Resources(k, r, x) },
				func(x float64, s pension.Side) float64 { _, _, d := l.ResourcesSlopes(k, r, x, s); return d },
				l.AssetKinks(k, r), -20000, 800000, true, true)
			if a := l.Account(k, r, assets); math.Abs(a.Earnings+a.Pension+a.TopUp-a.Employee-a.Pensioner-a.Tax-a.Net) > 1e-9 || a.Net+a.Assistance != l.Resources(k, r, assets) {
				t.Fatalf("an account that does not add up: %+v", a)
			}
		})
	}
}

// The same for entitlements, before and after the claim.
func TestEntitlementsBendOnlyAtKinks(t *testing.T) {
	for _, power := range []bool{false, true} {
		rapid.Check(t, func(t *rapid.T) {
			l := lawful(t, power)
			k := rapid.IntRange(0, 44).Draw(t, "year")
			e := pension.Entitlement{rapid.Float64Range(0, 2).Draw(t, "average"), rapid.Float64Range(0, 60).Draw(t, "points")}
			employed := rapid.Bool().Draw(t, "employed")
			for i := range e {
				checkPieces(t, func(x float64) float64 { return l.Next(k, e, x, employed)[i] },
					func(x float64, s pension.Side) float64 { return l.NextSlopes(k, x, employed, s)[i] },
					l.NextKinks(k, employed), -20000, 300000, true, false)
				with := func(x float64) pension.Entitlement { e := e; e[i] = x; return e }
				if got, want := l.Growth(k)[i], l.Next(k, with(1), 0, true)[i]; got != want {
					t.Fatalf("growth %v, a unit becomes %v", got, want)
				}
				later := rapid.IntRange(45, 80).Draw(t, "later")
				assets := rapid.Float64Range(0, 100000).Draw(t, "assets")
				checkPieces(t, func(x float64) float64 { return l.Pension(45, later, with(x), 0) },
					func(x float64, s pension.Side) float64 {
						d, _ := l.PensionSlopes(45, later, with(x), 0, s)
						return d[i]
					}, l.PensionKinks(45)[i], 0, 100, true, false)
				receipts := func(x float64) pension.Receipts {
					return pension.Receipts{Pension: l.Pension(45, later, with(x), 0), Claimed: true}
				}
				checkPieces(t, func(x float64) float64 { return l.Resources(later, receipts(x), assets) },
					func(x float64, s pension.Side) float64 {
						_, byPension, _ := l.ResourcesSlopes(later, receipts(x), assets, s)
						d, _ := l.PensionSlopes(45, later, with(x), 0, s)
						return byPension * d[i]
					}, l.EntitlementKinks(45, later, e, 0, assets)[i], 0, 100, !power, false)
			}
		})
	}
}

// By hand, one kink of each: the ceiling, the edges of brackets seen through deductible
// contributions and the minimum, and what assistance adds.
func TestKinksByHand(t *testing.T) {
	l := law(t, quayside(), cohort(makeham(0, 0.001, 1.1, 20, 100)))
	check := func(what string, got []float64, want ...float64) {
		t.Helper()
		if len(got) != len(want) {
			t.Errorf("%s: kinks %v, want %v", what, got, want)
			return
		}
		for i := range got {
			near(t, what, got[i], want[i], 1e-8)
		}
	}
	// y − 0.05·y = 10000 and 40000; the ceiling.
	check("earnings", l.EarningsKinks(20, pension.Receipts{Employed: true}, 0), 0, 10000/0.95, 40000/0.95, 60000)
	check("benefits", l.EarningsKinks(20, pension.Receipts{}, 0), 10000, 40000)
	// P* = P + 9000 − P/2 below 18000; 0.8·(P* − 0.025·P*) = 10000 at P* = 12820.51…;
	// 40000 at 51282.05…; the ceiling.
	check("pensions", l.ReceiptKinks(20, pension.Receipts{Claimed: true}, 0), (10000/0.78-9000)*2, 18000, 40000/0.78, 60000)
	// At 60 wages are 1.01^20 times as high. Net income 2000 and (14000−…)/0.6 + 2000 of
	// a household without earnings; only the second is above the minimum's net.
	k := l.Wage(40) / l.Wage(20)
	end := 14000/0.6 + 2000 // net income at which assistance ends: 25333.33
	// P between 18000 and 51282: net = 0.95·P − 0.2·(0.78·P − 10000) = 0.794·P + 2000.
	check("pensions with assistance", l.ReceiptKinks(40, pension.Receipts{Claimed: true}, 0),
		(10000/0.78-9000)*2*k, 18000*k, (end-2000)/0.794*k, 40000/0.78*k, 60000*k)
	check("assets", l.AssetKinks(40, pension.Receipts{}), 20000*k, 160000*k)
}
