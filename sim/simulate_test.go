package sim

import (
	"context"
	"errors"
	"math"
	"runtime"
	"slices"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"cistern/policy"
)

// fingerprint runs p and continues the hash sum with every column of every block,
// to the bit.
func fingerprint(tb testing.TB, sum uint64, p *Population, o Options) (uint64, Result) {
	tb.Helper()
	o.Columns = All
	result, err := Simulate(tb.Context(), p, o, func(_ int, b *Block) (func() error, error) {
		return func() error { sum = b.hash(sum); return nil }, nil
	})
	if err != nil {
		tb.Fatal(err)
	}
	return sum, result
}

func (b *Block) hash(sum uint64) uint64 {
	for _, c := range b.floats() {
		for _, x := range *c {
			sum = scramble(sum + math.Float64bits(x))
		}
	}
	for k, id := range b.Household {
		sum = scramble(sum + uint64(id)<<32 + uint64(b.Position[k]))
		sum = scramble(sum + uint64(b.Node[k]))
		for _, flag := range []bool{b.Employed[k], b.Died[k], b.AtLimit[k], b.JobLost[k]} {
			if sum = sum<<1 | sum>>63; flag {
				sum++
			}
		}
	}
	return sum
}

func TestWorkersDoNotMatter(t *testing.T) {
	p := mixed(t, 5*Unit+100)
	if testing.Short() {
		p.Households = 2*Unit + 100
	}
	want, counts := fingerprint(t, 0, p, Options{Workers: 1})
	for _, workers := range []int{2, 3, 8} {
		got, c := fingerprint(t, 0, p, Options{Workers: workers})
		if got != want {
			t.Errorf("%d workers give other rows than one", workers)
		}
		if c.Count != counts.Count || c.HighestCash != counts.HighestCash || !slices.Equal(c.Groups, counts.Groups) {
			t.Errorf("%d workers: counts %+v, one worker: %+v", workers, c, counts)
		}
	}
	p.Seed++
	if got, _ := fingerprint(t, 0, p, Options{}); got == want {
		t.Error("another seed gives the same rows")
	}
}

// A household's life depends on seed and id only: not on the range of ids that is
// simulated, not on the size of the population.
func TestRangesReproduceTheWhole(t *testing.T) {
	long(t)
	p := mixed(t, 4*Unit+77)
	whole, counts := fingerprint(t, 0, p, Options{})
	var parts uint64
	var sum Count
	for _, r := range [][2]int64{{0, Unit}, {Unit, 3 * Unit}, {3 * Unit, p.Households}} {
		var result Result
		parts, result = fingerprint(t, parts, p, Options{From: r[0], To: r[1], Workers: 2})
		sum.add(result.Count)
	}
	if parts != whole || sum != counts.Count {
		t.Errorf("ranges of ids give other rows than the whole, or other counts: %+v, want %+v", sum, counts.Count)
	}
	first, _ := fingerprint(t, 0, p, Options{To: 2 * Unit})
	p.Households = 2 * Unit
	if small, _ := fingerprint(t, 0, p, Options{}); small != first {
		t.Error("a small population gives other rows than the first ids of a large one")
	}
}

// Blocks are committed in order, one at a time, and progress is reported after each.
func TestCommitsComeInOrder(t *testing.T) {
	p := population(t, exponential(t, 10), 9*Unit+5)
	var next, reported int64
	var inside atomic.Int32
	_, err := Simulate(t.Context(), p, Options{Workers: 4, OnProgress: func(done, total int64) {
		if done <= reported || total != p.Households {
			t.Errorf("progress %d of %d after %d", done, total, reported)
		}
		reported = done
	}}, func(_ int, b *Block) (func() error, error) {
		if b.First == 0 {
			time.Sleep(20 * time.Millisecond) // the others must wait for the first block
		}
		return func() error {
			if inside.Add(1) != 1 {
				t.Error("two commits at once")
			}
			defer inside.Add(-1)
			if b.First != next {
				t.Errorf("block from %d committed, want %d", b.First, next)
			}
			next = b.First + int64(b.Households)
			return nil
		}, nil
	})
	if err != nil || next != p.Households || reported != p.Households {
		t.Errorf("error %v, %d committed, %d reported, want %d", err, next, reported, p.Households)
	}
}

