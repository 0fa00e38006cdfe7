package decomposition

import (
	"context"
	"math"
	"reflect"
	"testing"

	"cistern/income"
	"cistern/policy"
	"cistern/sim"
)

// What is left when all causes are removed does not depend on the order in which they
// are, to the bit, and parts sum to the whole by their definition; in every order the
// parts are others.
func TestOrders(t *testing.T) {
	p := town(t, 600, func(_ *policy.Household, p *income.Process) { p.Transitory.Nodes = 3 })
	var want *Result
	for _, order := range [][]Cause{
		{IncomeRisk, LongevityRisk, BorrowingLimit}, {IncomeRisk, BorrowingLimit, LongevityRisk}, {LongevityRisk, IncomeRisk, BorrowingLimit},
		{LongevityRisk, BorrowingLimit, IncomeRisk}, {BorrowingLimit, IncomeRisk, LongevityRisk}, {BorrowingLimit, LongevityRisk, IncomeRisk},
	} {
		got := takeApart(t, p, Options{Order: order})
		if want == nil {
			want = got
			continue
		}
		for year := range got.Cells {
			a, b := got.Cells[year][0].Assets, want.Cells[year][0].Assets
			if a[0] != b[0] || a[3] != b[3] {
				t.Fatalf("%v, year %d: mean assets %v to %v, want %v to %v", order, year, got.mean(year, 0), got.mean(year, 3), want.mean(year, 0), want.mean(year, 3))
			}
		}
		if order[0] != IncomeRisk && got.mean(20, 1) == want.mean(20, 1) {
			t.Errorf("%v: as if income risk had been removed first", order)
		}
	}
}

// Households with risky income who know when they die hold what they do if each is
// followed by itself, by the rule for its own length of life (definition).
func TestKnownDeathWithRisk(t *testing.T) {
	p := town(t, 250, asIs)
	r := takeApart(t, p, Options{Order: []Cause{LongevityRisk}})
	type year struct {
		income float64
		node   uint8
	}
	lives, begins := map[int64][]year{}, map[int64]float64{}
	_, err := sim.Simulate(t.Context(), p, sim.Options{Columns: sim.Identity | sim.States | sim.Changes}, func(_ int, b *sim.Block) (func() error, error) {
		for _, s := range b.Runs {
			for i := s.From; i < s.To; i++ {
				id := b.Household[i]
				if lives[id] = append(lives[id], year{b.Income[i], b.Node[i]}); s.T == 0 {
					begins[id] = b.LastAssets[i]
				}
			}
		}
		return nil, nil
	})
	if err != nil {
		t.Fatal(err)
	}
	years := p.Years()
	rules, sums, alive := map[int]*policy.Rule{}, make([]float64, years), make([]float64, years)
	for id := range p.Households {
		life := lives[id]
		rule := rules[len(life)]
		if rule == nil {
			if rule, err = policy.Solve(context.Background(), knowing(p.Types[0].Rule.Household, len(life)), policy.DefaultOptions()); err != nil {
				t.Fatal(err)
			}
			rules[len(life)] = rule
		}
		assets := begins[id]
		for y, x := range life {
			cash := 1.03*assets + x.income
			assets = cash - rule.Consumption(y, int(x.node), cash)
			sums[y] += assets
			alive[y]++
		}
		if math.Abs(assets) > 1e-9 {
			t.Fatalf("household %d leaves %v at a death that it knew of", id, assets)
		}
	}
	for y := range years {
		if alive[y] == 0 {
			continue
		}
		if got, want := r.mean(y, 1), sums[y]/alive[y]; math.Abs(got-want) > 1e-9*(1+math.Abs(want)) {
			t.Errorf("year %d: mean assets %v, want %v", y, got, want)
		}
	}
}

