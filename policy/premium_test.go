package policy

import (
	"context"
	"math"
	"testing"

	"cistern/income"
)

func solved(t *testing.T, h Household) *Rule {
	t.Helper()
	r, err := Solve(context.Background(), h, DefaultOptions())
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func twinOf(t *testing.T, h Household) Household {
	t.Helper()
	twin, err := h.Twin()
	if err != nil {
		t.Fatal(err)
	}
	return twin
}

// Under CRRA utility the premium is (V_risky/V_certain)^(1/(1−γ)) (derived:
// homothetic utility scales values by k^(1−γ)), and with log utility
// exp((V_risky − V_certain)/K).
func TestEquivalentPremiumHomothetic(t *testing.T) {
	begins := []Begin{{Assets: 0, Probability: 0.25}, {Assets: 1, Probability: 0.5}, {Assets: 4, Probability: 0.25}}
	lives := shortLives(t)
	for _, name := range []string{"crra", "low aversion", "log"} {
		h := lives[name]
		risky, certain := solved(t, h), solved(t, twinOf(t, h))
		got, err := EquivalentPremium([]*Rule{risky}, []*Rule{certain}, begins)
		if err != nil {
			t.Fatal(err)
		}
		v, w := NewValue(risky, 1), NewValue(certain, 1)
		gamma := h.Utility.RelativeRiskAversion(1)
		want := 1 - math.Pow(v.Expected(begins)/w.Expected(begins), 1/(1-gamma))
		if gamma == 1 {
			want = 1 - math.Exp((v.Expected(begins)-w.Expected(begins))/v.horizon[0])
		}
		if math.Abs(got-want) > 1e-11 {
			t.Errorf("%s: premium %v, want %v", name, got, want)
		}
		if !(got > 0.001 && got < 0.5) {
			t.Errorf("%s: premium %v", name, got)
		}
	}
}

// In a life of one year the household consumes what it has, and the premium is
// Pratt's: with CARA utility and cash 3 ± 1, exp(−α·3(1−λ)) = cosh(α)·exp(−3α)
// (derived), so λ = log cosh(α)/(3α), near ασ²/(2·3) where α is small.
func TestEquivalentPremiumOfOneYear(t *testing.T) {
	for _, alpha := range []float64{0.05, 0.5, 2} {
		h := certainHousehold(t, family(t)(NewCARA(alpha)), constant(0), 1, 0.96, 0, Limit{})
		r := solved(t, h)
		risky := 0.5*h.Utility.Value(2) + 0.5*h.Utility.Value(4)
		if got := NewValue(r, 1).Expected([]Begin{{Assets: 2, Probability: 0.5}, {Assets: 4, Probability: 0.5}}); math.Abs(got-risky) > 1e-12*math.Abs(risky) {
			t.Errorf("alpha %v: the risky year is worth %v, want %v", alpha, got, risky)
		}
		k := 1 - math.Log(math.Cosh(alpha))/(3*alpha)
		if got := NewValue(r, k).Expected([]Begin{{Assets: 3, Probability: 1}}); math.Abs(got-risky) > 1e-12*math.Abs(risky) {
			t.Errorf("alpha %v: the certain year scaled by %v is worth %v, want %v", alpha, k, got, risky)
		}
	}
}

// The premium for the income of one year, y + ε, on top of assets a: α·σ²/(2(y + a))
// with CARA utility and normal ε, and 1 − exp(−γσ²/2) with CRRA utility, lognormal
// income and a = 0 (derived from the moment-generating function of the normal). Where
// the risk is small it is half its variance over mean squared times relative risk
// aversion there (Pratt 1964, eq. 7 and section 6).
func TestEquivalentPremiumOfOneRisk(t *testing.T) {
	of := family(t)
	premium := func(u Utility, form income.Form, sd, assets float64) float64 {
		p := process{years: 1, profile: constant(3), form: form, transitory: income.Transitory{SD: sd, Nodes: 41, Rule: income.GaussHermite}}
		h := Household{FirstAge: 25, Survival: alive(1), Utility: u, DiscountFactor: 0.96, Return: 0.25, Earnings: p.build(t, 25), Pension: Pension{ClaimAge: 26}}
		got, err := EquivalentPremium([]*Rule{solved(t, h)}, []*Rule{solved(t, twinOf(t, h))}, []Begin{{Assets: assets, Probability: 1}})
		if err != nil {
			t.Fatal(err)
		}
		return got
	}
	for _, sd := range []float64{0.05, 0.2, 0.6} {
		if got, want := premium(of(NewCARA(1.5)), income.Level, sd, 2), 1.5*sd*sd/2/(3+1.25*2); math.Abs(got-want) > 1e-10 {
			t.Errorf("cara, sd %v: premium %v, want %v", sd, got, want)
		}
		for _, gamma := range []float64{0.5, 1, 4} {
			if got, want := premium(of(NewCRRA(gamma)), income.Log, sd, 0), -math.Expm1(-gamma*sd*sd/2); math.Abs(got-want) > 1e-9 {
				t.Errorf("gamma %v, sd %v: premium %v, want %v", gamma, sd, got, want)
			}
		}
	}
	for _, u := range []Utility{of(NewCRRA(3)), of(NewStoneGeary(2, 1.5)), of(NewCARA(0.7)), of(NewQuadratic(9)), foreign{of(NewCRRA(2))}} {
		const sd, wealth = 0.01, 3 + 1.25*0.8
		want := u.RelativeRiskAversion(wealth) * sd * sd / (2 * wealth * wealth)
		if got := premium(u, income.Level, sd, 0.8); math.Abs(got/want-1) > 1e-3 {
			t.Errorf("%s: a small risk is worth %v, want %v", u.Family(), got, want)
		}
	}
}

// With CARA utility, without limit, for a certain time and with βR = 1 the certain
// twin consumes c° every year, and a risky life is worth A_0·E u(c_0), A_0 the annuity
// factor of the years: 1 − λ = −ln E exp(−α·c_0)/(α·c°) (derived; c_0 is linear in
// cash-on-hand: policy.CARAChain).
func TestEquivalentPremiumCARA(t *testing.T) {
	const alpha, R, assets = 0.4, 1.03, 2.0
	u, err := NewCARA(alpha)
	if err != nil {
		t.Fatal(err)
	}
	p := process{years: 12, profile: constant(10), form: income.Level, chain: rouwenhorst(t, 5, 0.95, 0.5), transitory: income.Transitory{SD: 1, Nodes: 9}}
	h := Household{FirstAge: 25, Survival: alive(12), Utility: u, DiscountFactor: 1 / R, Return: R - 1, Limit: Limit{Kind: LimitNone}, Earnings: p.build(t, 25), Pension: Pension{ClaimAge: 37}}
	twin := twinOf(t, h)
	risky, certain := CARAChain(u, h.Prospects()), CARAChain(u, twin.Prospects())
	mean := 0.0
	for j, q := range h.Earnings.Distribution[0] {
		incomes, weights := h.Income(0, j)
		for k, y := range incomes {
			mean += q * weights[k] * math.Exp(-alpha*risky.Consumption(0, j, R*assets+y))
		}
	}
	want := 1 + math.Log(mean)/(alpha*certain.Consumption(0, 0, R*assets+10))
	got, err := EquivalentPremium([]*Rule{solved(t, h)}, []*Rule{solved(t, twin)}, []Begin{{Assets: assets, Probability: 1}})
	if err != nil || math.Abs(got-want) > 1e-9 {
		t.Errorf("premium %v, want %v, %v", got, want, err)
	}
	if !(want > 0.02 && want < 0.5) {
		t.Errorf("premium %v is no good for a test", want)
	}
}

// Whatever the unit of money and however strong the curvature, the premium is the same
// (derived: CRRA utility is homothetic, and α·c has no unit).
func TestEquivalentPremiumUnits(t *testing.T) {
	for _, name := range []string{"crra", "cara", "stone_geary", "quadratic"} {
		for _, strength := range []float64{1, 40} {
			var first float64
			for i, unit := range []float64{1, 1e-6, 3e5} {
				h := shortLives(t)[name]
				e := process{years: 3, profile: constant(3 * unit), form: income.Level, chain: rouwenhorst(t, 3, 0.9, 0.2*unit), transitory: income.Transitory{SD: 0.2 * unit, Nodes: 7}}
				h.Earnings, h.Pension.Flat = e.build(t, 60), unit
				switch name {
				case "crra":
					h.Utility = CRRA{2.3 * strength}
				case "cara":
					h.Utility = CARA{0.5 * strength / unit}
				case "stone_geary":
					h.Utility = StoneGeary{1.7 * strength, 0.2 * unit}
				case "quadratic":
					h.Utility = Quadratic{30 * unit * strength}
				}
				got, err := EquivalentPremium([]*Rule{solved(t, h)}, []*Rule{solved(t, twinOf(t, h))}, []Begin{{Assets: unit, Probability: 1}})
				if i == 0 {
					first = got
				}
				if err != nil || math.Abs(got-first) > 1e-8 || !(got > 1e-6 && got < 0.9) {
					t.Errorf("%s, strength %v, unit %v: premium %v, %v, want %v", name, strength, unit, got, err, first)
				}
			}
		}
	}
}

// A life with k times the consumption is worth what 1 + λ = k says, and back (derived).
func TestEquivalentVariation(t *testing.T) {
	begins := []Begin{{Assets: 1, Probability: 1}}
	h := shortLives(t)["crra"]
	rich := h
	e := process{years: 3, profile: constant(3), chain: rouwenhorst(t, 3, 0.9, 0.2)}
	h.Earnings = e.build(t, 60)
	e.profile = constant(3 * 1.2)
	rich.Earnings, rich.Pension.Flat = e.build(t, 60), 1.2*h.Pension.Flat
	poor, better := solved(t, h), solved(t, rich)
	up, err := EquivalentVariation([]*Rule{poor}, []*Rule{better}, []Begin{{Assets: 0, Probability: 1}})
	if err != nil || math.Abs(up-0.2) > 1e-7 {
		t.Errorf("all incomes by a fifth higher are worth %v of consumption, %v", up, err)
	}
	up, err = EquivalentVariation([]*Rule{poor}, []*Rule{better}, begins)
	down, err2 := EquivalentVariation([]*Rule{better}, []*Rule{poor}, begins)
	if err != nil || err2 != nil || math.Abs((1+up)*(1+down)-1) > 1e-10 || !(up > 0.05) {
		t.Errorf("up %v, down %v, %v, %v", up, down, err, err2)
	}
}

// A falling function's root is found to 1e-12, also where the function is steep, flat
// or not a number on one side.
func TestRoot(t *testing.T) {
	for name, f := range map[string]func(float64) float64{
		"line":     func(x float64) float64 { return 0.3 - x },
		"steep":    func(x float64) float64 { return 1/(x+1e-9) - 1/(0.3+1e-9) },
		"flat":     func(x float64) float64 { return -math.Pow(x-0.3, 3) },
		"step":     func(x float64) float64 { return 1 - 2*math.Round(x+0.2) },
		"one side": func(x float64) float64 { return math.Sqrt(0.3-x) + 1 },
	} {
		calls := 0
		got := root(func(x float64) float64 { calls++; return f(x) }, 0, 1)
		if math.Abs(got-0.3) > 2e-12 {
			t.Errorf("%s: root %v, want 0.3", name, got)
		}
		if calls > 200 || name == "steep" && calls > 30 {
			t.Errorf("%s: %d calls", name, calls)
		}
	}
}

// Without risk there is nothing to be rid of; more risk costs more; and what cannot
// be answered is an error.
func TestEquivalentPremiumOrder(t *testing.T) {
	h := shortLives(t)["crra"]
	twin := solved(t, twinOf(t, h))
	if got, err := EquivalentPremium([]*Rule{twin}, []*Rule{twin}, []Begin{{Assets: 1, Probability: 1}}); got != 0 || err != nil {
		t.Errorf("premium %v, %v without risk", got, err)
	}
	before := 0.0
	for _, sd := range []float64{0, 0.2, 0.4} {
		risky := h
		e := *h.Earnings
		risky.Earnings = &e
		p := process{years: 3, profile: func(int) float64 { return 3 }, chain: rouwenhorst(t, 3, 0.9, 0.1)}
		p.transitory.SD, p.transitory.Nodes = sd, 7
		risky.Earnings = p.build(t, 60)
		got, err := EquivalentPremium([]*Rule{solved(t, risky)}, []*Rule{solved(t, twinOf(t, risky))}, []Begin{{Assets: 1, Probability: 1}})
		if err != nil || got <= before {
			t.Errorf("premium %v after %v, %v", got, before, err)
		}
		before = got
	}
	if _, err := EquivalentPremium(nil, nil, nil); err == nil {
		t.Error("a premium of nobody")
	}
}
