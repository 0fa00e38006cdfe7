package output

import (
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"sync"
	"sync/atomic"
	"testing"

	"github.com/parquet-go/parquet-go"
)

// benchmarkUnit makes a unit of the usual size: 4096 households from 25 to 100
// at most, rows in order of age, random-walk assets with a mass at zero, no
// taxes, a pension after 65.
func benchmarkUnit() Rows {
	const first, ages = 25, 76
	r := Rows{Households: DefaultUnit}
	rng := rand.New(rand.NewPCG(1, 2))
	var years [DefaultUnit]int32
	var starts [DefaultUnit + 1]int32
	for h := range years {
		years[h] = int32(min(ages, max(1, 62+10*rng.NormFloat64())))
		starts[h+1] = starts[h] + years[h]
	}
	var persistent, assets [DefaultUnit]float64
	for t := range int32(ages) {
		for group := range 3 {
			from := r.N
			for h := group; h < DefaultUnit; h += 3 {
				if t >= years[h] {
					continue
				}
				if t < 40 {
					persistent[h] = float64(rng.IntN(7)-3) * 0.4
				}
				shock := 0.2 * rng.NormFloat64()
				earnings, pension := 25000*math.Exp(persistent[h]+shock), 0.0
				if t >= 40 {
					earnings, pension, shock = 0, 3000+10000*math.Exp(persistent[h]), 0
				}
				cash := 1.03*assets[h] + earnings + pension
				assets[h] = max(0, cash-22000*math.Exp(0.1*persistent[h]))
				r.Position = append(r.Position, starts[h]+t)
				r.Household = append(r.Household, int64(h))
				r.Persistent = append(r.Persistent, persistent[h])
				r.Transitory = append(r.Transitory, shock)
				r.Employed = append(r.Employed, rng.IntN(25) > 0)
				r.Earnings = append(r.Earnings, earnings)
				r.Pension = append(r.Pension, pension)
				r.Taxes = append(r.Taxes, 0)
				r.Income = append(r.Income, earnings+pension)
				r.CashOnHand = append(r.CashOnHand, cash)
				r.Consumption = append(r.Consumption, cash-assets[h])
				r.Assets = append(r.Assets, assets[h])
				r.Died = append(r.Died, t == years[h]-1)
				r.N++
			}
			r.Spans = append(r.Spans, Span{Age: first + t, Group: group, From: from, To: r.N})
		}
	}
	return r
}

// BenchmarkPanelEncode measures the panel writer, checks, ordering, encoding,
// compression and commit to memory that is thrown away, against columns=alone:
// the same columns, already in order, unchecked.
func BenchmarkPanelEncode(b *testing.B) {
	rows := benchmarkUnit()
	for _, workers := range []int{1, 2} {
		for _, precision := range []Precision{Double, Single} {
			b.Run(fmt.Sprintf("columns=panel/precision=%v/workers=%d", precision, workers), func(b *testing.B) {
				benchmarkGroups(b, rows, precision, workers, (*encoder).encode)
			})
		}
		b.Run(fmt.Sprintf("columns=alone/precision=double/workers=%d", workers), func(b *testing.B) {
			benchmarkGroups(b, rows.inOrder(), Double, workers, encodeAlone)
		})
	}
}

// benchmarkGroups encodes b.N units on the workers and commits each.
func benchmarkGroups(b *testing.B, rows Rows, precision Precision, workers int, encode func(*encoder, *parquet.ConcurrentRowGroupWriter, *Rows) error) {
	o := PanelOptions{To: DefaultUnit, Unit: DefaultUnit, Block: DefaultUnit, Precision: precision,
		Groups: []string{"dockers", "clerks", "pilots"}, Currency: "crown", Workers: workers}
	format, err := newPanelFormat(o)
	if err != nil {
		b.Fatal(err)
	}
	var written counter
	pw := parquet.NewGenericWriter[any](&written, format.options...)
	var next atomic.Int64
	var commit sync.Mutex
	var wg sync.WaitGroup
	b.ReportAllocs()
	b.ResetTimer()
	for range workers {
		g := pw.BeginRowGroup()
		wg.Go(func() {
			e := newEncoder(format)
			for next.Add(1) <= int64(b.N) {
				err := encode(e, g, &rows)
				commit.Lock()
				_, err2 := g.Commit()
				commit.Unlock()
				if err := errors.Join(err, err2); err != nil {
					b.Error(err)
				}
			}
		})
	}
	wg.Wait()
	n := float64(b.N) * float64(rows.N)
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/n, "ns/row")
	b.ReportMetric(float64(written)/n, "B/row")
}