var errDisk = errors.New("disk full")

// Whatever goes wrong in a block ends the run with an error, and the blocks before
// it are committed, whatever the number of workers.
func TestFailuresEndTheRun(t *testing.T) {
	p := population(t, exponential(t, 10), 8*Unit)
	for _, tt := range []struct {
		name string
		work func(b *Block) (func() error, error)
		want string
	}{
		{"work", func(*Block) (func() error, error) { return nil, errDisk }, "disk full"},
		{"commit", func(*Block) (func() error, error) { return func() error { return errDisk }, nil }, "disk full"},
		{"panic in work", func(*Block) (func() error, error) { panic("sim: broken") }, "broken"},
		{"panic in commit", func(*Block) (func() error, error) { return func() error { panic("broken") }, nil }, "broken"},
		{"end of goroutine", func(*Block) (func() error, error) { runtime.Goexit(); return nil, nil }, "ended its goroutine"},
	} {
		for _, workers := range []int{1, 2, 5} {
			committed := 0
			result, err := Simulate(t.Context(), p, Options{Workers: workers}, func(_ int, b *Block) (func() error, error) {
				if b.First >= 3*Unit {
					if b.First == 3*Unit {
						time.Sleep(5 * time.Millisecond) // later blocks fail first
					}
					return tt.work(b)
				}
				return func() error { committed++; return nil }, nil
			})
			if err == nil || !strings.Contains(err.Error(), tt.want) {
				t.Errorf("%s, %d workers: error %v, want %q", tt.name, workers, err, tt.want)
			}
			if committed != 3 || result.Households != 3*Unit {
				t.Errorf("%s, %d workers: %d blocks committed, %d households counted, want 3 and %d", tt.name, workers, committed, result.Households, 3*Unit)
			}
		}
	}
}

func TestPanicInProgressEndsTheRun(t *testing.T) {
	p := population(t, exponential(t, 10), 4*Unit)
	_, err := Simulate(t.Context(), p, Options{Workers: 2, OnProgress: func(int64, int64) { panic("no bar") }}, nothing)
	if err == nil || !strings.Contains(err.Error(), "no bar") {
		t.Errorf("got %v, want the panic as an error", err)
	}
}

func nothing(int, *Block) (func() error, error) { return nil, nil }

var errStop = errors.New("enough")

func TestCancelEndsWithinABlock(t *testing.T) {
	for _, workers := range []int{1, 3} {
		ctx, cancel := context.WithCancelCause(context.Background())
		p := population(t, exponential(t, 10), 1000*Unit)
		var begun atomic.Int64
		result, err := Simulate(ctx, p, Options{Workers: workers}, func(_ int, b *Block) (func() error, error) {
			begun.Add(1)
			if b.First == 2*Unit {
				cancel(errStop)
			}
			return nil, nil
		})
		if !errors.Is(err, errStop) {
			t.Errorf("%d workers: error %v, want the cause", workers, err)
		}
		if n := begun.Load(); n > int64(3+workers) || result.Households != n*Unit {
			t.Errorf("%d workers: %d blocks begun, %d households counted", workers, n, result.Households)
		}
		cancel(nil)
	}
	// A run that is finished is not cancelled.
	ctx, cancel := context.WithCancel(context.Background())
	if _, err := Simulate(ctx, population(t, risky(t), 10), Options{}, func(int, *Block) (func() error, error) { cancel(); return nil, nil }); err != nil {
		t.Errorf("finished run: %v", err)
	}
}

