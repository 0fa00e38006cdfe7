package pension_test

import (
	"syscall"
	"testing"

	"cistern/policy/pension"
)

var (
	moneySink       float64
	entitlementSink pension.Entitlement
	lawSink         *pension.Law
)

// processor reports the processor time of a benchmark's operations: on a machine that
// others use too it says more than the clock.
func processor(b *testing.B, run func()) {
	used := func() int64 {
		var u syscall.Rusage
		if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
			b.Fatal(err)
		}
		return u.Utime.Nano() + u.Stime.Nano()
	}
	start := used()
	for b.Loop() {
		run()
	}
	b.ReportMetric(float64(used()-start)/float64(b.N), "cpu-ns/op")
}

// benchLaw is quayside with two pillars, or with the power form.
func benchLaw(b *testing.B, power bool) *pension.Law {
	r := quayside()
	r.Points = &pension.Points{Cap: constant(2), Value: constant(0.01), Indexation: pension.WithWages()}
	r.FundedAccount = &pension.FundedAccount{Credit: constant(0.05)}
	if power {
		r.Taxes.Income = pension.IncomeTax{Power: &pension.PowerTax{Level: constant(0.9), Progressivity: constant(0.181)}}
	}
	return law(b, r, cohort(mortal()))
}

// earningsOf is a spread of earnings that no branch predictor learns.
func earningsOf() [1024]float64 {
	var y [1024]float64
	x := uint64(1)
	for i := range y {
		x = x*6364136223846793005 + 1442695040888963407
		y[i] = 100000 * float64(x>>11) / (1 << 53)
	}
	return y
}

func BenchmarkNet(b *testing.B) {
	for _, power := range []bool{false, true} {
		name := "tax=brackets"
		if power {
			name = "tax=power"
		}
		l, y := benchLaw(b, power), earningsOf()
		b.Run(name+"/work", func(b *testing.B) {
			i := 0
			processor(b, func() { moneySink += l.Net(20, pension.Receipts{Earnings: y[i&1023], Employed: true}); i++ })
		})
		b.Run(name+"/retirement", func(b *testing.B) {
			i := 0
			processor(b, func() { moneySink += l.Resources(50, pension.Receipts{Pension: y[i&1023], Claimed: true}, 10000); i++ })
		})
	}
}

func BenchmarkNext(b *testing.B) {
	l, y := benchLaw(b, false), earningsOf()
	i := 0
	processor(b, func() { entitlementSink = l.Next(20, pension.Entitlement{20, 3}, y[i&1023], true); i++ })
}

func BenchmarkPension(b *testing.B) {
	l, y := benchLaw(b, false), earningsOf()
	i := 0
	processor(b, func() { moneySink += l.Pension(45, 50, pension.Entitlement{y[i&1023] * 1e-3, 3}, 0); i++ })
}

func BenchmarkFor(b *testing.B) {
	r := quayside()
	r.NotionalAccount = &pension.NotionalAccount{Credit: constant(0.16), Return: pension.WithWages(), DivisorRate: constant(0.016)}
	r.Claim = pension.Claim{Statutory: constant(65), Earliest: constant(60), Latest: constant(70), Reduction: pension.FlatRate(0.05), Increase: pension.FlatRate(0.05)}
	c := cohort(mortal())
	for b.Loop() {
		l, err := r.For(c)
		if err != nil {
			b.Fatal(err)
		}
		lawSink = l
	}
}
