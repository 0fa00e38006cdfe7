package output

import (
	"fmt"
	"math"
	"testing"
)

// BenchmarkSummaryAdd measures what a row costs in each pass: values held in
// memory (with the table at the end left out), the first of several passes, and
// a later one, for percentiles alone and for concentration and tails too.
func BenchmarkSummaryAdd(b *testing.B) {
	w := town{households: 4096, first: 25, last: 100, groups: []string{"dockers", "clerks", "pilots"}, unit: 4096, mortality: 0.01}
	block := w.block(0)
	for _, pass := range []string{"held", "first", "later", "later with tails"} {
		b.Run("pass="+pass, func(b *testing.B) {
			o := w.options()
			if pass != "later with tails" {
				o.Lorenz, o.TopShares, o.Shortfalls, o.Tail = nil, nil, nil, 0
			}
			if pass != "held" {
				o.MemoryBudget = 64 << 20
				o.Households = 1 << 24
			}
			most := 8 // blocks of a summary: more would be held
			if pass == "first" {
				most = math.MaxInt
			}
			rows := *block
			var s *Summary
			add := func() {
				rows.First += w.unit
				commit, err := s.Add(0, &rows)
				if err == nil && commit != nil {
					err = commit()
				}
				if err != nil {
					b.Fatal(err)
				}
			}
			begin := func() {
				var err error
				if s, err = NewSummary(o); err != nil {
					b.Fatal(err)
				}
				rows.First = -w.unit
				if pass == "first" {
					rows.First = o.Households // most blocks of a large panel are not held
				}
				if pass == "held" || pass == "first" {
					add() // makes room
					return
				}
				for range most {
					add()
				}
				if more, err := s.EndPass(); !more || err != nil {
					b.Fatal(more, err)
				}
			}
			begin()
			n := 0
			for b.Loop() {
				if n == most {
					b.StopTimer()
					begin()
					n = 0
					b.StartTimer()
				}
				n++
				add()
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(block.N), "ns/row")
		})
	}
}

// BenchmarkSummaryTable measures the analysis of values held in memory.
func BenchmarkSummaryTable(b *testing.B) {
	for _, tt := range []struct {
		households int64
		tails      bool
	}{{4096, false}, {4096, true}, {16384, false}, {16384, true}} {
		households := tt.households
		b.Run(fmt.Sprintf("households=%d/tails=%v", households, tt.tails), func(b *testing.B) {
			w := town{households: households, first: 25, last: 100, groups: []string{"dockers", "clerks", "pilots"}, unit: 4096, mortality: 0.01}
			var blocks []*SummaryRows
			for first := int64(0); first < households; first += w.unit {
				blocks = append(blocks, w.block(first))
			}
			for b.Loop() {
				o := w.options()
				if !tt.tails {
					o.Lorenz, o.TopShares, o.Shortfalls, o.Tail = nil, nil, nil, 0
				}
				s, err := NewSummary(o)
				if err != nil {
					b.Fatal(err)
				}
				for _, rows := range blocks {
					commit, err := s.Add(0, rows)
					if err != nil {
						b.Fatal(err)
					}
					if err := commit(); err != nil {
						b.Fatal(err)
					}
				}
				if _, err := s.EndPass(); err != nil {
					b.Fatal(err)
				}
				s.Table()
			}
		})
	}
}