// A household that cannot pay for what it owes comes to a state that its utility
// does not allow: an error that says who and when, the same for any workers.
func TestImpossibleStates(t *testing.T) {
	p := population(t, risky(t), 4*Unit)
	p.Types[0].Start = Start{Median: 1, LogSD: 1}
	rule := *p.Types[0].Rule
	p.Types[0].Rule = &rule
	rule.Curves = slices.Clone(rule.Curves)
	broken := slices.Clone(rule.Curves[50])
	for j := range broken {
		broken[j].Consumption = make([]float64, len(broken[j].Cash)) // consumes nothing above the limit
		broken[j].Left, broken[j].Right = broken[j].Consumption, broken[j].Consumption
	}
	rule.Curves[50] = broken
	var first *StateError
	for _, workers := range []int{1, 2, 4} {
		_, err := Simulate(t.Context(), p, Options{Workers: workers}, nothing)
		var e *StateError
		if !errors.As(err, &e) {
			t.Fatalf("%d workers: got %v, want a *StateError", workers, err)
		}
		if e.Age != 75 || e.Group != "dockers" || e.Consumption > 0 || e.Twin || !(e.Cash > 0) {
			t.Errorf("%d workers: %+v", workers, e)
		}
		if first == nil {
			first = e
		} else if *e != *first {
			t.Errorf("%d workers: %+v, one worker %+v", workers, e, first)
		}
	}
	rule.Curves[50] = slices.Clone(broken)
	for j := range broken {
		rule.Curves[50][j].Consumption = slices.Repeat([]float64{math.NaN()}, len(broken[j].Cash))
	}
	var e *StateError
	if _, err := Simulate(t.Context(), p, Options{}, nothing); !errors.As(err, &e) || !math.IsNaN(e.Consumption) {
		t.Errorf("a rule that is not a number: got %v", err)
	}
	p = population(t, risky(t), 10)
	p.Types[0].Start = Start{Constant: -10}
	if _, err := Simulate(t.Context(), p, Options{}, nothing); !errors.As(err, &e) || e.Age != 25 || !(e.Cash < 0) {
		t.Errorf("start in debt beyond the limit: got %v", err)
	}
	if msg := e.Error(); !strings.Contains(msg, "dockers") || !strings.Contains(msg, "age 25") {
		t.Errorf("message %q does not say who and when", msg)
	}
	p = population(t, risky(t), 10)
	twin := *p.Types[0].Twin
	twin.Curves = slices.Clone(twin.Curves)
	twin.Curves[3] = rule.Curves[50][:1]
	p.Types[0].Twin = &twin
	if _, err := Simulate(t.Context(), p, Options{Columns: Twins}, nothing); !errors.As(err, &e) || !e.Twin || e.Age != 28 {
		t.Errorf("a twin's rule that is not a number: got %v", err)
	}
}

// Types without a twin have NaN in the twin's columns, not another type's numbers.
func TestTypesWithoutTwin(t *testing.T) {
	long(t)
	p := mixed(t, 2*Unit)
	p.Types[1].Twin = nil
	r := simulate(t, p, Options{Columns: Twins | Identity})
	for k := range r.N {
		if got, want := math.IsNaN(r.TwinAssets[k]) && math.IsNaN(r.TwinConsumption[k]), r.kind[k] == 1; got != want {
			t.Fatalf("row %d of type %d: twin's assets %v, consumption %v", k, r.kind[k], r.TwinAssets[k], r.TwinConsumption[k])
		}
	}
}