// With CARA utility, without limit and for a certain time, consumption is linear in
// cash-on-hand, c = m/A_t + g_t(z), so that the mean of what households hold beyond
// their twins follows D_t = (1 − 1/A_t)·R·D_{t−1} − E g_t(z) + g°_t from D = 0
// (derived; the solution is policy.CARAChain, after Caballero 1990).
func TestPrecautionaryWealthCARA(t *testing.T) {
	p := town(t, 20000, func(h *policy.Household, p *income.Process) {
		u, err := policy.NewCARA(0.3)
		if err != nil {
			t.Fatal(err)
		}
		chain, err := income.Rouwenhorst{Points: 5}.Discretise(income.AR1{Autocorrelation: 0.97, InnovationSD: 1})
		if err != nil {
			t.Fatal(err)
		}
		h.Utility, h.Limit, h.Survival, h.Pension = u, policy.Limit{Kind: policy.LimitNone}, income.Certain(30, 90), policy.Pension{ClaimAge: 60, FinalEarningsRate: 0.3}
		p.Form, p.Chain, p.Initial, p.Transitory, p.JobLoss = income.Level, chain, chain.Stationary(), income.Transitory{SD: 2, Nodes: 15}, income.JobLoss{}
	})
	r := takeApart(t, p, Options{Order: []Cause{IncomeRisk}, Workers: 2})
	h := p.Types[0].Rule.Household
	u := h.Utility.(policy.CARA)
	risky, certain := policy.CARAChain(u, h.Prospects()), policy.CARAChain(u, p.Types[0].Twin.Household.Prospects())
	extra := 0.0
	for year := range p.Years() {
		level := 0.0
		for j, q := range h.Earnings.Distribution[min(year, h.WorkingYears()-1)] {
			level += q * risky.Level[year][j]
		}
		extra = (1-risky.Propensity[year])*1.03*extra - level + certain.Level[year][0]
		se := r.pairedError(year, 0, 1)
		if got := r.mean(year, 0) - r.mean(year, 1); math.Abs(got-extra) > 4.5*se+1e-4 {
			t.Errorf("year %d: households hold %v ± %v beyond their twins, want %v", year, got, se, extra)
		}
		if year == 25 && !(extra > 20*se) {
			t.Errorf("precautionary wealth %v ± %v is too small for a test", extra, se)
		}
	}
}

// pairedError is the standard error of the difference of two steps, from the parts.
func (r *Result) pairedError(year, a, b int) float64 {
	c := &r.Cells[year][0]
	mean, squares := r.mean(year, a)-r.mean(year, b), 0.0
	for part := range Parts {
		d := (c.Assets[a][part]-c.Assets[b][part])/c.Alive[part] - mean
		squares += d * d
	}
	return math.Sqrt(squares / (Parts - 1) / Parts)
}

// Without a cause that is not removed from a household alone nothing is refused; a
// debt that an estate cannot bear is, until death is known.
func TestFeasible(t *testing.T) {
	u, err := policy.NewCRRA(2)
	if err != nil {
		t.Fatal(err)
	}
	h := town(t, 1, asIs).Types[0].Rule.Household
	if err := Feasible(h, []Cause{BorrowingLimit, IncomeRisk, LongevityRisk}); err != nil {
		t.Error(err)
	}
	h.Utility, h.Bequest = u, policy.Bequest{Weight: 1, Shift: 1}
	for _, tt := range []struct {
		order []Cause
		fine  bool
	}{
		{[]Cause{IncomeRisk, LongevityRisk, BorrowingLimit}, true},
		{[]Cause{LongevityRisk, BorrowingLimit}, true},
		{[]Cause{IncomeRisk, BorrowingLimit}, false},
		{[]Cause{BorrowingLimit, LongevityRisk}, false},
		{[]Cause{IncomeRisk}, true},
	} {
		if err := Feasible(h, tt.order); (err == nil) != tt.fine {
			t.Errorf("%v: %v", tt.order, err)
		}
	}
}

// The sums do not depend on the number of workers where death is known before income.
func TestWorkersKnowing(t *testing.T) {
	p := town(t, 5000, asIs)
	o := Options{Order: []Cause{LongevityRisk}}
	one := takeApart(t, p, o)
	for _, o.Workers = range []int{2, 7} {
		if !reflect.DeepEqual(one, takeApart(t, p, o)) {
			t.Errorf("%d workers give another result", o.Workers)
		}
	}
}
