package sim

import (
	"math"
	"sync"

	"cistern/income"
	"cistern/policy"
)

// plan is a population ready for simulation: tables and thresholds, shared by
// all workers and never changed.
type plan struct {
	p     *Population
	years int
	types []typePlan
	event *eventPlan // nil without an event
}

// typePlan is what the years of one type need.
type typePlan struct {
	h         policy.Household
	group     int
	laws      []law           // [t]
	twin      []*policy.Table // [t]; nil without twins
	twinMoney []float64       // [t] the twin's certain income
	nodes     [256]float64    // [node] z; indexed by a byte, so that no bound is checked
	floor     float64         // consumption lies above it

	initial []uint64 // [node] cumulated, of 2^32
	moves   moves

	startLog  *normalTable // log of start assets over their median
	zeroShare uint64       // of 2^32
	start     Start
}

// newPlan prepares p for simulation with the wanted columns, through e unless it is
// nil.
func newPlan(p *Population, want Columns, e *Event) *plan {
	pl := &plan{p: p, years: p.Years(), types: make([]typePlan, len(p.Types))}
	tables := tableCache{}
	var wg sync.WaitGroup
	for i := range p.Types {
		tp := &pl.types[i]
		tp.set(&p.Types[i], want, &tables)
		wg.Add(1)
		go func() {
			defer wg.Done()
			for t := range tp.laws {
				tp.laws[t].follow(p.Types[i].Rule, t)
			}
			if p.Types[i].Twin != nil && want&Twins != 0 {
				tp.twin = ruleTables(p.Types[i].Twin)
			}
		}()
	}
	wg.Wait()
	if e != nil {
		pl.event = newEventPlan(pl, e, want, &tables)
	}
	return pl
}

// longestLife returns the expected number of years lived by the type that lives
// longest.
func (pl *plan) longestLife() float64 {
	longest := 0.0
	for i := range pl.types {
		alive, years := 1.0, 0.0
		for _, s := range pl.types[i].h.Survival {
			years += alive
			alive *= s
		}
		longest = math.Max(longest, years)
	}
	return longest
}

func ruleTables(r *policy.Rule) []*policy.Table {
	tables := make([]*policy.Table, len(r.Curves))
	for t := range tables {
		tables[t] = r.Table(t)
	}
	return tables
}

func (tp *typePlan) set(t *Type, want Columns, tables *tableCache) {
	h := t.Rule.Household
	e := h.Earnings
	tp.h, tp.group, tp.start = h, t.Group, t.Start
	tp.floor = h.Utility.Infimum()
	copy(tp.nodes[:], e.Chain.Nodes)
	for y := range h.Years() {
		tp.laws = append(tp.laws, newLaw(&h, y, want, tables))
		if t.Twin != nil {
			tp.twinMoney = append(tp.twinMoney, t.Twin.Household.MeanIncome(y))
		}
	}
	tp.initial = cumulated(e.Initial)
	tp.moves = newMoves(e.Chain)
	tp.startLog = tables.get(tableKey{sd: t.Start.LogSD})
	tp.zeroShare = of32(t.Start.ZeroShare)
}

// tableCache keeps one normalTable a law.
type tableCache map[tableKey]*normalTable

type tableKey struct {
	sd, shift float64
	exp       bool
}

func (c *tableCache) get(k tableKey) *normalTable {
	t, ok := (*c)[k]
	if !ok {
		t = newNormalTable(func(x float64) float64 {
			if k.exp {
				return math.Exp(float64(k.sd*x) - k.shift)
			}
			return k.sd * x
		})
		(*c)[k] = t
	}
	return t
}

// of32 returns a probability in 2^−32, rounded to nearest.
func of32(p float64) uint64 { return uint64(math.Round(p * (1 << 32))) }

// cumulated returns the upper ends of the nodes' shares of 2^32.
func cumulated(p []float64) []uint64 {
	c := make([]uint64, len(p))
	sum := 0.0
	for j, q := range p {
		sum += q
		c[j] = of32(math.Min(sum, 1))
	}
	c[len(c)-1] = 1 << 32
	return c
}

// moves draws next year's node by inverse distribution function: for every node
// the cumulated transition probabilities, and a guide by the top 8 bits of the
// draw to where the search starts.
type moves struct {
	ends  []uint64 // [node][next]
	guide []uint8  // [node][256]
	n     int
}

func newMoves(c *income.Chain) moves {
	n := c.Len()
	m := moves{n: n}
	for i := range n {
		ends := cumulated(c.Row(i))
		j := 0
		for b := range 256 {
			for uint64(b)<<24 >= ends[j] {
				j++
			}
			m.guide = append(m.guide, uint8(j))
		}
		m.ends = append(m.ends, ends...)
	}
	return m
}

// move sets next nodes from the low halves of the draws.
func (m *moves) move(node []uint8, draw []uint64) {
	draw = draw[:len(node)]
	for i, z := range node {
		x := draw[i] & (1<<32 - 1)
		j := int(m.guide[int(z)<<8|int(x>>24)])
		ends := m.ends[int(z)*m.n:]
		for x >= ends[j] {
			j++
		}
		node[i] = uint8(j)
	}
}