// States above the grid are counted, by group, and the highest cash is the highest.
func TestAboveTopIsCounted(t *testing.T) {
	long(t)
	p := mixed(t, Unit+300)
	for i := range p.Types {
		o := policy.DefaultOptions()
		o.HighestAssets = 2 // of mean earnings near 1 and 2: the clerks will be above
		p.Types[i].Rule = solve(t, p.Types[i].Rule.Household, o)
	}
	r := simulate(t, p, Options{Columns: States})
	above, highest := make([]int64, 2), math.Inf(-1)
	for k, y := range r.t {
		if r.CashOnHand[k] > p.Types[r.kind[k]].Rule.Curves[y][r.Node[k]].Top() {
			above[r.group[k]]++
		}
		highest = math.Max(highest, r.CashOnHand[k])
	}
	for g, n := range above {
		if n == 0 || r.result.Groups[g].AboveTop != n {
			t.Errorf("group %d: %d household-years counted above the grid, want %d, more than 0", g, r.result.Groups[g].AboveTop, n)
		}
	}
	if r.result.AboveTop != above[0]+above[1] || r.result.HighestCash != highest {
		t.Errorf("counts %+v, want %v above and highest cash %v", r.result, above, highest)
	}
}

// The highest cash is the highest even where all are in debt.
func TestHighestCashBelowZero(t *testing.T) {
	p := population(t, exponential(t, 10), 100)
	p.Types[0].Start = Start{Constant: -1000}
	r := simulate(t, p, Options{})
	if want := slices.Max(r.CashOnHand); r.result.HighestCash != want || want >= 0 {
		t.Errorf("highest cash %v, want %v, below 0", r.result.HighestCash, want)
	}
	if empty := simulate(t, p, Options{From: 0, To: 0}); empty.result.Households != 100 {
		t.Errorf("To 0 simulates %d households, want all", empty.result.Households)
	}
}

// A rule may miss the limit by rounding; whatever it says, assets stay within it.
func TestAssetsStayWithinTheLimit(t *testing.T) {
	p := population(t, risky(t), 100)
	rule := *p.Types[0].Rule
	rule.Curves = slices.Clone(rule.Curves)
	greedy := slices.Clone(rule.Curves[5])
	for j := range greedy { // consumes all and a bit above the limit
		n := len(greedy[j].Cash)
		greedy[j].Consumption = slices.Clone(greedy[j].Cash)
		for i := range greedy[j].Consumption {
			greedy[j].Consumption[i] *= 1 + 1e-9
		}
		greedy[j].Left, greedy[j].Right = slices.Repeat([]float64{1 + 1e-9}, n), slices.Repeat([]float64{1 + 1e-9}, n)
	}
	rule.Curves[5] = greedy
	p.Types[0].Rule = &rule
	r := simulate(t, p, Options{})
	for k, y := range r.t {
		if y == 5 && (r.Assets[k] != 0 || r.Consumption[k] != r.CashOnHand[k]) {
			t.Fatalf("cash-on-hand %v: consumes %v, keeps %v, want all and 0", r.CashOnHand[k], r.Consumption[k], r.Assets[k])
		}
	}
}

func TestInvalidRuns(t *testing.T) {
	sound := population(t, risky(t), 2*Unit)
	for _, tt := range []struct {
		name   string
		change func(p *Population, o *Options)
		want   []string
	}{
		{"no households", func(p *Population, _ *Options) { p.Households = 0 }, []string{"households: is 0"}},
		{"no group", func(p *Population, _ *Options) { p.Groups = nil }, []string{"needs a group"}},
		{"shares", func(p *Population, _ *Options) { p.Groups[0].Share = 0.9 }, []string{"sum to 0.9"}},
		{"two faults at once", func(p *Population, _ *Options) { p.Groups[0].Share, p.Groups[0].Types = math.NaN(), nil }, []string{"share of group dockers", "has no type"}},
		{"foreign type", func(p *Population, _ *Options) { p.Groups[0].Types = []int{1} }, []string{"type 1 is not one of its own"}},
		{"no rule", func(p *Population, _ *Options) { p.Types[0].Rule = nil }, []string{"has no rule"}},
		{"start", func(p *Population, _ *Options) { p.Types[0].Start.ZeroShare = 1.1 }, []string{"start assets"}},
		{"start not finite", func(p *Population, _ *Options) { p.Types[0].Start = Start{Constant: math.Inf(1)} }, []string{"start assets"}},
		{"other lifetimes", func(p *Population, _ *Options) {
			p.Types = append(p.Types, Type{Rule: solve(t, exponential(t, 10), policy.DefaultOptions())})
		}, []string{"type 1: lives up to 10 years, others 76"}},
		{"range not on a block", func(_ *Population, o *Options) { o.From = 100 }, []string{"multiple of 4096"}},
		{"range backwards", func(_ *Population, o *Options) { o.From, o.To = Unit, 1 }, []string{"households 4096 to 1"}},
		{"range too long", func(_ *Population, o *Options) { o.To = 3 * Unit }, []string{"within 0 to 8192"}},
	} {
		p, o := *sound, Options{}
		p.Groups, p.Types = slices.Clone(p.Groups), slices.Clone(p.Types)
		tt.change(&p, &o)
		_, err := Simulate(t.Context(), &p, o, nothing)
		for _, want := range tt.want {
			if err == nil || !strings.Contains(err.Error(), want) {
				t.Errorf("%s: error %v, want %q", tt.name, err, want)
			}
		}
	}
}

