package policy

import (
	"math"
	"math/rand"
	"testing"
)

// BenchmarkTableEntitlement reports time per state of a panel's block in a working
// year of a household with an entitlement, and of one without.
func BenchmarkTableEntitlement(b *testing.B) {
	const n = 32768
	h := accruingHousehold(b, 25)
	plain := h
	plain.Laws, plain.Pension = nil, Pension{ClaimAge: 65, FinalEarningsRate: 0.4, Flat: 3000}
	random := rand.New(rand.NewSource(1))
	node, cash, accrued := make([]uint8, n), make([]float64, n), make([]float64, n)
	for i := range cash {
		node[i] = uint8(random.Intn(7))
		cash[i] = 30000 * math.Exp(random.NormFloat64())
		accrued[i] = 5000 * math.Exp(0.4*random.NormFloat64())
	}
	c, d := make([]float64, n), make([]float64, n)
	for _, bb := range []struct {
		name   string
		h      Household
		column [][]float64
		year   int
	}{{"accrued/working", h, [][]float64{accrued}, 20}, {"accrued/retired", h, [][]float64{accrued}, 50}, {"plain/working", plain, nil, 20}} {
		rule, err := Solve(b.Context(), bb.h, DefaultOptions())
		if err != nil {
			b.Fatal(err)
		}
		tb := rule.Table(bb.year)
		b.Run(bb.name, func(b *testing.B) {
			start := processTime()
			for range b.N {
				tb.Evaluate(node, cash, c, d, bb.column...)
			}
			b.ReportMetric(float64(processTime()-start)/float64(b.N)/n, "cpu-ns/state")
		})
	}
}
