package transfer

import (
	"context"
	"errors"
	"math"
	"reflect"
	"strings"
	"testing"

	"cistern/income"
	"cistern/policy"
	"cistern/sim"
)

// household is an invented one of 50 years with income risk and mortality.
func household(tb testing.TB, form income.Form, u policy.Utility, limit policy.Limit) policy.Household {
	tb.Helper()
	const years, working = 50, 35
	sd := map[income.Form]float64{income.Log: 0.15, income.Level: 0.05}[form]
	chain, err := income.Rouwenhorst{Points: 5}.Discretise(income.AR1{Autocorrelation: 0.9, InnovationSD: sd})
	if err != nil {
		tb.Fatal(err)
	}
	e, err := income.Process{FirstAge: 30, Profile: income.Constant(1, working), Form: form, Chain: chain, Initial: chain.Stationary(),
		Transitory: income.Transitory{SD: 0.1, Nodes: 15}, JobLoss: income.JobLoss{Probability: 0.05, BenefitRate: 0.5}}.Build()
	if err != nil {
		tb.Fatal(err)
	}
	survival, err := income.Gompertz{ModalAge: 75, Dispersion: 9}.Survival(30, 30+years-1)
	if err != nil {
		tb.Fatal(err)
	}
	return policy.Household{FirstAge: 30, Survival: survival, Utility: u, DiscountFactor: 0.96, Return: 0.03, Earnings: e, Limit: limit,
		Pension: policy.Pension{ClaimAge: 30 + working, FinalEarningsRate: 0.5}}
}

func crra(tb testing.TB) policy.Household {
	tb.Helper()
	u, err := policy.NewCRRA(2)
	if err != nil {
		tb.Fatal(err)
	}
	return household(tb, income.Log, u, policy.Limit{})
}

func cara(tb testing.TB) policy.Household {
	tb.Helper()
	u, err := policy.NewCARA(2)
	if err != nil {
		tb.Fatal(err)
	}
	return household(tb, income.Level, u, policy.Limit{Kind: policy.LimitNone})
}

// population is one group of the given types, equally likely.
func population(tb testing.TB, households int64, start sim.Start, types ...policy.Household) *sim.Population {
	tb.Helper()
	p := &sim.Population{Seed: 7, Households: households, Groups: []sim.Group{{Name: "dockers", Share: 1}}}
	for _, h := range types {
		rule, err := policy.Solve(tb.Context(), h, policy.DefaultOptions())
		if err != nil {
			tb.Fatal(err)
		}
		p.Groups[0].Types = append(p.Groups[0].Types, len(p.Types))
		p.Types = append(p.Types, sim.Type{Rule: rule, Start: start})
	}
	return p
}

func run(tb testing.TB, p *sim.Population, o Options) *Result {
	tb.Helper()
	r, err := Run(tb.Context(), p, o)
	if err != nil {
		tb.Fatal(err)
	}
	return r
}

// life is every row of one household.
type life struct {
	cash, consumption, assets, before, income, propensity []float64 // by year from the first age
	node                                                  []uint8
	kind                                                  int
}

// lifetimes holds everybody's life, for naive computations.
func lifetimes(tb testing.TB, p *sim.Population) []life {
	tb.Helper()
	all := make([]life, p.Households)
	_, err := sim.Simulate(tb.Context(), p, sim.Options{Columns: sim.All}, func(_ int, b *sim.Block) (func() error, error) {
		for _, r := range b.Runs {
			for k := r.From; k < r.To; k++ {
				l := &all[b.Household[k]]
				l.kind, l.node = r.Type, append(l.node, b.Node[k])
				for _, c := range []struct {
					to   *[]float64
					from []float64
				}{{&l.cash, b.CashOnHand}, {&l.consumption, b.Consumption}, {&l.assets, b.Assets}, {&l.before, b.LastAssets},
					{&l.income, b.Income}, {&l.propensity, b.Propensity}} {
					*c.to = append(*c.to, c.from[k])
				}
			}
		}
		return nil, nil
	})
	if err != nil {
		tb.Fatal(err)
	}
	return all
}

func sum(parts [Parts]float64) (s float64) {
	for _, x := range parts {
		s += x
	}
	return s
}

func near(tb testing.TB, what string, got, want, relative float64) {
	tb.Helper()
	if !(math.Abs(got-want) <= relative*(1e-300+math.Abs(want))) {
		tb.Errorf("%s: %.15g, want %.15g", what, got, want)
	}
}

var wholeLife = []Band{{30, 79}}

// alive counts those who live to year t.
func alive(all []life, t int) (n float64) {
	for _, l := range all {
		if len(l.cash) > t {
			n++
		}
	}
	return n
}

