package main

import (
	"context"
	"fmt"
	"io"
	"slices"
	"sync"
	"testing"

	"cistern/configs"
	"cistern/output"
	"cistern/sim"
)

// benchHouseholds is eight part files.
const benchHouseholds = 8 * 65536

// BenchmarkPanel takes the time a row, on the clock, of simulating quayside and
// writing its panel to disk (work=simulate), and of writing alone: the rows of one
// block over and over (work=write). Their ratio is what simulation adds where it
// has to hide behind encoding.
func BenchmarkPanel(b *testing.B) {
	for _, workers := range []int{1, 2} {
		for _, work := range []string{"write", "simulate"} {
			b.Run(fmt.Sprintf("workers=%d/work=%s", workers, work), func(b *testing.B) {
				sc, err := configs.Builtin(configs.Default, []configs.Override{{Key: "households", Value: fmt.Sprint(benchHouseholds)}})
				if err != nil {
					b.Fatal(err)
				}
				r, err := startRun(&globals{stdout: io.Discard, stderr: io.Discard, quiet: true, workers: workers, replace: true}, sc, b.TempDir())
				if err != nil {
					b.Fatal(err)
				}
				if err := r.solve(context.Background()); err != nil {
					b.Fatal(err)
				}
				population := sc.Population(r.rules, nil)
				rows := int64(0)
				b.ResetTimer()
				for range b.N {
					panel, _, err := r.openPanel()
					if err != nil {
						b.Fatal(err)
					}
					if work == "write" {
						rows, err = r.writeAlone(population, panel, workers)
					} else {
						rows, err = r.simulateAndWrite(population, panel, workers)
					}
					if err != nil {
						b.Fatal(err)
					}
				}
				b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(rows), "ns/row")
			})
		}
	}
}

const panelColumns = sim.All &^ (sim.Twins | sim.Propensity)

func (r *run) simulateAndWrite(p *sim.Population, panel *output.Panel, workers int) (rows int64, err error) {
	result, err := sim.Simulate(context.Background(), p, sim.Options{Workers: workers, Columns: panelColumns},
		func(worker int, block *sim.Block) (func() error, error) {
			return panel.Encode(worker, panelRows(block, r.spans(block)))
		})
	if err != nil {
		return 0, err
	}
	return result.HouseholdYears, panel.Close()
}

// writeAlone writes the rows of the first block as those of every block.
func (r *run) writeAlone(p *sim.Population, panel *output.Panel, workers int) (rows int64, err error) {
	var first output.Rows
	_, err = sim.Simulate(context.Background(), p, sim.Options{To: sim.Unit, Columns: panelColumns}, func(_ int, block *sim.Block) (func() error, error) {
		first = panelRows(block, r.spans(block))
		return nil, nil
	})
	if err != nil {
		return 0, err
	}
	var mu sync.Mutex
	turn := sync.NewCond(&mu)
	next, due := 0, 0
	errs := make([]error, workers)
	var wg sync.WaitGroup
	for w := range workers {
		wg.Add(1)
		go func() {
			defer wg.Done()
			ids := slices.Clone(first.Household)
			for {
				mu.Lock()
				unit := next
				next++
				mu.Unlock()
				if unit*sim.Unit >= benchHouseholds || errs[w] != nil {
					return
				}
				mine := first
				mine.First = int64(unit * sim.Unit)
				for k, id := range first.Household {
					ids[k] = id + mine.First
				}
				mine.Household = ids
				commit, err := panel.Encode(w, mine)
				mu.Lock()
				for due != unit {
					turn.Wait()
				}
				if err == nil {
					err = commit()
				}
				errs[w] = err
				due++
				turn.Broadcast()
				mu.Unlock()
			}
		}()
	}
	wg.Wait()
	if err := firstError(errs); err != nil {
		return 0, err
	}
	return int64(first.N) * benchHouseholds / sim.Unit, panel.Close()
}
