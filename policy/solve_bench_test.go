package policy

import (
	"context"
	"fmt"
	"math"
	"syscall"
	"testing"

	"cistern/income"
)

// referenceHousehold is the reference problem of the speed comparison with the C
// yardstick: size S has 7 persistent and 5 transitory nodes and 200 asset points,
// size L has 15, 7 and 1000.
func referenceHousehold(tb testing.TB, size string, gamma float64) (Household, Options) {
	tb.Helper()
	nodes, shocks, points := 7, 5, 200
	if size == "L" {
		nodes, shocks, points = 15, 7, 1000
	}
	chain, err := income.Rouwenhorst{Points: nodes}.Discretise(income.AR1{Autocorrelation: 0.95, InnovationSD: 0.15})
	if err != nil {
		tb.Fatal(err)
	}
	profile := make([]float64, 40)
	for i := range profile {
		x := float64(i)
		profile[i] = math.Exp(0.04*x - 0.00075*x*x)
	}
	e, err := income.Process{FirstAge: 25, Profile: profile, ProfileIs: income.Median, Chain: chain, Initial: chain.Stationary(),
		Transitory: income.Transitory{SD: 0.2, Nodes: shocks, Rule: income.GaussHermite}}.Build()
	if err != nil {
		tb.Fatal(err)
	}
	survival, err := income.Gompertz{ModalAge: 88, Dispersion: 10}.Survival(25, 100)
	if err != nil {
		tb.Fatal(err)
	}
	u, err := NewCRRA(gamma)
	if err != nil {
		tb.Fatal(err)
	}
	o := DefaultOptions()
	o.AssetPoints, o.HighestAssets, o.AssetScale = points, 300, 1
	return Household{FirstAge: 25, Survival: survival, Utility: u, DiscountFactor: 0.96, Return: 0.03, Earnings: e,
		Pension: Pension{ClaimAge: 65, FinalEarningsRate: 0.5}}, o
}

var ruleSink *Rule

// processTime is the processor time that the test process has used: on a machine
// that others use too it says more than the clock.
func processTime() int64 {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		panic(err)
	}
	return u.Utime.Nano() + u.Stime.Nano()
}

// BenchmarkSolve reports time per node update: one evaluation of next year's rule
// at one node, income outcome and asset point.
func BenchmarkSolve(b *testing.B) {
	for _, size := range []string{"S", "L", "Q"} {
		for _, method := range []Interpolation{Linear, Cubic} {
			b.Run(fmt.Sprintf("size=%s/interpolation=%v", size, method), func(b *testing.B) {
				h, o := referenceHousehold(b, size, 2.5)
				if size == "Q" {
					h, o = referenceAccrual(b, 2.5)
				}
				o.Interpolation = method
				s := NewSolver(h.Years())
				ctx := context.Background()
				if _, err := s.Solve(ctx, h, o); err != nil { // the memory is there afterwards
					b.Fatal(err)
				}
				b.ResetTimer()
				start := processTime()
				for range b.N {
					r, err := s.Solve(ctx, h, o)
					if err != nil {
						b.Fatal(err)
					}
					ruleSink = r
				}
				b.ReportMetric(float64(processTime()-start)/float64(b.N)/float64(ruleSink.Updates), "cpu-ns/update")
			})
		}
	}
}