// Memory does not grow with the number of households: blocks are reused.
func TestBlocksAreReused(t *testing.T) {
	allocated := func(households int64) uint64 {
		p := population(t, risky(t), households)
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		if _, err := Simulate(t.Context(), p, Options{Columns: All, Workers: 2}, nothing); err != nil {
			t.Fatal(err)
		}
		runtime.ReadMemStats(&after)
		return after.TotalAlloc - before.TotalAlloc
	}
	few, many := allocated(4*Unit), allocated(24*Unit)
	if float64(many) > 1.1*float64(few) {
		t.Errorf("%d bytes allocated for 4 blocks, %d for 24", few, many)
	}
}

// Whoever is picked lives as without picking, to the bit, and nobody else does.
func TestOnly(t *testing.T) {
	p := mixed(t, Unit+300)
	picked := func(id int64) bool { return id%7 == 3 || id < Unit }
	want, got := map[int64][]float64{}, map[int64][]float64{}
	take := func(into map[int64][]float64) Work {
		return func(_ int, b *Block) (func() error, error) {
			return func() error {
				order := make([]int64, b.N)
				for k, at := range b.Position {
					order[at] = b.Household[k] + 1
				}
				if !slices.IsSorted(order) || b.N > 0 && order[0] == 0 {
					t.Errorf("block from %d: positions %v", b.First, order)
				}
				for k, id := range b.Household {
					into[id] = append(into[id], b.CashOnHand[k], b.Consumption[k], b.Assets[k], b.Income[k])
				}
				return nil
			}, nil
		}
	}
	if _, err := Simulate(t.Context(), p, Options{Columns: All}, take(want)); err != nil {
		t.Fatal(err)
	}
	r, err := Simulate(t.Context(), p, Options{Columns: All, Only: picked}, take(got))
	if err != nil {
		t.Fatal(err)
	}
	households := 0
	for id, rows := range want {
		if !picked(id) {
			continue
		}
		if households++; !slices.Equal(got[id], rows) {
			t.Fatalf("household %d has rows %v, want %v", id, got[id], rows)
		}
	}
	if len(got) != households || r.Households != int64(households) {
		t.Errorf("%d households, counted %d, want %d", len(got), r.Households, households)
	}
	for _, workers := range []int{1, 3} {
		r, err := Simulate(t.Context(), p, Options{Workers: workers, Only: func(id int64) bool { return id == Unit+5 }}, nothing)
		if err != nil || r.Households != 1 || !(r.HighestCash > 0) {
			t.Errorf("one household of the second block: %+v, %v", r.Count, err)
		}
	}
	if r, err := Simulate(t.Context(), p, Options{Only: func(int64) bool { return false }}, nothing); err != nil || r.Count != (Count{}) || r.HighestCash != 0 {
		t.Errorf("nobody: %+v, %v", r, err)
	}
}
