package sim

import (
	"fmt"
	"math"
	"slices"
	"sync"
	"testing"

	"cistern/income"
	"cistern/policy"
)

// rows is a panel held whole, for tests: the columns of all blocks, one after the
// other, with the year, type and group of every row.
type rows struct {
	Block
	t, kind, group []int
	result         Result
}

// simulate runs p and keeps every row.
func simulate(tb testing.TB, p *Population, o Options) *rows {
	tb.Helper()
	all := &rows{}
	result, err := Simulate(tb.Context(), p, o, func(_ int, b *Block) (func() error, error) {
		return func() error { all.take(b); return nil }, nil
	})
	if err != nil {
		tb.Fatal(err)
	}
	all.result = result
	return all
}

func (r *rows) take(b *Block) {
	for _, run := range b.Runs {
		for range run.To - run.From {
			r.t, r.kind, r.group = append(r.t, run.T), append(r.kind, run.Type), append(r.group, run.Group)
		}
	}
	r.N += b.N
	r.Household, r.Position, r.Node = append(r.Household, b.Household...), append(r.Position, b.Position...), append(r.Node, b.Node...)
	r.Employed, r.Died, r.AtLimit = append(r.Employed, b.Employed...), append(r.Died, b.Died...), append(r.AtLimit, b.AtLimit...)
	r.JobLost = append(r.JobLost, b.JobLost...)
	from, to := b.floats(), r.floats()
	for i, c := range to {
		*c = append(*c, *from[i]...)
	}
}

func (b *Block) floats() []*[]float64 {
	return []*[]float64{&b.Persistent, &b.Transitory, &b.Earnings, &b.Pension, &b.Taxes, &b.Income, &b.CashOnHand,
		&b.Consumption, &b.Assets, &b.Propensity, &b.TwinAssets, &b.TwinConsumption, &b.LastAssets, &b.LastConsumption}
}

// corner is a population with as much as possible switched on or off.
type corner struct {
	name string
	p    *Population
}

func populations(tb testing.TB) []corner {
	tb.Helper()
	const households = Unit + 1000
	level := exponential(tb, 40)
	natural := risky(tb)
	natural.Limit = policy.Limit{Kind: policy.LimitNatural}
	debt := riskyWith(tb, func(p *income.Process) { p.Transitory.SD = 0 })
	debt.Limit = policy.Limit{Kind: policy.LimitAmount, Amount: 0.3}
	always := riskyWith(tb, func(p *income.Process) { p.JobLoss.Probability = 1 })
	working := risky(tb)
	working.Pension.ClaimAge, working.Survival = 65, working.Survival[:40:40]
	working.Survival = append(working.Survival[:39:39], 0)
	return []corner{
		{"every feature", population(tb, risky(tb), households)},
		{"two groups, five types", mixed(tb, households)},
		{"exponential utility, no limit, form level", population(tb, level, households)},
		{"natural limit", population(tb, natural, households)},
		{"debt, no transitory shock", population(tb, debt, households)},
		{"work never found", population(tb, always, households)},
		{"no retirement", population(tb, working, households)},
	}
}

// riskyWith is risky with another income process.
func riskyWith(tb testing.TB, change func(*income.Process)) policy.Household {
	tb.Helper()
	h := risky(tb)
	p := h.Earnings.Process
	change(&p)
	e, err := p.Build()
	if err != nil {
		tb.Fatal(err)
	}
	h.Earnings = e
	return h
}

// mixed is two groups, one with three and one with two discount factors. Its rules
// are solved once.
func mixed(tb testing.TB, households int64) *Population {
	tb.Helper()
	mixedOnce.Do(func() { mixedTypes = solveMixed(tb) })
	return &Population{Seed: 5, Households: households, Types: slices.Clone(mixedTypes),
		Groups: []Group{{Name: "dockers", Share: 0.7, Types: []int{0, 1, 2}}, {Name: "clerks", Share: 0.3, Types: []int{3, 4}}}}
}

var (
	mixedOnce  sync.Once
	mixedTypes []Type
)

func solveMixed(tb testing.TB) (types []Type) {
	for i, beta := range []float64{0.90, 0.94, 0.98, 0.92, 0.96} {
		h := risky(tb)
		group := 0
		if i > 2 {
			group = 1
			h = riskyWith(tb, func(p *income.Process) {
				for t := range p.Profile {
					p.Profile[t] *= 2
				}
			})
		}
		h.DiscountFactor = beta
		one := population(tb, h, 1)
		one.Types[0].Group = group
		types = append(types, one.Types[0])
	}
	return types
}

