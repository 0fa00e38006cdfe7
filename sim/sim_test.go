package sim

import (
	"context"
	"fmt"
	"syscall"
	"testing"

	"cistern/income"
	"cistern/policy"
)

// reference is the reference problem of the speed comparison with the C
// yardstick, size S (7 persistent nodes, 200 asset points) or L (15, 1000).
func reference(tb testing.TB, size string) policy.Household {
	tb.Helper()
	nodes := 7
	if size == "L" {
		nodes = 15
	}
	chain, err := income.Rouwenhorst{Points: nodes}.Discretise(income.AR1{Autocorrelation: 0.95, InnovationSD: 0.15})
	if err != nil {
		tb.Fatal(err)
	}
	profile := income.Polynomial(income.Log, []float64{0, 0.04, -0.00075}, 25, 25, 40)
	e, err := income.Process{FirstAge: 25, Profile: profile, ProfileIs: income.Median, Chain: chain, Initial: chain.Stationary(),
		Transitory: income.Transitory{SD: 0.2, Nodes: 5, Rule: income.GaussHermite}}.Build()
	if err != nil {
		tb.Fatal(err)
	}
	survival, err := income.Gompertz{ModalAge: 88, Dispersion: 10}.Survival(25, 100)
	if err != nil {
		tb.Fatal(err)
	}
	u, err := policy.NewCRRA(2)
	if err != nil {
		tb.Fatal(err)
	}
	return policy.Household{FirstAge: 25, Survival: survival, Utility: u, DiscountFactor: 0.96, Return: 0.03, Earnings: e,
		Pension: policy.Pension{ClaimAge: 65, FinalEarningsRate: 0.5}}
}

func solve(tb testing.TB, h policy.Household, o policy.Options) *policy.Rule {
	tb.Helper()
	r, err := policy.Solve(context.Background(), h, o)
	if err != nil {
		tb.Fatal(err)
	}
	return r
}

// risky is a household with every feature: job loss, survival, mean profile.
func risky(tb testing.TB) policy.Household {
	h := reference(tb, "S")
	p := h.Earnings.Process
	p.ProfileIs, p.JobLoss = income.Mean, income.JobLoss{Probability: 0.05, BenefitRate: 0.4}
	p.Transitory = income.Transitory{SD: 0.2, Nodes: 15}
	p.Initial = p.Chain.Project(0.3)
	e, err := p.Build()
	if err != nil {
		tb.Fatal(err)
	}
	h.Earnings, h.Pension.Flat = e, 0.1
	return h
}

// population is one group of one type with its twin.
func population(tb testing.TB, h policy.Household, households int64) *Population {
	tb.Helper()
	twin, err := h.Twin()
	if err != nil {
		tb.Fatal(err)
	}
	o := policy.DefaultOptions()
	return &Population{Seed: 20260401, Households: households, Groups: []Group{{Name: "dockers", Share: 1, Types: []int{0}}},
		Types: []Type{{Rule: solve(tb, h, o), Twin: solve(tb, twin, o), Start: Start{Median: 0.5, LogSD: 1, ZeroShare: 0.3}}}}
}

var benchResult Result

// BenchmarkSimulate reports time per household-year on one worker and on two, for
// the yardstick's population (10⁶ households: the tables are made once a run, which tells in small ones).
func BenchmarkSimulate(b *testing.B) {
	const yardstick = Identity | States | Fates // the columns that the C yardstick fills
	for _, bb := range []struct {
		size    string
		method  policy.Interpolation
		columns string
		fill    Columns
		workers int
	}{
		{"S", policy.Linear, "none", 0, 1},
		{"S", policy.Linear, "yardstick", yardstick, 1},
		{"S", policy.Linear, "yardstick", yardstick, 2},
		{"S", policy.Cubic, "yardstick", yardstick, 1},
		{"S", policy.Cubic, "all", All, 1},
		{"S", policy.Cubic, "all", All, 2},
		{"L", policy.Linear, "yardstick", yardstick, 1},
	} {
		b.Run(fmt.Sprintf("size=%s/interpolation=%v/columns=%s/workers=%d", bb.size, bb.method, bb.columns, bb.workers), func(b *testing.B) {
			p := referencePopulation(b, bb.size, bb.method)
			if testing.Short() {
				p.Households = 2 * Unit
			}
			b.ResetTimer()
			start := processTime()
			for range b.N {
				r, err := Simulate(b.Context(), p, Options{Columns: bb.fill, Workers: bb.workers}, nothing)
				if err != nil {
					b.Fatal(err)
				}
				benchResult = r
			}
			years := float64(b.N) * float64(benchResult.HouseholdYears)
			b.ReportMetric(float64(processTime()-start)/years, "cpu-ns/household-year")
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/years, "ns/household-year")
		})
	}
}

// referencePopulation is a million households of the speed comparison.
func referencePopulation(tb testing.TB, size string, method policy.Interpolation) *Population {
	tb.Helper()
	h := reference(tb, size)
	o := policy.DefaultOptions()
	o.Interpolation, o.HighestAssets, o.AssetScale = method, 300, 1
	if size == "L" {
		o.AssetPoints = 1000
	}
	p := population(tb, h, 1_000_000)
	p.Types[0].Rule = solve(tb, h, o)
	p.Types[0].Start = Start{Median: 0.5, LogSD: 1}
	return p
}

// processTime is the processor time that the test process has used: on a machine
// that others use too it says more than the clock.
func processTime() int64 {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		panic(err)
	}
	return u.Utime.Nano() + u.Stime.Nano()
}
