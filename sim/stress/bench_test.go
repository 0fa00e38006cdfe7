package stress

import (
	"testing"

	"cistern/sim"
)

// benchmarkEvents are events of each kind of cost.
func benchmarkEvents() []named {
	layoffs := year(func(y *Year) { y.JobLoss, y.Level = Rate{X: 2}, -0.05 })
	surprise, foreseen, shifted := everyone(layoffs, layoffs), everyone(layoffs, layoffs), everyone(layoffs, layoffs)
	foreseen.Expect, shifted.Persistent = Foreseen, -0.1
	return []named{{"surprise", surprise}, {"foreseen", foreseen}, {"shifted", shifted}}
}

type named struct {
	name  string
	event *Event
}

// BenchmarkPrepare reports the time to prepare an event of two years for one type,
// 56 ages and ten years after it.
func BenchmarkPrepare(b *testing.B) {
	p := port(b, 1, dockers(b, nil))
	for _, e := range benchmarkEvents() {
		b.Run("event="+e.name, func(b *testing.B) {
			for b.Loop() {
				if _, err := Prepare(b.Context(), p, e.event, Window{2, 10}, Options{Solver: solver(), Autocorrelation: []float64{rho}}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// BenchmarkLive reports the time of a household-year of 10⁵ households that live
// through an event, and the same without one, on one worker.
func BenchmarkLive(b *testing.B) {
	households := int64(100_000)
	if testing.Short() {
		households = sim.Unit
	}
	p := port(b, households, dockers(b, nil))
	live := func(b *testing.B, e *sim.Event) {
		years := 0.0
		for b.Loop() {
			r, err := sim.Simulate(b.Context(), p, sim.Options{Columns: sim.Identity, Event: e}, func(int, *sim.Block) (func() error, error) { return nil, nil })
			if err != nil {
				b.Fatal(err)
			}
			years += float64(r.HouseholdYears)
		}
		b.ReportMetric(float64(b.Elapsed().Nanoseconds())/years, "ns/household-year")
	}
	b.Run("event=none", func(b *testing.B) { live(b, nil) })
	for _, e := range benchmarkEvents() {
		ev, err := Prepare(b.Context(), p, e.event, Window{2, 10}, Options{Solver: solver(), Autocorrelation: []float64{rho}})
		if err != nil {
			b.Fatal(err)
		}
		b.Run("event="+e.name, func(b *testing.B) { live(b, ev) })
	}
}
