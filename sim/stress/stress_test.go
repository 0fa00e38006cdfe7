package stress

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"cistern/income"
	"cistern/policy"
	"cistern/sim"
)

const rho = 0.9

// dockers is a household with every risk, a limit and a pension founded on final
// earnings; change alters its process.
func dockers(tb testing.TB, change func(*income.Process)) policy.Household {
	tb.Helper()
	chain, err := income.Rouwenhorst{Points: 5}.Discretise(income.AR1{Autocorrelation: rho, InnovationSD: 0.15})
	if err != nil {
		tb.Fatal(err)
	}
	p := income.Process{FirstAge: 30, Profile: income.Polynomial(income.Log, []float64{10, 0.03, -0.0008}, 30, 30, 30), Chain: chain, Initial: chain.Stationary(),
		Transitory: income.Transitory{SD: 0.2, Nodes: 11}, JobLoss: income.JobLoss{Probability: 0.05, BenefitRate: 0.5}}
	if change != nil {
		change(&p)
	}
	e, err := p.Build()
	if err != nil {
		tb.Fatal(err)
	}
	survival, err := income.Gompertz{ModalAge: 80, Dispersion: 9}.Survival(30, 85)
	if err != nil {
		tb.Fatal(err)
	}
	u, err := policy.NewCRRA(2)
	if err != nil {
		tb.Fatal(err)
	}
	return policy.Household{FirstAge: 30, Survival: survival, Utility: u, DiscountFactor: 0.96, Return: 0.03, Earnings: e,
		Pension: policy.Pension{ClaimAge: 60, FinalEarningsRate: 0.4, Flat: 3000}}
}

// exponential is a household with exponential utility, form level and no limit,
// that works all its certain life.
func exponential(tb testing.TB) policy.Household {
	tb.Helper()
	chain, err := income.Rouwenhorst{Points: 5}.Discretise(income.AR1{Autocorrelation: rho, InnovationSD: 2000})
	if err != nil {
		tb.Fatal(err)
	}
	e, err := income.Process{FirstAge: 30, Profile: income.Constant(30000, 40), Form: income.Level, Chain: chain, Initial: chain.Stationary(),
		Transitory: income.Transitory{SD: 3000, Nodes: 11}}.Build()
	if err != nil {
		tb.Fatal(err)
	}
	u, err := policy.NewCARA(1e-4)
	if err != nil {
		tb.Fatal(err)
	}
	return policy.Household{FirstAge: 30, Survival: income.Certain(30, 69), Utility: u, DiscountFactor: 0.97, Return: 0.03, Earnings: e,
		Limit: policy.Limit{Kind: policy.LimitNone}, Pension: policy.Pension{ClaimAge: 70}}
}

func solve(tb testing.TB, h policy.Household) *policy.Rule {
	tb.Helper()
	r, err := policy.Solve(tb.Context(), h, solver())
	if err != nil {
		tb.Fatal(err)
	}
	return r
}

func solver() policy.Options {
	o := policy.DefaultOptions()
	o.AssetPoints = 80
	return o
}

// port has a group of each household.
func port(tb testing.TB, households int64, hs ...policy.Household) *sim.Population {
	tb.Helper()
	p := &sim.Population{Seed: 3, Households: households}
	for i, h := range hs {
		p.Types = append(p.Types, sim.Type{Group: i, Rule: solve(tb, h), Start: sim.Start{Median: 1000, LogSD: 1, ZeroShare: 0.3}})
		p.Groups = append(p.Groups, sim.Group{Name: []string{"dockers", "clerks"}[i], Share: 1 / float64(len(hs)), Types: []int{i}})
	}
	return p
}

// everyone is an event that hits all.
func everyone(years ...Year) *Event { return &Event{Years: years, LastAge: 200} }

// year is a usual year with changes.
func year(change func(*Year)) Year {
	y := UsualYear()
	change(&y)
	return y
}

// row is a household's year as usual and under the event.
type row struct {
	id                        int64
	t, year, group            int
	income, consumed, kept    float64
	income2, consumed2, kept2 float64
	lost, lost2               bool
}

