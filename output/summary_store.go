package output

import (
	"math"
	"sync"
	"sync/atomic"

	"cistern/output/stats"
)

// Bytes a row takes in the store, and while the values of one variable are
// sorted.
const (
	storedBytes  = variables*8 + 1
	sortingBytes = 2 * (8 + 1)
)

// store holds the values of blocks that start below household end, in the order
// of blocks.
type store struct {
	end    int64
	blocks []*block
}

// block holds the values of one block of households.
type block struct {
	spans      []span
	values     [variables][]float64
	tags       []uint8 // jackknife group of a row
	households int64
}

// span says which cell the rows from ≤ k < to belong to.
type span struct{ cell, from, to int }

func newBlock(r *SummaryRows, cellOf func(Span) int) *block {
	b := &block{tags: make([]uint8, r.N)}
	for v, column := range [variables][]float64{r.Income, r.Consumption, r.Assets} {
		b.values[v] = append(make([]float64, 0, r.N), column[:r.N]...)
	}
	last := r.First - 1
	for k, id := range r.Household[:r.N] {
		b.tags[k] = uint8(id & (groupsJackknife - 1))
		last = max(last, id)
	}
	b.households = last - r.First + 1
	for _, sp := range r.Spans {
		if sp.From < sp.To {
			b.spans = append(b.spans, span{cellOf(sp), sp.From, sp.To})
		}
	}
	return b
}

// valueResult is what the values of one variable in one target say.
type valueResult struct {
	quantiles []quantileResult // by percentile of the target
	gini      stats.Estimate
	giniBound float64 // on the error of gini.Value from binning; 0 where exact
}

// quantileResult is a quantile, the positions of what it is made of among the
// n sorted values, and the values found there.
type quantileResult struct {
	j, lower, upper int64   // ranks from 1; lower 0 or upper n+1: no bound
	g               float64 // the quantile is (1−g)·x_j + g·x_(j+1)
	value           stats.Estimate
}

// set fills in the values, at being the order statistic of a rank.
func (q *quantileResult) set(n int64, at func(rank int64) float64) {
	nan := math.NaN()
	q.value = stats.Estimate{Value: at(q.j), StandardError: nan, Lower: nan, Upper: nan}
	if q.g > 0 {
		q.value.Value = stats.Between(q.value.Value, at(q.j+1), q.g)
	}
	if q.lower >= 1 {
		q.value.Lower = at(q.lower)
	}
	if q.upper <= n {
		q.value.Upper = at(q.upper)
	}
	q.value.StandardError = (q.value.Upper - q.value.Lower) / (2 * normalHalfWidth)
}

// normalHalfWidth is the 97.5 % point of the normal distribution: half the
// width of a 95 % interval in standard errors.
const normalHalfWidth = 1.959963984540054

// plan returns the ranks that a quantile of n rows needs. Rows of a household
// in several years are not independent: the interval is then that of n/effect
// rows, its ranks stretched to n.
func plan(n int64, percentile, effect float64) quantileResult {
	p := percentile / 100
	j, g := quantileType.Position(float64(n), p)
	q := quantileResult{j: int64(j), g: g}
	effective := max(1, int64(float64(n)/effect))
	lower, upper, _ := stats.OrderInterval(effective, p, confidence)
	q.lower, q.upper = lower, upper
	if effective < n {
		stretch := float64(n) / float64(effective)
		q.lower = int64(math.Floor(float64(lower) * stretch))
		q.upper = int64(math.Ceil(float64(upper) * stretch))
	}
	if lower == 0 {
		q.lower = 0
	}
	if upper > effective || q.upper > n {
		q.upper = n + 1
	}
	return q
}

// analyseStore describes what the store holds, target by target and variable by
// variable. If the store is whole, the results are final; otherwise it is a
// sample that yields the errors of Gini coefficients and the effect of pooling,
// and the quantiles remain to be found.
func (s *Summary) analyseStore(whole bool) {
	index := s.store.index(s.cells)
	rows := make([]int64, len(s.targets))
	for i := range s.targets {
		rows[i] = s.rows(i)
	}
	var next atomic.Int64
	var wg sync.WaitGroup
	for range min(s.o.Workers, sorters) {
		wg.Go(func() {
			var sorter sorter
			for {
				k := int(next.Add(1)) - 1
				if k >= len(s.results) {
					return
				}
				t := &s.targets[k/variables]
				s.results[k] = s.analyse(&sorter, index, t, k%variables, rows[k/variables], whole)
			}
		})
	}
	wg.Wait()
}

// analyse describes one variable of one target of n rows.
func (s *Summary) analyse(so *sorter, index [][]piece, t *target, v int, n int64, whole bool) valueResult {
	r := valueResult{gini: stats.Estimate{Value: math.NaN(), StandardError: math.NaN(), Lower: math.NaN(), Upper: math.NaN()}}
	percentiles := t.percentiles(&s.o, v)
	if n == 0 || (len(percentiles) == 0 && !t.wantsGini()) {
		return r
	}
	so.load(index, t.cells, v)
	so.sort()
	for _, p := range percentiles {
		effect := 1.0
		if !t.independent() {
			effect = so.designEffect(p / 100)
		}
		q := plan(n, p, effect)
		if whole {
			q.set(n, func(rank int64) float64 { return fromKey(so.keys[rank-1]) })
		}
		r.quantiles = append(r.quantiles, q)
	}
	if t.wantsGini() {
		held := float64(len(so.keys))
		value, se, groups := so.gini()
		r.gini = stats.JackknifeInterval(value, se*math.Sqrt(held/float64(n)), groups, confidence)
	}
	return r
}

// piece is a run of rows of one cell in the store.
type piece struct {
	b        *block
	from, to int
}

// index lists the pieces of every cell, in the order of blocks.
func (st *store) index(cells int) [][]piece {
	index := make([][]piece, cells)
	for _, b := range st.blocks {
		for _, sp := range b.spans {
			index[sp.cell] = append(index[sp.cell], piece{b, sp.from, sp.to})
		}
	}
	return index
}
