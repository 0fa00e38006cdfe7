package income_test

import (
	"fmt"
	"testing"

	"cistern/income"
)

// Kept so that the compiler cannot drop the calls.
var (
	chainSink    *income.Chain
	lawSink      []float64
	earningsSink *income.Earnings
	momentSink   income.Moments
)

func BenchmarkDiscretise(b *testing.B) {
	p := income.AR1{Autocorrelation: 0.95, InnovationSD: 0.2}
	for _, n := range []int{7, 25, 125} {
		for _, d := range []income.Discretiser{income.Rouwenhorst{Points: n}, income.Tauchen{Points: n, Span: 3}} {
			b.Run(fmt.Sprintf("method=%s/points=%d", d.Name(), n), func(b *testing.B) {
				b.ReportAllocs()
				for b.Loop() {
					chainSink = discretise(b, d, p)
				}
			})
		}
	}
}

func BenchmarkStationary(b *testing.B) {
	for _, n := range []int{7, 25, 125} {
		c := discretise(b, income.Rouwenhorst{Points: n}, income.AR1{Autocorrelation: 0.95, InnovationSD: 0.2})
		b.Run(fmt.Sprintf("points=%d", n), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				lawSink = c.Stationary()
			}
		})
	}
}

func BenchmarkMoments(b *testing.B) {
	for _, n := range []int{7, 25, 125} {
		c := discretise(b, income.Rouwenhorst{Points: n}, income.AR1{Autocorrelation: 0.95, InnovationSD: 0.2})
		law := c.Stationary()
		b.Run(fmt.Sprintf("points=%d", n), func(b *testing.B) {
			for b.Loop() {
				momentSink = c.Moments(law)
			}
		})
	}
}

func BenchmarkNormalNodes(b *testing.B) {
	for _, rule := range []income.Rule{income.Trapezoid, income.GaussHermite} {
		for _, n := range []int{15, 31, 199} {
			b.Run(fmt.Sprintf("rule=%v/nodes=%d", rule, n), func(b *testing.B) {
				for b.Loop() {
					lawSink, _ = income.NormalNodes(rule, n)
				}
			})
		}
	}
}

func BenchmarkBuild(b *testing.B) {
	for _, n := range []int{7, 25} {
		p := worker(b, nil).Process
		p.Chain = discretise(b, income.Rouwenhorst{Points: n}, income.AR1{Autocorrelation: 0.95, InnovationSD: 0.2})
		p.Initial = p.Chain.Stationary()
		b.Run(fmt.Sprintf("years=40/points=%d", n), func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				e, err := p.Build()
				if err != nil {
					b.Fatal(err)
				}
				earningsSink = e
			}
		})
	}
}