// live simulates p through e and returns all rows in the order of calendar years.
func live(tb testing.TB, p *sim.Population, e *Event, w Window) []row {
	tb.Helper()
	o := Options{Solver: solver(), Autocorrelation: slices.Repeat([]float64{rho}, len(p.Types)), Workers: 2}
	ev, err := Prepare(tb.Context(), p, e, w, o)
	if err != nil {
		tb.Fatal(err)
	}
	var rows []row
	if _, err := sim.Simulate(tb.Context(), p, sim.Options{Columns: sim.Identity | sim.Changes, Event: ev, Workers: 2}, func(_ int, b *sim.Block) (func() error, error) {
		return func() error {
			for _, r := range b.Runs {
				for k := r.From; k < r.To; k++ {
					rows = append(rows, row{b.Household[k], r.T, r.Year, r.Group, b.Income[k], b.Consumption[k], b.Assets[k],
						b.EventIncome[k], b.EventConsumption[k], b.EventAssets[k], b.JobLost[k], b.EventJobLost[k]})
				}
			}
			return nil
		}, nil
	}); err != nil {
		tb.Fatal(err)
	}
	slices.SortStableFunc(rows, func(a, b row) int { return a.year - b.year })
	return rows
}

func near(tb testing.TB, what string, got, want, tolerance float64) {
	tb.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		tb.Fatalf("%s: %.12g, want %.12g ± %.1g", what, got, want, tolerance)
	}
}

// An event that changes nothing leaves everybody as usual, to the bit, whatever
// households expect.
func TestNothingHappens(t *testing.T) {
	p := port(t, sim.Unit, dockers(t, nil))
	for _, e := range []*Event{everyone(), everyone(UsualYear(), UsualYear(), UsualYear())} {
		for _, e.Expect = range []Expectation{Usual, Foreseen} {
			rows := live(t, p, e, Window{2, 6})
			for _, r := range rows {
				if r.income != r.income2 || r.consumed != r.consumed2 || r.kept != r.kept2 || r.lost != r.lost2 {
					t.Fatalf("%d years, expecting %d: %+v differs", len(e.Years), e.Expect, r)
				}
			}
			if len(rows) < sim.Unit {
				t.Errorf("only %d rows", len(rows))
			}
		}
	}
}

// Only those are hit who are of the ages and groups named, counted in the event's
// year, later entrants as of the first age; all of them are.
func TestWhoIsHit(t *testing.T) {
	p := port(t, 2*sim.Unit, dockers(t, nil), dockers(t, nil))
	for _, ages := range [][2]int{{40, 45}, {30, 32}, {60, 200}} {
		e := everyone(year(func(y *Year) { y.Return = -0.5; y.Prices = 0.1 }), year(func(y *Year) { y.Prices = 0.1 }))
		e.FirstAge, e.LastAge, e.Groups = ages[0], ages[1], []bool{true, false}
		hit := 0
		for _, r := range live(t, p, e, Window{0, 4}) {
			age := 30 + max(0, r.t-r.year)
			should := r.group == 0 && age >= ages[0] && age <= ages[1] && r.year <= 1
			if r.year <= 1 && should != (r.income != r.income2) || !should && r.year == 0 && r.kept != r.kept2 {
				t.Fatalf("ages %v: hit %v: %+v", ages, should, r)
			}
			if should {
				hit++
			}
		}
		if hit < 50 {
			t.Errorf("ages %v: only %d rows are hit", ages, hit)
		}
	}
}

// A return of one year changes what is there to be spent or kept in it by exactly
// (return − usual return) times what was kept (the accounting of the model), and
// nothing else in that year.
func TestReturnOfOneYear(t *testing.T) {
	p := port(t, sim.Unit, dockers(t, nil))
	kept := map[int64]float64{}
	checked := 0
	for _, r := range live(t, p, everyone(year(func(y *Year) { y.Return = -0.3 })), Window{1, 1}) {
		if last, known := kept[r.id]; known && r.year == 0 {
			near(t, "cash-on-hand", r.consumed2+r.kept2-r.consumed-r.kept, (-0.3-0.03)*last, 1e-9*(1+last))
			if r.income != r.income2 {
				t.Fatal("a return has changed an income")
			}
			checked++
		}
		kept[r.id] = r.kept
	}
	if checked < 1000 {
		t.Errorf("only %d rows", checked)
	}
}

