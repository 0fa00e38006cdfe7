package interop

import (
	"math"
	"slices"
	"testing"

	"cistern/output"
	"cistern/output/stats"
)

// TestPercentiles compares percentiles of assets at every age: quantile_cont
// interpolates as type 7 of Hyndman and Fan (1996) does, quantile_disc returns
// an observation as type 1 does.
func TestPercentiles(t *testing.T) {
	rows := generate()
	glob := writePanel(t, rows, output.Double)
	db := open(t)
	assets := map[int32][]float64{}
	for _, r := range rows {
		assets[r.age] = append(assets[r.age], r.numbers[8])
	}
	compared := 0
	for _, p := range []float64{0.01, 0.05, 0.1, 0.25, 0.5, 0.75, 0.9, 0.95, 0.99} {
		got := query(t, db, `SELECT age, count(*), quantile_cont(assets, ?), quantile_disc(assets, ?)
			FROM read_parquet(?) GROUP BY age ORDER BY age`, p, p, glob)
		for got.Next() {
			var age int32
			var n int
			var interpolated, observed float64
			if err := got.Scan(&age, &n, &interpolated, &observed); err != nil {
				t.Fatal(err)
			}
			sorted := assets[age]
			slices.Sort(sorted)
			if n != len(sorted) {
				t.Fatalf("age %d: %d rows, want %d", age, n, len(sorted))
			}
			if want := stats.Quantile(sorted, p, stats.Type1); observed != want {
				t.Errorf("age %d, p = %v: quantile_disc is %v, type 1 is %v", age, p, observed, want)
			}
			// Two orders of the same interpolation differ by rounding only.
			if want := stats.Quantile(sorted, p, stats.Type7); math.Abs(interpolated-want) > 1e-13*math.Abs(want) {
				t.Errorf("age %d, p = %v: quantile_cont is %v, type 7 is %v", age, p, interpolated, want)
			}
			compared++
		}
		if err := got.Err(); err != nil {
			t.Fatal(err)
		}
	}
	if want := 9 * len(assets); compared != want || len(assets) != 40 {
		t.Errorf("%d percentiles compared, want %d at 40 ages", compared, want)
	}
}