// exponential is a household with exponential utility and normal income in form
// level, no limit and no death before the last year.
func exponential(tb testing.TB, years int) policy.Household {
	tb.Helper()
	chain, err := income.Rouwenhorst{Points: 5}.Discretise(income.AR1{Autocorrelation: 0.9, InnovationSD: 0.05})
	if err != nil {
		tb.Fatal(err)
	}
	profile := make([]float64, years)
	for t := range profile {
		profile[t] = 1
	}
	e, err := income.Process{FirstAge: 25, Profile: profile, Form: income.Level, Chain: chain, Initial: chain.Stationary(),
		Transitory: income.Transitory{SD: 0.1, Nodes: 15}}.Build()
	if err != nil {
		tb.Fatal(err)
	}
	u, err := policy.NewCARA(2)
	if err != nil {
		tb.Fatal(err)
	}
	return policy.Household{FirstAge: 25, Survival: income.Certain(25, 25+years-1), Utility: u, DiscountFactor: 0.97, Return: 0.03, Earnings: e,
		Limit: policy.Limit{Kind: policy.LimitNone}, Pension: policy.Pension{ClaimAge: 25 + years}}
}

// derived: the accounting of the model, on every row of every kind of population.
func TestRowsObeyTheModel(t *testing.T) {
	long(t)
	for _, tt := range populations(t) {
		t.Run(tt.name, func(t *testing.T) {
			r := simulate(t, tt.p, Options{Columns: All})
			if int64(r.N) != r.result.HouseholdYears || r.result.Households != tt.p.Households {
				t.Fatalf("%d rows, counts %+v", r.N, r.result)
			}
			l := newLedger(tt.p, r)
			for k := range r.N {
				if fault := l.check(k); fault != "" {
					t.Fatalf("household %d, year %d: %s", r.Household[k], r.t[k], fault)
				}
			}
			for id, years := range l.lived {
				if years == 0 || !l.died[id] {
					t.Fatalf("household %d has %d rows, died in the last: %v", id, years, l.died[id])
				}
			}
		})
	}
}

// ledger follows every household through the rows.
type ledger struct {
	p            *Population
	r            *rows
	assets, twin []float64 // by household, at the end of the last row
	spent        []float64 // by household, in the last row
	node         []uint8
	died         []bool
	lived        []int
	kind         []int
}

func newLedger(p *Population, r *rows) *ledger {
	n := p.Households
	return &ledger{p: p, r: r, assets: make([]float64, n), twin: make([]float64, n), spent: make([]float64, n), node: make([]uint8, n), died: make([]bool, n),
		lived: make([]int, n), kind: make([]int, n)}
}

// check says what is wrong with row k, "" if nothing.
func (l *ledger) check(k int) string {
	r, id, t := l.r, l.r.Household[k], l.r.t[k]
	h := &l.p.Types[r.kind[k]].Rule.Household
	rule := l.p.Types[r.kind[k]].Rule
	R := 1 + h.Return
	m, c, a, y := r.CashOnHand[k], r.Consumption[k], r.Assets[k], r.Income[k]
	near := func(x, want float64) bool { return math.Abs(x-want) <= 1e-12*(1+math.Abs(want)+math.Abs(m)) }
	if t != l.lived[id] || l.died[id] {
		return fmt.Sprintf("is the %dth row, dead before: %v", l.lived[id]+1, l.died[id])
	}
	if r.group[k] != l.p.GroupOf(id) || l.p.Types[r.kind[k]].Group != r.group[k] || t > 0 && r.kind[k] != l.kind[id] {
		return "changes group or type"
	}
	if t > 0 && m != float64(R*l.assets[id])+y { // to the bit
		return fmt.Sprintf("cash-on-hand %v, want %v·%v + %v", m, R, l.assets[id], y)
	}
	if t > 0 && !near(r.TwinAssets[k]+r.TwinConsumption[k], R*l.twin[id]+l.p.Types[r.kind[k]].Twin.Household.MeanIncome(t)) {
		return "the twin's accounts do not balance"
	}
	if t == 0 && !near((m-y)/R, ((r.TwinAssets[k]+r.TwinConsumption[k])-l.p.Types[r.kind[k]].Twin.Household.MeanIncome(0))/R) {
		return "the twin starts with other assets"
	}
	if !near(a, m-c) || a < rule.Curves[t][r.Node[k]].Bound {
		return fmt.Sprintf("assets %v, want %v − %v and at least %v", a, m, c, rule.Curves[t][r.Node[k]].Bound)
	}
	want, propensity := rule.Curves[t][r.Node[k]].At(m)
	if !near(c, want) || math.Abs(r.Propensity[k]-propensity) > 1e-9 {
		return fmt.Sprintf("consumption %v (propensity %v), the rule says %v (%v)", c, r.Propensity[k], want, propensity)
	}
	if bound := rule.Curves[t][r.Node[k]].Bound; r.AtLimit[k] != (a <= bound+1e-9*(1+math.Abs(bound))) {
		return "is wrongly said to be at the limit or not"
	}
	if t > 0 && (r.LastAssets[k] != l.assets[id] || r.LastConsumption[k] != l.spent[id]) ||
		t == 0 && (m != float64(R*r.LastAssets[k])+y || !math.IsNaN(r.LastConsumption[k])) {
		return fmt.Sprintf("last year's assets and consumption %v and %v are not what they were", r.LastAssets[k], r.LastConsumption[k])
	}
	if r.JobLost[k] != (h.Working(t) && !r.Employed[k]) {
		return "is wrongly said to lose its earnings or not"
	}
	l.lived[id]++
	l.spent[id] = c
	l.assets[id], l.twin[id], l.died[id], l.kind[id] = a, r.TwinAssets[k], r.Died[k], r.kind[k]
	return l.checkIncome(k, h)
}

