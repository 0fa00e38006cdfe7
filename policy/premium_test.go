package policy

import (
	"context"
	"math"
	"testing"
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
	begins := []Begin{{0, 0.25}, {1, 0.5}, {4, 0.25}}
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
		if math.Abs(got-want) > 1e-6 {
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
		if got := NewValue(r, 1).Expected([]Begin{{2, 0.5}, {4, 0.5}}); math.Abs(got-risky) > 1e-12*math.Abs(risky) {
			t.Errorf("alpha %v: the risky year is worth %v, want %v", alpha, got, risky)
		}
		k := 1 - math.Log(math.Cosh(alpha))/(3*alpha)
		if got := NewValue(r, k).Expected([]Begin{{3, 1}}); math.Abs(got-risky) > 1e-12*math.Abs(risky) {
			t.Errorf("alpha %v: the certain year scaled by %v is worth %v, want %v", alpha, k, got, risky)
		}
	}
}

// Without risk there is nothing to be rid of; more risk costs more; and what cannot
// be answered is an error.
func TestEquivalentPremiumOrder(t *testing.T) {
	h := shortLives(t)["crra"]
	twin := solved(t, twinOf(t, h))
	if got, err := EquivalentPremium([]*Rule{twin}, []*Rule{twin}, []Begin{{1, 1}}); got != 0 || err != nil {
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
		got, err := EquivalentPremium([]*Rule{solved(t, risky)}, []*Rule{solved(t, twinOf(t, risky))}, []Begin{{1, 1}})
		if err != nil || got <= before {
			t.Errorf("premium %v after %v, %v", got, before, err)
		}
		before = got
	}
	if _, err := EquivalentPremium(nil, nil, nil); err == nil {
		t.Error("a premium of nobody")
	}
}