// With exponential utility and no limit the transfer is eaten as an annuity: x/A_t
// a year as long as the household lives, whatever its size or sign (derived:
// package comment).
func TestAnnuityUnderExponentialUtility(t *testing.T) {
	h := cara(t)
	p := population(t, 3000, sim.Start{}, h)
	factors := policy.AnnuityFactors(h.Lifetime().Gross)
	all := lifetimes(t, p)
	for _, amount := range []float64{0.2, 7, -3} {
		for _, age := range []int{30, 47, 70, 79} {
			r := run(t, p, Options{Amount: amount, Ages: []int{age}, Years: 12, Bands: wholeLife})
			s := r.Cell(0, 0, 0)
			at := age - 30
			near(t, "received", sum(s.Weight), alive(all, at), 0)
			kept := amount
			for since := 0; since <= min(12, 49-at); since++ {
				share := amount / factors[at]
				near(t, "consumed", sum(s.Consumed[since]), share*alive(all, at+since), 1e-9)
				if kept -= share; at+since < 49 {
					near(t, "kept", sum(s.Kept[since]), kept*alive(all, at+since), 1e-8)
				}
				kept *= 1.03
			}
			if last := 50 - at; last <= 12 && sum(s.Consumed[last]) != 0 {
				t.Errorf("age %d: consumes after the last age", age)
			}
		}
	}
}

// With quadratic utility the rule is linear too: the extra money m grows by
// R·(1 − c_m) a year and c_m = 1/D_t of it is consumed (derived; the propensities
// are those of the certainty-equivalent closed form).
func TestCertaintyEquivalence(t *testing.T) {
	u, err := policy.NewQuadratic(200)
	if err != nil {
		t.Fatal(err)
	}
	h := household(t, income.Level, u, policy.Limit{Kind: policy.LimitNone})
	p := population(t, 2000, sim.Start{}, h)
	closed := policy.QuadraticChain(u, h.Prospects()).Propensity
	all := lifetimes(t, p)
	const at, amount = 20, 1.5
	r := run(t, p, Options{Amount: amount, Ages: []int{30 + at}, Years: 8, Bands: wholeLife})
	s := r.Cell(0, 0, 0)
	extra := amount
	for since := range 9 {
		near(t, "consumed", sum(s.Consumed[since]), closed[at+since]*extra*alive(all, at+since), 1e-8)
		extra *= 1.03 * (1 - closed[at+since])
	}
	near(t, "propensity", sum(s.Propensity)/sum(s.Weight), closed[at], 1e-9)
}

// A transfer at the first age is a larger start: simulating a population with it
// gives the same response. Several types, deaths, binding limits.
func TestTransferIsALargerStart(t *testing.T) {
	h := crra(t)
	impatient := h
	impatient.DiscountFactor = 0.85
	const amount = 0.8
	p := population(t, sim.Unit+500, sim.Start{Constant: 0.1}, h, impatient)
	r := run(t, p, Options{Amount: amount, Ages: []int{30}, Years: 49, Bands: wholeLife})
	poor := lifetimes(t, p)
	for i := range p.Types {
		p.Types[i].Start.Constant += amount / 1.03
	}
	rich := lifetimes(t, p)
	s := r.Cell(0, 0, 0)
	for since := range 50 {
		consumed, kept := 0.0, 0.0
		for i, l := range poor {
			if len(l.cash) > since {
				consumed += rich[i].consumption[since] - l.consumption[since]
				kept += rich[i].assets[since] - l.assets[since]
			}
		}
		if got := sum(s.Consumed[since]); math.Abs(got-consumed) > 1e-10*float64(len(poor)) {
			t.Errorf("%d years on: consumes %.12g more, want %.12g", since, got, consumed)
		}
		if got := sum(s.Kept[since]); math.Abs(got-kept) > 1e-10*float64(len(poor)) {
			t.Errorf("%d years on: keeps %.12g more, want %.12g", since, got, kept)
		}
	}
}

// The response to a small transfer is the rule's propensity; what is off falls with
// the amount (derived: it is the rule's curvature).
func TestSmallTransferMeetsThePropensity(t *testing.T) {
	p := population(t, 4000, sim.Start{Median: 1, LogSD: 1}, crra(t))
	off := func(amount float64) float64 {
		s := run(t, p, Options{Amount: amount, Ages: []int{30, 45, 60, 75}, Bands: wholeLife}).Cell(0, 0, 0)
		return sum(s.Consumed[0])/amount/sum(s.Weight) - sum(s.Propensity)/sum(s.Weight)
	}
	coarse, fine := off(1e-2), off(1e-3)
	if !(math.Abs(coarse) > 1e-5) || !(math.Abs(fine) < 0.15*math.Abs(coarse)) || !(math.Abs(off(1e-6)) < 1e-6) {
		t.Errorf("response less propensity: %.3g for 1e-2, %.3g for 1e-3, %.3g for 1e-6", coarse, fine, off(1e-6))
	}
}

