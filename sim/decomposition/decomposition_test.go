package decomposition

import (
	"context"
	"errors"
	"math"
	"reflect"
	"slices"
	"testing"

	"cistern/income"
	"cistern/policy"
	"cistern/sim"
)

// town is a population of one group; change alters its household.
func town(t *testing.T, n int64, change func(h *policy.Household, p *income.Process)) *sim.Population {
	t.Helper()
	chain, err := income.Rouwenhorst{Points: 5}.Discretise(income.AR1{Autocorrelation: 0.9, InnovationSD: 0.15})
	if err != nil {
		t.Fatal(err)
	}
	p := income.Process{FirstAge: 30, Profile: slices.Repeat([]float64{20}, 30), Chain: chain, Initial: chain.Stationary(),
		Transitory: income.Transitory{SD: 0.2, Nodes: 9}, JobLoss: income.JobLoss{Probability: 0.05, BenefitRate: 0.4}}
	for i := range p.Profile {
		p.Profile[i] += 0.5 * float64(i)
	}
	survival, err := income.Gompertz{ModalAge: 80, Dispersion: 9}.Survival(30, 90)
	if err != nil {
		t.Fatal(err)
	}
	u, err := policy.NewCRRA(2)
	if err != nil {
		t.Fatal(err)
	}
	h := policy.Household{FirstAge: 30, Survival: survival, Utility: u, DiscountFactor: 0.97, Return: 0.03, Pension: policy.Pension{ClaimAge: 60, FinalEarningsRate: 0.3, Flat: 2}}
	change(&h, &p)
	if h.Earnings, err = p.Build(); err != nil {
		t.Fatal(err)
	}
	solve := func(h policy.Household) *policy.Rule {
		r, err := policy.Solve(context.Background(), h, policy.DefaultOptions())
		if err != nil {
			t.Fatal(err)
		}
		return r
	}
	twin, err := h.Twin()
	if err != nil {
		t.Fatal(err)
	}
	return &sim.Population{Seed: 5, Households: n, Groups: []sim.Group{{Name: "dockers", Share: 1, Types: []int{0}}},
		Types: []sim.Type{{Rule: solve(h), Twin: solve(twin), Start: sim.Start{Median: 5, LogSD: 1, ZeroShare: 0.3}}}}
}

func asIs(*policy.Household, *income.Process) {}