// Prices 8 % above incomes, and 3 % a year later: in year 0 every crown of income
// and of wealth buys 1/1.08, in year 1 every crown of income 1/1.03, and incomes
// have caught up after that, while wealth does not get back what it lost (the
// definition in the package comment). Where wealth keeps its value it buys as much
// as usual.
func TestPrices(t *testing.T) {
	p := port(t, sim.Unit, dockers(t, nil))
	gap := []float64{0.08, 0.03}
	for _, keeps := range []bool{false, true} {
		e := everyone(year(func(y *Year) { y.Prices = gap[0] }), year(func(y *Year) { y.Prices = gap[1] }))
		e.WealthKeepsValue = keeps
		kept := map[int64]float64{}
		for _, r := range live(t, p, e, Window{1, 3}) {
			income, R := r.income, 1.03
			if r.year == 0 || r.year == 1 {
				income /= 1 + gap[r.year]
			}
			if r.year == 0 && !keeps {
				R /= 1.08
			}
			near(t, "income", r.income2, income, 1e-9*income)
			if last, known := kept[r.id]; known {
				near(t, "cash-on-hand", r.consumed2+r.kept2, R*last+income, 1e-8*(1+last+income))
			}
			kept[r.id] = r.kept2
		}
	}
}

// The persistent part is shifted exactly: earnings of those who worked in year 0
// are exp(δ·ρ^s) times what they are usually (derived: an AR(1) moved by δ is δ·ρ^s
// higher s years on), a pension founded on them keeps the factor of the last working
// year, and neither pensioners nor later entrants notice.
func TestShiftOfThePersistentPart(t *testing.T) {
	h := dockers(t, nil)
	h.Pension.Flat = 0
	p := port(t, sim.Unit, h)
	e := everyone()
	e.Persistent = -0.2
	retired := 0
	for _, r := range live(t, p, e, Window{1, 6}) {
		onset := r.t - r.year
		want := 1.0
		if r.year >= 0 && onset >= 0 && onset < 30 {
			want = math.Exp(-0.2 * math.Pow(rho, float64(min(r.year, 29-onset))))
			if r.t >= 30 {
				retired++
			}
		}
		near(t, fmt.Sprintf("income, year %d, %d years old in the event's, relative", r.year, 30+onset), r.income2/r.income, want, 1e-12)
	}
	if retired < 200 {
		t.Errorf("only %d rows of people who have retired since", retired)
	}
}

// Exponential utility without limit: an unexpected fall δ of the persistent part
// lowers consumption by δ times Σ(ρ/R)^j / ΣR^−j over the years left, at every node
// and wealth (policy.ShockPropensity: Flavin 1981, derived for a finite life), and
// the fall of consumption stays what it is for life (derived: what is left of the
// fall in income is saved for).
func TestUnexpectedFallOfIncome(t *testing.T) {
	h := exponential(t)
	p := port(t, sim.Unit, h)
	e := everyone()
	e.Persistent = -3000
	checked := 0
	for _, r := range live(t, p, e, Window{1, 9}) {
		if onset := r.t - r.year; r.year >= 0 && onset >= 0 {
			want := -3000 * policy.ShockPropensity(rho, 1.03, 39-onset)
			near(t, fmt.Sprintf("fall of consumption in year %d, onset %d", r.year, onset), r.consumed2-r.consumed, want, 1e-4)
			near(t, "fall of income", r.income2-r.income, -3000*math.Pow(rho, float64(r.year)), 1e-6)
			checked++
		}
	}
	if checked < 1000 {
		t.Errorf("only %d rows", checked)
	}
}

// Exponential utility without limit, all years of the event foreseen: the rule is
// the closed form of the changed problem (policy.CARAChain, derived) in every year
// of it.
func TestForeseenEventMeetsClosedForm(t *testing.T) {
	h := exponential(t)
	usual := solve(t, h)
	fall := func(level, ret float64) Year {
		return year(func(y *Year) {
			y.Level, y.Return, y.Prices = level, ret, 0.05
			y.JobLoss, y.BenefitRate = Rate{true, 0.2}, Rate{true, 0.4}
		})
	}
	e := everyone(fall(-0.1, -0.1), fall(-0.05, math.NaN()), fall(-0.02, 0.2))
	e.Expect = Foreseen
	for _, shift := range []float64{0, -2000} {
		e.Persistent = shift
		for _, onset := range []int{-1, 0, 20, 38} {
			rule, err := Rule(t.Context(), usual, e, rho, onset, solver())
			if err != nil {
				t.Fatal(err)
			}
			exact := policy.CARAChain(h.Utility.(policy.CARA), rule.Household.Prospects())
			for y := max(onset, 0); y < min(onset+5, 40); y++ {
				for j := range h.Nodes() {
					for _, m := range []float64{-50000, 20000, 400000} {
						want := exact.Consumption(y, j, m)
						near(t, fmt.Sprintf("shift %v, onset %d, year %d: consumption", shift, onset, y), rule.Consumption(y, j, m), want, 1e-9*(30000+math.Abs(want)))
					}
				}
			}
		}
	}
}