type counter int64

func (c *counter) Write(p []byte) (int, error) { *c += counter(len(p)); return io.Discard.Write(p) }

// inOrder returns the rows sorted by household and age, Position the identity.
func (r *Rows) inOrder() Rows {
	s := Rows{First: r.First, Households: r.Households, N: r.N, Household: scatter(r, r.Household), Employed: scatter(r, r.Employed), Died: scatter(r, r.Died),
		Persistent: scatter(r, r.Persistent), Transitory: scatter(r, r.Transitory), Earnings: scatter(r, r.Earnings),
		Pension: scatter(r, r.Pension), Taxes: scatter(r, r.Taxes), Income: scatter(r, r.Income),
		CashOnHand: scatter(r, r.CashOnHand), Consumption: scatter(r, r.Consumption), Assets: scatter(r, r.Assets)}
	s.Position = make([]int32, r.N) // here: age
	for _, span := range r.Spans {
		for _, pos := range r.Position[span.From:span.To] {
			s.Position[pos] = span.Age
		}
	}
	return s
}

func scatter[T any](r *Rows, c []T) []T {
	s := make([]T, r.N)
	for k, pos := range r.Position {
		s[pos] = c[k]
	}
	return s
}

// encodeAlone is the fastest way known to write columns that are in order: box
// and write, nothing else. Its loops stand in functions of their own because
// the compiler stops inlining the boxing in large ones.
func encodeAlone(e *encoder, g *parquet.ConcurrentRowGroupWriter, r *Rows) error {
	w := g.ColumnWriters()
	err := errors.Join(aloneHouseholds(e, w[0], r), aloneGroups(e, w[1], r), aloneAges(e, w[2], r),
		aloneBools(e, w[5], r.Employed), aloneBools(e, w[13], r.Died))
	for j, column := range [][]float64{3: r.Persistent, 4: r.Transitory, 6: r.Earnings, 7: r.Pension, 8: r.Taxes,
		9: r.Income, 10: r.CashOnHand, 11: r.Consumption, 12: r.Assets} {
		if column != nil {
			err = errors.Join(err, aloneFloats(e, w[j], column))
		}
	}
	return errors.Join(err, g.Flush())
}

//go:noinline
func aloneFloats(e *encoder, c *parquet.ColumnWriter, column []float64) error {
	return e.chunks(c, len(column), func(lo int, part []parquet.Value) {
		for i, v := range column[lo : lo+len(part)] {
			part[i] = parquet.DoubleValue(v)
		}
	})
}

//go:noinline
func aloneBools(e *encoder, c *parquet.ColumnWriter, column []bool) error {
	return e.chunks(c, len(column), func(lo int, part []parquet.Value) {
		for i, v := range column[lo : lo+len(part)] {
			part[i] = parquet.BooleanValue(v)
		}
	})
}

//go:noinline
func aloneHouseholds(e *encoder, c *parquet.ColumnWriter, r *Rows) error {
	return e.chunks(c, r.N, func(lo int, part []parquet.Value) {
		for i, v := range r.Household[lo : lo+len(part)] {
			part[i] = parquet.Int64Value(v)
		}
	})
}

//go:noinline
func aloneGroups(e *encoder, c *parquet.ColumnWriter, r *Rows) error {
	return e.chunks(c, r.N, func(lo int, part []parquet.Value) {
		for i, id := range r.Household[lo : lo+len(part)] {
			part[i] = e.groups[uint32(id)%3]
		}
	})
}

//go:noinline
func aloneAges(e *encoder, c *parquet.ColumnWriter, r *Rows) error {
	return e.chunks(c, r.N, func(lo int, part []parquet.Value) {
		for i, v := range r.Position[lo : lo+len(part)] {
			part[i] = parquet.Int32Value(v)
		}
	})
}