func (l *ledger) checkIncome(k int, h *policy.Household) string {
	r, t, e := l.r, l.r.t[k], h.Earnings
	node := r.Node[k]
	id := r.Household[k]
	if r.Income[k] != r.Earnings[k]+r.Pension[k]-r.Taxes[k] {
		return "income is not earnings + pension − taxes"
	}
	if r.Persistent[k] != e.Chain.Nodes[node] {
		return "persistent part is not its node"
	}
	if t > 0 && !h.Working(t) && node != l.node[id] {
		return "persistent part moves in retirement"
	}
	l.node[id] = node
	switch {
	case !h.Working(t):
		if r.Employed[k] || r.Earnings[k] != 0 || r.Transitory[k] != 0 || r.Pension[k] != h.Pension.Amount(e, int(node)) {
			return "a retired household works, or its pension is wrong"
		}
	case r.Employed[k]:
		if want := e.At(t, int(node), r.Transitory[k]); math.Abs(r.Earnings[k]-want) > 3e-10*math.Abs(want) {
			return fmt.Sprintf("earnings %v, want %v", r.Earnings[k], want)
		}
	default:
		if r.Earnings[k] != e.Benefit[t][node] || r.Transitory[k] != 0 || e.JobLoss.Probability == 0 {
			return "the benefit in a year of job loss is wrong"
		}
	}
	return ""
}

// Position is the inverse of ordering by household, then year, within a block.
func TestPosition(t *testing.T) {
	long(t)
	p := mixed(t, 2*Unit+10)
	_, err := Simulate(t.Context(), p, Options{Columns: All}, func(_ int, b *Block) (func() error, error) {
		at := make([]int, b.N)
		for i := range at {
			at[i] = -1
		}
		covered := 0
		for _, run := range b.Runs {
			if run.From != covered {
				return nil, fmt.Errorf("runs leave a gap at row %d", covered)
			}
			covered = run.To
			for k := run.From; k < run.To; k++ {
				at[b.Position[k]] = int(b.Household[k]-b.First)<<16 | run.T
			}
		}
		for i := range at {
			if at[i] < 0 || i > 0 && at[i] <= at[i-1] {
				return nil, fmt.Errorf("block from %d: place %d is out of order", b.First, i)
			}
		}
		if covered != b.N {
			return nil, fmt.Errorf("runs cover %d of %d rows", covered, b.N)
		}
		return nil, nil
	})
	if err != nil {
		t.Fatal(err)
	}
}

// Columns that are not asked for must not change those that are.
func TestColumnsAreIndependent(t *testing.T) {
	long(t)
	p := mixed(t, Unit+500)
	all := simulate(t, p, Options{Columns: All})
	for bit := Columns(0); bit <= All; bit = max(1, bit<<1) {
		some := simulate(t, p, Options{Columns: bit})
		from, to := all.floats(), some.floats()
		for i := range to {
			if len(*to[i]) == 0 && i != 5 && i != 6 && i != 7 && i != 8 { // income to assets: always there
				continue
			}
			if len(*to[i]) != all.N {
				t.Fatalf("columns %b: column %d has %d rows, want %d", bit, i, len(*to[i]), all.N)
			}
			for k, x := range *to[i] {
				if want := (*from[i])[k]; x != want && !(math.IsNaN(x) && math.IsNaN(want)) {
					t.Fatalf("columns %b: column %d, row %d: %v, want %v", bit, i, k, x, want)
				}
			}
		}
		if bit&Changes != 0 && !slices.Equal(some.JobLost, all.JobLost) {
			t.Errorf("columns %b: other job losses", bit)
		}
		if some.result.HouseholdYears != all.result.HouseholdYears || some.result.HighestCash != all.result.HighestCash {
			t.Errorf("columns %b: counts %+v, want %+v", bit, some.result, all.result)
		}
	}
}