// In the years of a foreseen event the Euler equation holds as well as it usually
// does: the mean error of every year is at most three times the largest mean of the
// same years in usual times, or 1e-6 (order of magnitude).
func TestForeseenEventEulerErrors(t *testing.T) {
	h := dockers(t, nil)
	usual := solve(t, h)
	e := everyone(year(func(y *Year) { y.JobLoss, y.Level = Rate{X: 3}, -0.1 }), year(func(y *Year) { y.JobLoss, y.Return = Rate{X: 2}, -0.2 }), UsualYear())
	e.Expect = Foreseen
	for _, shift := range []float64{0, -0.15} {
		e.Persistent = shift
		for _, onset := range []int{0, 12, 27} {
			rule, err := Rule(t.Context(), usual, e, rho, onset, solver())
			if err != nil {
				t.Fatal(err)
			}
			a, b := policy.NewJudge(usual, false), policy.NewJudge(rule, false)
			largest := 1e-6
			for y := onset; y < onset+4; y++ {
				largest = math.Max(largest, 3*a.Judge(y, usual.BetweenNodes(y, 500000)).Mean)
			}
			for y := onset; y < onset+4; y++ {
				got := b.Judge(y, rule.BetweenNodes(y, 500000))
				if got.States < 100 || !(got.Mean < largest) || got.Limit > 1e-6 {
					t.Errorf("shift %v, onset %d, year %d: errors %+v, usually up to %.1e", shift, onset, y, got, largest/3)
				}
			}
		}
	}
}

// A foreseen event that lasts for life is another scenario: its rule is that of the
// household solved with the event's values (rounding aside).
func TestEventForLife(t *testing.T) {
	h := dockers(t, nil)
	h.Pension.FinalEarningsRate = 0
	usual := solve(t, h)
	var years []Year
	for range h.Years() {
		years = append(years, year(func(y *Year) {
			y.Level, y.Return = -0.05, 0.01
			y.JobLoss, y.BenefitRate = Rate{X: 2}, Rate{true, 0.4}
		}))
	}
	e := everyone(years...)
	e.Expect = Foreseen
	rule, err := Rule(t.Context(), usual, e, rho, 0, solver())
	if err != nil {
		t.Fatal(err)
	}
	other := dockers(t, func(p *income.Process) {
		for i := range p.Profile {
			p.Profile[i] *= 0.95
		}
		p.JobLoss = income.JobLoss{Probability: 0.1, BenefitRate: 0.4}
	})
	other.Pension, other.Return = h.Pension, 0.01
	want := solve(t, other)
	for y := range h.Years() - 1 {
		for j := range h.Nodes() {
			for _, m := range []float64{4000, 20000, 90000, 600000} {
				c := want.Consumption(y, j, m)
				near(t, fmt.Sprintf("year %d: consumption", y), rule.Consumption(y, j, m), c, 1e-7*c)
			}
		}
	}
}

// A household whose persistent part is shifted by the distance of two nodes stands
// where another one stands without an event. The rules that it follows are solved on
// different chains and agree to the error of discretising (order of magnitude:
// halves with twice as many nodes).
func TestRuleBesideTheNodes(t *testing.T) {
	var worst [2]float64
	for k, points := range []int{5, 21} {
		h := dockers(t, func(p *income.Process) {
			chain, err := income.Rouwenhorst{Points: points}.Discretise(income.AR1{Autocorrelation: rho, InnovationSD: 0.15})
			if err != nil {
				t.Fatal(err)
			}
			p.Chain, p.Initial = chain, chain.Stationary()
		})
		usual := solve(t, h)
		nodes := h.Earnings.Chain.Nodes
		e := everyone()
		e.Persistent = nodes[0] - nodes[1]
		rule, err := Rule(t.Context(), usual, e, rho, 10, solver())
		if err != nil {
			t.Fatal(err)
		}
		for j := 1; j < len(nodes); j++ {
			if nodes[j] < -0.7 || nodes[j] > 0.7 { // where hardly anybody is
				continue
			}
			for _, m := range []float64{10000, 30000, 100000} {
				worst[k] = math.Max(worst[k], math.Abs(rule.Consumption(10, j, m)/usual.Consumption(10, j-1, m)-1))
			}
		}
	}
	t.Logf("largest relative differences %.2e and %.2e", worst[0], worst[1])
	if !(worst[0] < 0.01 && worst[1] < worst[0]/2 && worst[1] > 0) {
		t.Errorf("largest relative differences %.2e with 5 nodes and %.2e with 21", worst[0], worst[1])
	}
}

