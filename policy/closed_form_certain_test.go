package policy

import (
	"fmt"
	"math"
	"testing"

	"pgregory.net/rapid"
)

// steady returns a lifetime with constant discount factor and return.
func steady(years int, income func(t int) float64, discount, gross float64) Lifetime {
	l := Lifetime{Income: make([]float64, years)}
	for t := range years {
		l.Income[t] = income(t)
		if t > 0 {
			l.Discount, l.Gross = append(l.Discount, discount), append(l.Gross, gross)
		}
	}
	return l
}

// anyLifetime draws up to 40 years with discount factors, returns and incomes that
// all change by year.
func anyLifetime(t *rapid.T) Lifetime {
	years := rapid.IntRange(1, 40).Draw(t, "years")
	l := Lifetime{Income: rapid.SliceOfN(rapid.Float64Range(0.1, 5), years, years).Draw(t, "income")}
	l.Discount = rapid.SliceOfN(rapid.Float64Range(0.8, 1.05), years-1, years-1).Draw(t, "discount")
	l.Gross = rapid.SliceOfN(rapid.Float64Range(0.95, 1.1), years-1, years-1).Draw(t, "gross")
	return l
}

// Propensities to consume, derived: κ_n = (1−x)/(1−x^(n+1)), x = (βR)^(1/γ)/R,
// computed apart to 12 digits for R = 1.03, β = 0.96.
func TestCertainCRRAPropensities(t *testing.T) {
	years := []int{1, 2, 10, 60}
	for _, tt := range []struct {
		gamma float64
		want  [4]float64
	}{
		{0.5, [4]float64{0.513018353745, 0.350837829531, 0.116368144428, 0.052960583903}},
		{1, [4]float64{0.510204081633, 0.347029428096, 0.110570339393, 0.043615660721}},
		{2, [4]float64{0.508796691822, 0.345129822462, 0.107729984651, 0.039154797623}},
		{5, [4]float64{0.507952189572, 0.343991565049, 0.106044897580, 0.036562313315}},
	} {
		for i, n := range years {
			r := CertainCRRA(CRRA{tt.gamma}, steady(n+1, constant(1), 0.96, 1.03))
			if got := r.Propensity[0]; math.Abs(got-tt.want[i]) > 6e-13 {
				t.Errorf("γ = %g, %d years ahead: κ = %.13f, want %.12f", tt.gamma, n, got, tt.want[i])
			}
		}
	}
}

// Derived: the closed form evaluated apart, y_t = 1 + 0.03t − 0.0006t² for 40 years,
// then 0.6 for 21.
func TestCertainCRRAPath(t *testing.T) {
	for _, tt := range []struct{ gamma, first, last float64 }{
		{0.5, 1.754613219589, 0.454146871153},
		{2, 1.297219940881, 0.925267586335},
		{5, 1.211329512512, 1.058190336816},
	} {
		l := steady(61, hump, 0.96, 1.03)
		c := CertainCRRA(CRRA{tt.gamma}, l).Path(l, 1.5)
		if math.Abs(c[0]-tt.first) > 6e-13 || math.Abs(c[60]-tt.last) > 6e-13 {
			t.Errorf("γ = %g: c_0 = %.13f, c_T = %.13f, want %.12f, %.12f", tt.gamma, c[0], c[60], tt.first, tt.last)
		}
	}
}

// Every path without a limit satisfies the Euler equation in every year and spends
// the household's lifetime resources to the last (derived: the two conditions
// define the solution).
func TestCertainPaths(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l := anyLifetime(t)
		cash := rapid.Float64Range(5, 50).Draw(t, "cash")
		for _, s := range []struct {
			u Utility
			r LinearRule
		}{
			{CRRA{2.5}, CertainCRRA(CRRA{2.5}, l)},
			{CRRA{1}, CertainCRRA(CRRA{1}, l)},
			{StoneGeary{2, 0.05}, CertainStoneGeary(StoneGeary{2, 0.05}, l)},
			{CARA{0.7}, CertainCARA(CARA{0.7}, l)},
			{Quadratic{500}, CertainQuadratic(Quadratic{500}, l)},
		} {
			c := s.r.Path(l, cash)
			resources := l.LifetimeResources(cash)
			if got := PresentValue(c, l.Gross); relative(got, resources) > 1e-12 {
				t.Errorf("%s: spends %.15g of %.15g", s.u.Family(), got, resources)
			}
			for i := range l.Gross {
				now, next := s.u.Marginal(c[i]), l.Discount[i]*l.Gross[i]*s.u.Marginal(c[i+1])
				if !(relative(next, now) < 1e-9) {
					t.Errorf("%s: Euler equation of year %d misses by %g", s.u.Family(), i, relative(next, now))
				}
			}
		}
	})
}

// Under CARA utility an income moved to another year at the same present value
// changes nothing (derived: only its present value enters).
func TestCertainCARATiming(t *testing.T) {
	early := steady(30, constant(1), 0.95, 1.04)
	late := steady(30, constant(1), 0.95, 1.04)
	early.Income[1] += 2
	late.Income[25] += 2 * math.Pow(1.04, 24)
	a, b := CertainCARA(CARA{2}, early), CertainCARA(CARA{2}, late)
	if got, want := a.Consumption(0, 0, 3), b.Consumption(0, 0, 3); relative(got, want) > 1e-14 {
		t.Errorf("c_0 = %.16g with early, %.16g with late income", got, want)
	}
	if rise := math.Log(0.95*1.04) / 2; math.Abs(a.Path(early, 3)[7]-a.Path(early, 3)[6]-rise) > 1e-14 {
		t.Errorf("consumption does not step by ln(βR)/α = %g", rise)
	}
}