func takeApart(t *testing.T, p *sim.Population, o Options) *Result {
	t.Helper()
	if o.Order == nil {
		o.Order = []Cause{IncomeRisk, LongevityRisk, BorrowingLimit}
	}
	o.Solver = policy.DefaultOptions()
	r, err := Run(context.Background(), p, o)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// mean assets at a year of life after a step.
func (r *Result) mean(year, step int) float64 {
	sum, n := 0.0, 0.0
	for part := range Parts {
		sum += r.Cells[year][0].Assets[step][part]
		n += r.Cells[year][0].Alive[part]
	}
	return sum / n
}

// Mean assets with all causes and without income risk are those of the panel and of
// its certain twins.
func TestFirstSteps(t *testing.T) {
	p := town(t, 3000, asIs)
	r := takeApart(t, p, Options{})
	sums := make([][3]float64, p.Years())
	_, err := sim.Simulate(context.Background(), p, sim.Options{Columns: sim.Twins}, func(_ int, b *sim.Block) (func() error, error) {
		for _, s := range b.Runs {
			for i := s.From; i < s.To; i++ {
				sums[s.T][0] += b.Assets[i]
				sums[s.T][1] += b.TwinAssets[i]
				sums[s.T][2]++
			}
		}
		return nil, nil
	})
	if err != nil {
		t.Fatal(err)
	}
	for year, s := range sums {
		for step := range 2 {
			if got, want := r.mean(year, step), s[step]/s[2]; math.Abs(got-want) > 1e-9*(1+math.Abs(want)) {
				t.Errorf("year %d, step %d: mean assets %v, want %v", year, step, got, want)
			}
		}
	}
	if gap := r.mean(25, 0) - r.mean(25, 1); gap < 1 {
		t.Errorf("income risk accounts for %v", gap)
	}
	if gap := r.mean(45, 1) - r.mean(45, 2); gap == 0 {
		t.Error("longevity risk accounts for nothing")
	}
	if gap := r.mean(10, 2) - r.mean(10, 3); gap <= 0 {
		t.Errorf("the limit accounts for %v in a year in which the young would borrow", gap)
	}
}

// What is not there accounts for nothing, to the bit.
func TestNothingToRemove(t *testing.T) {
	for _, tt := range []struct {
		name   string
		order  []Cause
		change func(h *policy.Household, p *income.Process)
		step   int
	}{
		{"certain income", nil, func(_ *policy.Household, p *income.Process) {
			p.Chain, p.Initial, p.Transitory, p.JobLoss = income.Degenerate(), []float64{1}, income.Transitory{Nodes: 1}, income.JobLoss{}
		}, 1},
		{"certain life", nil, func(h *policy.Household, _ *income.Process) { h.Survival = income.Certain(30, 90) }, 2},
		{"no limit", []Cause{BorrowingLimit, IncomeRisk}, func(h *policy.Household, _ *income.Process) { h.Limit = policy.Limit{Kind: policy.LimitNatural} }, 1},
	} {
		t.Run(tt.name, func(t *testing.T) {
			r := takeApart(t, town(t, 600, tt.change), Options{Order: tt.order})
			for year := range r.Cells {
				if a, b := r.mean(year, tt.step-1), r.mean(year, tt.step); a != b {
					t.Fatalf("year %d: %v before, %v after", year, a, b)
				}
			}
		})
	}
}

// A limit that does not bind accounts for nothing but rounding: whoever is certain
// of a rising pension would borrow, of a falling one not.
func TestLimitThatDoesNotBind(t *testing.T) {
	p := town(t, 600, func(h *policy.Household, p *income.Process) {
		h.DiscountFactor, h.Pension = 1/1.03, policy.Pension{ClaimAge: 60, Flat: 1}
		for i := range p.Profile {
			p.Profile[i] = 30
		}
		h.Survival = income.Certain(30, 90)
	})
	r := takeApart(t, p, Options{})
	for year := range r.Cells {
		if a, b := r.mean(year, 2), r.mean(year, 3); math.Abs(a-b) > 1e-6*(1+math.Abs(a)) {
			t.Errorf("year %d: %v with the limit, %v without", year, a, b)
		}
	}
}

// Who knows that T years are left, with β·R = 1 and a limit that does not bind,
// consumes the same every year: c = Σ_(t<T) y_t R^−t / Σ_(t<T) R^−t and what they
// began with (derived). Deaths are those of the panel.
func TestKnownDeath(t *testing.T) {
	p := town(t, 400, func(h *policy.Household, p *income.Process) {
		h.DiscountFactor, h.Limit = 1/1.03, policy.Limit{Kind: policy.LimitNatural}
		for i := range p.Profile {
			p.Profile[i] = 30
		}
		h.Pension = policy.Pension{ClaimAge: 60, Flat: 10}
	})
	r := takeApart(t, p, Options{Order: []Cause{IncomeRisk, LongevityRisk}})
	years := p.Years()
	sums, alive := make([]float64, years), make([]float64, years)
	income := func(t int) float64 {
		if t < 30 {
			return p.Types[0].Twin.Household.MeanIncome(t)
		}
		return 10
	}
	_, err := sim.Simulate(context.Background(), p, sim.Options{Columns: sim.Identity}, func(_ int, b *sim.Block) (func() error, error) {
		lives := map[int64]int{}
		for _, id := range b.Household {
			lives[id]++
		}
		for i := range b.Runs[0].To {
			T := lives[b.Household[i]]
			assets := (b.CashOnHand[i] - b.Income[i]) / 1.03
			worth, annuity, price := 1.03*assets, 0.0, 1.0
			for t := range T {
				worth += income(t) * price
				annuity += price
				price /= 1.03
			}
			for t := range T {
				assets = 1.03*assets + income(t) - worth/annuity
				sums[t] += assets
				alive[t]++
			}
		}
		return nil, nil
	})
	if err != nil {
		t.Fatal(err)
	}
	for t1 := range years {
		if alive[t1] == 0 {
			continue
		}
		if got, want := r.mean(t1, 2), sums[t1]/alive[t1]; math.Abs(got-want) > 1e-6*(1+math.Abs(want)) {
			t.Errorf("year %d: mean assets %v, want %v", t1, got, want)
		}
	}
}

func TestWorkersAndCap(t *testing.T) {
	p := town(t, 9000, asIs)
	one, three := takeApart(t, p, Options{Workers: 1}), takeApart(t, p, Options{Workers: 3})
	if !reflect.DeepEqual(one, three) {
		t.Error("the result depends on the number of workers")
	}
	some := takeApart(t, p, Options{Households: 4096})
	alive := 0.0
	for _, n := range some.Cells[0][0].Alive {
		alive += n
	}
	if alive != 4096 {
		t.Errorf("%v households, want 4096", alive)
	}
}

func TestRefused(t *testing.T) {
	p := town(t, 10, asIs)
	for name, o := range map[string]Options{
		"nothing":       {},
		"twice":         {Order: []Cause{IncomeRisk, IncomeRisk}},
		"no such cause": {Order: []Cause{7}},
		"negative":      {Order: []Cause{IncomeRisk}, Households: -1},
	} {
		if _, err := Run(context.Background(), p, o); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
	ctx, cancel := context.WithCancelCause(context.Background())
	ctrlC := errors.New("stopped")
	cancel(ctrlC)
	if _, err := Run(ctx, p, Options{Order: []Cause{IncomeRisk}, Solver: policy.DefaultOptions()}); !errors.Is(err, ctrlC) {
		t.Errorf("stopped: %v", err)
	}
}

// The premium is between nothing and what would be given in the worst case, and the
// law of start assets has its mean (derived: exp(sd²/2) times the median).
func TestPremium(t *testing.T) {
	p := town(t, 10, asIs)
	got, err := Premium(p)
	if err != nil || len(got) != 1 || !(got[0] > 0.01 && got[0] < 0.3) {
		t.Errorf("premium %v, %v", got, err)
	}
	mean, mass := 0.0, 0.0
	for _, b := range begins(p.Types[0].Start) {
		mean += b.Assets * b.Probability
		mass += b.Probability
	}
	if want := 0.7 * 5 * math.Exp(0.5); math.Abs(mean-want) > 1e-6*want || math.Abs(mass-1) > 1e-12 {
		t.Errorf("start assets of mean %v and mass %v, want %v and 1", mean, mass, want)
	}
	p.Types[0].Twin = nil
	if _, err := Premium(p); err == nil {
		t.Error("a premium without twins")
	}
}