// Years of entry come in equal shares in any range of ids, in every group and in
// every group of the jackknife (id mod 64), to within a few households.
func TestEntriesAreSpread(t *testing.T) {
	p := port(t, 1<<40, dockers(t, nil), dockers(t, nil))
	entries := NewEntries(Window{2, 10}, p.Years())
	if entries.Earliest != -2-55 || entries.Cohorts != 2+10+56 {
		t.Fatalf("entries %+v", entries)
	}
	for _, first := range []int64{0, 777_777, 3_000_000_000} {
		for _, step := range []int64{1, 64} {
			n := 100 * entries.Cohorts
			counts := make([][2]int, entries.Cohorts)
			for i := range int64(n) {
				id := first + step*i
				counts[entries.Of(id)-entries.Earliest][p.GroupOf(id)]++
			}
			for e, c := range counts {
				if math.Abs(float64(c[0]+c[1])-100) > 5 || math.Abs(float64(c[0])-50) > 15 {
					t.Errorf("from %d in steps of %d: %v households enter in year %d, want 50 of each group", first, step, c, entries.Earliest+e)
				}
			}
		}
	}
	near(t, "weight of who entered 10 years before", Weight(0.02, -10), 1/1.218994419994757, 1e-15) // derived: 1.02^10
}

// Whoever could be left with nothing to consume is a fault, named; who reckons with
// having nothing is not.
func TestHardship(t *testing.T) {
	p := port(t, 100, dockers(t, nil))
	e := everyone(UsualYear(), year(func(y *Year) { y.BenefitRate = Rate{true, 0} }))
	_, err := Prepare(t.Context(), p, e, Window{0, 3}, Options{Solver: solver(), Autocorrelation: []float64{rho}})
	var hard *HardshipError
	if !errors.As(err, &hard) || hard.Year != 1 || hard.Group != "dockers" || hard.Cash != 0 || !strings.Contains(err.Error(), "in year 1 of the event") {
		t.Errorf("no benefit gives %v", err)
	}
	p = port(t, 100, dockers(t, func(p *income.Process) { p.JobLoss.BenefitRate = 0 }))
	e = everyone(year(func(y *Year) { y.JobLoss = Rate{X: 2} }))
	if _, err := Prepare(t.Context(), p, e, Window{0, 3}, Options{Solver: solver(), Autocorrelation: []float64{rho}}); err != nil {
		t.Errorf("households that reckon with no benefit: %v", err)
	}
}

func TestFaults(t *testing.T) {
	p := port(t, 100, dockers(t, nil))
	o := Options{Solver: solver(), Autocorrelation: []float64{rho}}
	e := everyone(year(func(y *Year) {
		y.Level, y.Return, y.Prices, y.JobLoss.X = -2, -1, math.Inf(1), math.NaN()
	}))
	e.Persistent, e.Expect = math.NaN(), 7
	_, err := Prepare(t.Context(), p, e, Window{}, o)
	for _, want := range []string{"level is -2", "return is -1", "prices are +Inf", "changed by NaN", "persistent part is NaN", "expectation 7"} {
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("error %v has no %q", err, want)
		}
	}
	if _, err := Prepare(t.Context(), p, everyone(year(func(y *Year) { y.JobLoss = Rate{X: 30} })), Window{}, o); err == nil || !strings.Contains(err.Error(), "from 0 to 1") {
		t.Errorf("a probability above 1 gives %v", err)
	}
	stop := errors.New("enough")
	ctx, cancel := context.WithCancelCause(context.Background())
	o.OnCourse = func(done, total int) {
		if done == 3 {
			cancel(stop)
		}
	}
	e = everyone(UsualYear())
	e.Persistent = -0.1
	if _, err := Prepare(ctx, p, e, Window{}, o); !errors.Is(err, stop) {
		t.Errorf("got %v, want the cause of the stop", err)
	}
}