// Present values by hand: 1 + 2/1.1 + 3/(1.1·1.2).
func TestPresentValue(t *testing.T) {
	want := 1 + 2/1.1 + 3/(1.1*1.2)
	if got := PresentValue([]float64{1, 2, 3}, []float64{1.1, 1.2}); relative(got, want) > 1e-15 {
		t.Errorf("present value %.16g, want %.16g", got, want)
	}
	l := Lifetime{Income: []float64{9, 2, 3}, Discount: []float64{1, 1}, Gross: []float64{1.1, 1.2}}
	if got := l.LifetimeResources(1); relative(got, want) > 1e-15 {
		t.Errorf("lifetime resources %.16g, want %.16g", got, want)
	}
	want = 1 + 1/1.1 + 1/(1.1*1.2)
	if got := AnnuityFactors([]float64{1.1, 1.2})[0]; relative(got, want) > 1e-15 {
		t.Errorf("annuity factor %.16g, want %.16g", got, want)
	}
}

// limitIncome is 1 + 0.05t − 0.0009t² for 42 years, then 0.5.
func limitIncome(t int) float64 {
	if t >= 42 {
		return 0.5
	}
	x := float64(t)
	return 1 + 0.05*x - 0.0009*x*x
}

// Derived: the minimum over horizons evaluated apart, R = 1.03, β = 0.94.
func TestCertainLimit(t *testing.T) {
	for _, tt := range []struct{ gamma, cash, want float64 }{
		{0.7, 1, 1}, {0.7, 4, 1.818987353054}, {0.7, 20, 3.678198749322},
		{2, 1, 1}, {2, 4, 1.637794781603}, {2, 20, 2.694664449157},
		{5, 1, 1}, {5, 4, 1.566411618229}, {5, 20, 2.252511021565},
	} {
		s := NewCertainLimit(StoneGeary{tt.gamma, 0}, steady(61, limitIncome, 0.94, 1.03), 0)
		if got, _ := s.Consumption(0, tt.cash); math.Abs(got-tt.want) > 6e-13 {
			t.Errorf("γ = %g: c_0(%g) = %.13f, want %.12f", tt.gamma, tt.cash, got, tt.want)
		}
	}
}

// The conditions that define the solution with a limit (derived: Kuhn & Tucker):
// assets stay at or above −b_t, marginal utility falls no slower than by 1/(βR), and
// exactly so off the limit; nothing is left at the end.
func TestCertainLimitOptimal(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		l := anyLifetime(t)
		u := StoneGeary{rapid.Float64Range(0.3, 8).Draw(t, "gamma"), rapid.SampledFrom([]float64{0, 0.05}).Draw(t, "floor")}
		borrowing := rapid.SampledFrom([]float64{0, 0.4, math.Inf(1)}).Draw(t, "borrowing")
		cash := rapid.Float64Range(0.2, 30).Draw(t, "cash")
		s := NewCertainLimit(u, l, borrowing)
		c := s.Path(cash)
		human := l.less(u.subsistence).HumanWealth()
		for i := range c {
			assets := cash - c[i]
			slack := assets + math.Min(borrowing, human[i])
			if slack < -1e-9 {
				t.Errorf("year %d: assets %g below the limit by %g", i, assets, -slack)
			}
			if i == len(l.Gross) {
				if math.Abs(assets) > 1e-9 {
					t.Errorf("%g left at the end", assets)
				}
				break
			}
			ratio := l.Discount[i] * l.Gross[i] * u.Marginal(c[i+1]) / u.Marginal(c[i])
			if ratio > 1+1e-7 || slack > 1e-7 && ratio < 1-1e-7 {
				t.Errorf("year %d: βR·u′(c′)/u′(c) = %.12f with slack %g", i, ratio, slack)
			}
			if _, binds := s.Consumption(i, cash); (binds == i) != (slack < 1e-9) && math.Abs(slack) > 1e-7 {
				t.Errorf("year %d: next limit said to bind in year %d, slack %g", i, binds, slack)
			}
			cash = l.Gross[i]*assets + l.Income[i+1]
		}
	})
}

// A limit that cannot bind changes nothing (derived).
func TestCertainLimitNatural(t *testing.T) {
	l := steady(61, hump, 0.96, 1.03)
	for _, u := range []StoneGeary{{2, 0}, {2, 0.3}} {
		free := CertainStoneGeary(u, l)
		s := NewCertainLimit(u, l, math.Inf(1))
		for _, year := range []int{0, 30, 60} {
			got, binds := s.Consumption(year, 1.5)
			if want := free.Consumption(year, 0, 1.5); relative(got, want) > 1e-13 || binds != 60 {
				t.Errorf("%v year %d: c = %.15g, binds in %d; want %.15g, 60", u, year, got, binds, want)
			}
		}
	}
}

func TestClosedFormShapes(t *testing.T) {
	for i, f := range []func(){
		func() { PresentValue([]float64{1, 2}, nil) },
		func() { CertainCRRA(CRRA{2}, Lifetime{Income: []float64{1, 2}, Gross: []float64{1}}) },
		func() { CARAChain(CARA{2}, Prospects{}) },
		func() {
			CARAChain(CARA{2}, Prospects{Income: [][][]float64{{{1, 2}}}, Weight: [][][]float64{{{1}}}})
		},
	} {
		t.Run(fmt.Sprint(i), func(t *testing.T) {
			defer func() {
				if recover() == nil {
					t.Error("no panic on wrong shapes")
				}
			}()
			f()
		})
	}
}