// Who lives at the limit consumes a small transfer at once and whole, and pays a
// small bill at once.
func TestAtTheLimitItIsConsumedWhole(t *testing.T) {
	h := crra(t)
	h.DiscountFactor = 0.3
	p := population(t, 1000, sim.Start{}, h)
	for _, amount := range []float64{0.01, -0.01} {
		s := run(t, p, Options{Amount: amount, Ages: []int{35, 50}, Years: 3, Bands: wholeLife}).Cell(0, 0, 0)
		near(t, "consumed", sum(s.Consumed[0]), amount*float64(s.Receipts), 1e-9)
		for since := 1; since <= 3; since++ {
			if math.Abs(sum(s.Consumed[since])) > 1e-9 || math.Abs(sum(s.Kept[since-1])) > 1e-9 {
				t.Errorf("%d years on something is left", since)
			}
		}
	}
}

// Everything told apart agrees with a naive computation that holds every life.
func TestCellsAgainstNaive(t *testing.T) {
	h := crra(t)
	p := population(t, sim.Unit+300, sim.Start{Median: 1, LogSD: 1, ZeroShare: 0.5}, h, h)
	p.Groups = []sim.Group{{Name: "dockers", Share: 0.4, Types: []int{0}}, {Name: "clerks", Share: 0.6, Types: []int{1}}}
	p.Types[1].Group = 1
	o := Options{Amount: -1.1, Ages: []int{30, 33, 41, 78}, Years: 4, Bands: []Band{{30, 39}, {40, 79}},
		Limits: [][]float64{{0, 0.5}, {0.7, 2}}, Weights: []float64{1, 0.5, 2, 1}}
	got := run(t, p, o)
	want := newResult(p, &o)
	unable := 0
	for id, l := range lifetimes(t, p) {
		rule := p.Types[l.kind].Rule
		for i, age := range o.Ages {
			at := age - 30
			if len(l.cash) <= at {
				continue
			}
			band := 0
			if age >= 40 {
				band = 1
			}
			class := 0
			for _, limit := range o.Limits[band] {
				if l.before[at] > limit {
					class++
				}
			}
			s, w := want.Cell(band, p.Types[l.kind].Group, class), o.Weights[i]
			cash := l.cash[at] + o.Amount
			if cash <= rule.Curves[at][l.node[at]].Bound {
				s.Unable[id%Parts] += w
				unable++
				continue
			}
			s.Receipts++
			s.Weight[id%Parts] += w
			s.Income[id%Parts] += w * l.income[at]
			s.Propensity[id%Parts] += w * l.propensity[at]
			for since := 0; since <= o.Years && at+since < len(l.cash); since++ {
				c, _ := rule.Curves[at+since][l.node[at+since]].At(cash)
				s.Consumed[since][id%Parts] += w * (c - l.consumption[at+since])
				s.Kept[since][id%Parts] += w * (cash - c - l.assets[at+since])
				if at+since+1 < len(l.cash) {
					cash = 1.03*(cash-c) + l.income[at+since+1]
				}
			}
		}
	}
	if unable < 100 {
		t.Fatalf("only %d households cannot pay: the case shows nothing", unable)
	}
	for i := range want.Cells {
		g, w := &got.Cells[i], &want.Cells[i]
		if g.Receipts != w.Receipts || w.Receipts < 50 {
			t.Errorf("cell %d: %d receipts, want %d and at least 50", i, g.Receipts, w.Receipts)
		}
		same := func(what string, a, b [Parts]float64) {
			for part := range a {
				if math.Abs(a[part]-b[part]) > 1e-9 {
					t.Errorf("cell %d, %s, part %d: %.12g, want %.12g", i, what, part, a[part], b[part])
					return
				}
			}
		}
		same("weight", g.Weight, w.Weight)
		same("unable", g.Unable, w.Unable)
		same("income", g.Income, w.Income)
		same("propensity", g.Propensity, w.Propensity)
		for since := range w.Consumed {
			same("consumed", g.Consumed[since], w.Consumed[since])
			same("kept", g.Kept[since], w.Kept[since])
		}
	}
}

func TestWorkersDoNotMatter(t *testing.T) {
	p := population(t, 5*sim.Unit+11, sim.Start{Median: 1, LogSD: 1}, crra(t))
	o := Options{Amount: 0.5, Ages: []int{30, 40, 50}, Years: 3, Bands: wholeLife, Limits: [][]float64{{0.5, 2}}, Workers: 1}
	want := run(t, p, o)
	for _, workers := range []int{2, 5} {
		o.Workers = workers
		if !reflect.DeepEqual(run(t, p, o), want) {
			t.Errorf("%d workers give other sums than one", workers)
		}
	}
}

