package output

import (
	"math"
	"runtime"
	"testing"
)

// crowd feeds a panel of any size from one block: every block is the first one
// with money scaled a little and households renumbered.
func crowd(t testing.TB, households int64, o SummaryOptions, block *SummaryRows, unit int64) (passes int, peak uint64) {
	t.Helper()
	o.Households = households
	s, err := NewSummary(o)
	if err != nil {
		t.Fatal(err)
	}
	rows := *block
	scaled := func(x []float64) []float64 { return make([]float64, len(x)) }
	rows.Income, rows.Consumption, rows.Assets = scaled(block.Income), scaled(block.Consumption), scaled(block.Assets)
	rows.Household = make([]int64, block.N)
	rows.LastConsumption, rows.JobLost = nil, nil // they would not be those of the households here
	sample := func() {
		runtime.GC() // what is held, not what waits for collection
		var m runtime.MemStats
		runtime.ReadMemStats(&m)
		peak = max(peak, m.HeapAlloc)
	}
	for more := true; more; {
		for first := int64(0); first < households; first += unit {
			_, at := math.Modf(float64(first/unit) * 0.6180339887498949)
			factor := 1 + 0.01*at
			rows.First = first
			for k := range block.N {
				rows.Household[k] = block.Household[k] + first
				rows.Income[k], rows.Consumption[k], rows.Assets[k] = block.Income[k]*factor, block.Consumption[k]*factor, block.Assets[k]*factor
			}
			commit, err := s.Add(0, &rows)
			if err == nil && commit != nil {
				err = commit()
			}
			if err != nil {
				t.Fatal(err)
			}
			if first/unit%64 == 0 {
				sample()
			}
		}
		sample()
		if more, err = s.EndPass(); err != nil {
			t.Fatal(err)
		}
		sample()
	}
	return s.Passes(), peak
}

// TestSummaryMemory asks that ten times the households take at most 1.2 times
// the memory once values are not held.
func TestSummaryMemory(t *testing.T) {
	if testing.Short() {
		t.Skip("some hundred thousand households")
	}
	w := town{households: 1024, first: 25, last: 64, groups: []string{"dockers", "clerks"}, unit: 1024, mortality: 0.01}
	block := w.block(0)
	o := w.options()
	o.MemoryBudget = 16 << 20
	small, few := crowd(t, 30<<10, o, block, w.unit)
	large, many := crowd(t, 300<<10, o, block, w.unit)
	t.Logf("%d and %d passes, %.1f and %.1f MiB", small, large, float64(few)/(1<<20), float64(many)/(1<<20))
	if small < 2 {
		t.Fatal("the small panel was held in memory")
	}
	if float64(many) > 1.2*float64(few) {
		t.Errorf("ten times the households take %.2f times the memory, want at most 1.2", float64(many)/float64(few))
	}
}