// Years lived with the transfer are counted, and those in which the rule had to be
// extrapolated.
func TestCounts(t *testing.T) {
	p := population(t, 500, sim.Start{}, crra(t))
	all := lifetimes(t, p)
	lived := int64(alive(all, 10) + alive(all, 11) + alive(all, 12))
	for _, tt := range []struct {
		amount float64
		above  int64
	}{{0.5, 0}, {1e6, lived}} {
		r := run(t, p, Options{Amount: tt.amount, Ages: []int{40}, Years: 2, Bands: wholeLife})
		if r.HouseholdYears != lived || r.AboveTop != tt.above {
			t.Errorf("amount %g: %d household-years, %d above the grid; want %d and %d", tt.amount, r.HouseholdYears, r.AboveTop, lived, tt.above)
		}
	}
}

// States that utility does not allow end the experiment, in the year of receipt or
// later.
func TestEndsAndFaults(t *testing.T) {
	p := population(t, 3*sim.Unit, sim.Start{Median: 1, LogSD: 1}, crra(t))
	o := Options{Amount: 1, Ages: []int{40}, Years: 2, Bands: wholeLife}
	ctx, cancel := context.WithCancelCause(t.Context())
	o.OnProgress = func(int64, int64) { cancel(errors.New("enough")) }
	if r, err := Run(ctx, p, o); r != nil || err == nil || !strings.Contains(err.Error(), "enough") {
		t.Errorf("after the end of its context: %v, %v", r, err)
	}
	o.OnProgress = nil
	bad := p.Types[0].Rule
	spoilt := *bad
	spoilt.Curves = append([][]policy.Curve(nil), bad.Curves...)
	spoilt.Curves[11] = append([]policy.Curve(nil), bad.Curves[11]...)
	for i, c := range spoilt.Curves[11] { // a rule that is impossible just above where anybody is without the transfer
		c.Cash = append(append([]float64(nil), c.Cash...), c.Top()+1000)
		c.Consumption = append(append([]float64(nil), c.Consumption...), -1)
		c.Left, c.Right = append(append([]float64(nil), c.Left...), -1), append(append([]float64(nil), c.Right...), -1)
		spoilt.Curves[11][i] = c
	}
	p.Types[0].Rule = &spoilt
	o.Amount = 5000
	var state *sim.StateError
	if _, err := Run(t.Context(), p, o); !errors.As(err, &state) || state.Age != 41 || !strings.Contains(err.Error(), "after 5000 at age 40") {
		t.Errorf("an impossible rule in the next year gives %v", err)
	}
	p.Households = 0
	if _, err := Run(t.Context(), p, o); err == nil {
		t.Error("an invalid population is no error")
	}
}

func TestOptionsAreChecked(t *testing.T) {
	good := Options{Amount: 1, Ages: []int{30, 40}, Years: 2, Bands: []Band{{30, 39}, {40, 79}}, Limits: [][]float64{{0, 0, 1}, {1, 2, 3}}, Weights: []float64{1, 2}}
	if err := good.Validate(30, 79); err != nil {
		t.Fatal(err)
	}
	for _, tt := range []struct {
		change func(*Options)
		want   string
	}{
		{func(o *Options) { o.Amount = 0 }, "amount: is 0"},
		{func(o *Options) { o.Amount = math.NaN() }, "amount: is NaN"},
		{func(o *Options) { o.Ages, o.Weights = nil, nil }, "no age"},
		{func(o *Options) { o.Ages = []int{29, 40} }, "age of receipt 29: want ascending ages from 30 to 79"},
		{func(o *Options) { o.Ages = []int{40, 80} }, "age of receipt 80"},
		{func(o *Options) { o.Ages = []int{40, 40} }, "ascending"},
		{func(o *Options) { o.Bands[1].First = 41 }, "age of receipt 40 lies in no band"},
		{func(o *Options) { o.Bands[1].First = 39 }, "without overlap"},
		{func(o *Options) { o.Years = -1 }, "years: is -1"},
		{func(o *Options) { o.Limits = o.Limits[:1] }, "limits of wealth for 1 bands"},
		{func(o *Options) { o.Limits[1] = []float64{1, 3, 2} }, "ascending"},
		{func(o *Options) { o.Limits[1] = []float64{1, 3} }, "same number"},
		{func(o *Options) { o.Weights = []float64{1} }, "1 weights for 2 ages"},
		{func(o *Options) { o.Weights = []float64{1, 0} }, "weight 0"},
	} {
		o := good
		o.Bands = append([]Band(nil), good.Bands...)
		o.Limits = append([][]float64(nil), good.Limits...)
		tt.change(&o)
		if err := o.Validate(30, 79); err == nil || !strings.Contains(err.Error(), tt.want) {
			t.Errorf("error %v, want one about %q", err, tt.want)
		}
	}
}
