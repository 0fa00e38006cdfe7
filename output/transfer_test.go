package output

import (
	"math"
	"testing"
)

// experiment invents receipts: 64 households, one a jackknife group, receive in
// every cell; two bands, two groups, five classes.
func experiment(amount float64) *Transfer {
	t := &Transfer{Amount: amount, Bands: []Band{{25, 34}, {35, 44}}, Groups: []string{"dockers", "clerks"}, Classes: 5, Years: 1}
	for cell := range 20 {
		s := TransferSums{Consumed: make([][64]float64, 2), Kept: make([][64]float64, 2), Receipts: 64}
		for g := range 64 {
			s.Weight[g] = 1
			s.Income[g] = 300 + float64(g%7)
			s.Propensity[g] = 0.3 + 0.01*float64(g%5)
			s.Consumed[0][g] = amount * (0.4 + 0.01*float64(g%3) + 0.001*float64(cell))
			s.Consumed[1][g] = amount * 0.1
			s.Kept[0][g] = amount - s.Consumed[0][g]
			s.Kept[1][g] = amount * 0.5
		}
		if amount < 0 && cell == 0 {
			s.Unable[3] = 16
		}
		t.Cells = append(t.Cells, s)
	}
	return t
}

// moments returns the mean of f over 64 households and its standard error, s/√n.
func moments(f func(g int) float64) (mean, se float64) {
	for g := range 64 {
		mean += f(g) / 64
	}
	for g := range 64 {
		se += (f(g) - mean) * (f(g) - mean) / 63
	}
	return mean, math.Sqrt(se / 64)
}

// With one receipt a jackknife group the errors are the textbook's s/√n (derived),
// and that of a ratio's inverse the delta method's to first order.
func TestTransferResponse(t *testing.T) {
	x := experiment(1000)
	near := func(what string, got, want, tolerance float64) {
		t.Helper()
		if math.Abs(got-want) > tolerance {
			t.Errorf("%s: %.12g, want %.12g", what, got, want)
		}
	}
	r := x.Response(1, 0, 2) // cell (1·2 + 0)·5 + 2
	mean, se := moments(func(g int) float64 { return 0.4 + 0.01*float64(g%3) + 0.012 })
	near("consumed", r.Consumed[0].Value, mean, 1e-12)
	near("its error", r.Consumed[0].StandardError, se, 1e-12)
	near("its interval, Student's t on 63 degrees (published: tables, 1.9983)", r.Consumed[0].Upper-mean, 1.9983*se, 1e-4*se)
	near("to date", r.Cumulated[1].Value, mean+0.1, 1e-12)
	near("its error", r.Cumulated[1].StandardError, se, 1e-12)
	near("held", r.Held[0].Value, 1-mean, 1e-12)
	near("held later", r.Held[1].Value, 0.5, 1e-12)
	near("no error where all do the same", r.Consumed[1].StandardError, 0, 1e-15)
	mean, se = moments(func(g int) float64 { return 0.3 + 0.01*float64(g%5) })
	near("propensity", r.Propensity.Value, mean, 1e-12)
	near("its error", r.Propensity.StandardError, se, 1e-12)
	mean, se = moments(func(g int) float64 { return 300 + float64(g%7) })
	near("amount over income", r.OfIncome.Value, 1000/mean, 1e-12)
	near("its error", r.OfIncome.StandardError, 1000/mean/mean*se, 1e-3*1000/mean/mean*se)
	if r.Receipts != 64 || r.Unable.Value != 0 {
		t.Errorf("%d receipts, %v unable", r.Receipts, r.Unable)
	}
	for _, tt := range []struct {
		band, group, class int
		receipts           int64
		cells              float64 // mean number of the cell
	}{{-1, -1, -1, 20 * 64, 9.5}, {0, -1, -1, 10 * 64, 4.5}, {-1, 1, -1, 10 * 64, 12}, {-1, -1, 4, 4 * 64, 11.5}, {1, 1, -1, 5 * 64, 17}} {
		r := x.Response(tt.band, tt.group, tt.class)
		mean, _ := moments(func(g int) float64 { return 0.4 + 0.01*float64(g%3) + 0.001*tt.cells })
		near("pooled", r.Consumed[0].Value, mean, 1e-12)
		if r.Receipts != tt.receipts {
			t.Errorf("band %d, group %d, class %d: %d receipts, want %d", tt.band, tt.group, tt.class, r.Receipts, tt.receipts)
		}
	}
}

// Of a bill the share that cannot pay is among all who were asked; a household that
// earns nothing has no share of income.
func TestBillResponse(t *testing.T) {
	x := experiment(-1000)
	r := x.Response(0, 0, 0)
	if want := 16.0 / 80; math.Abs(r.Unable.Value-want) > 1e-15 || !(r.Unable.Lower < want && r.Unable.Upper > want && r.Unable.Lower >= 0) {
		t.Errorf("unable %+v, want %g", r.Unable, want)
	}
	if math.Abs(r.OfIncome.Value-(-1000.0/302.9)) > 0.02 || math.Abs(r.Held[1].Value-0.5) > 1e-12 {
		t.Errorf("a bill is %v of income, held %v", r.OfIncome.Value, r.Held[1].Value)
	}
	x.Cells[1].Income = [64]float64{}
	if r := x.Response(0, 0, 1); !math.IsNaN(r.OfIncome.Value) {
		t.Errorf("the bill is %v of no income", r.OfIncome.Value)
	}
}

func TestTransferTable(t *testing.T) {
	const kinds = 2 + 3*2 // figures at receipt; figures for two years
	for _, tt := range []struct {
		amount float64
		rows   int
	}{{1000, 3 * 3 * 6 * kinds}, {-1000, 3 * 3 * 6 * (kinds + 1)}} {
		table := experiment(tt.amount).Table()
		if err := table.Validate(); err != nil {
			t.Fatal(err)
		}
		if table.Len() != tt.rows {
			t.Errorf("%d rows, want %d", table.Len(), tt.rows)
		}
		last := table.Len() - 1
		if g := table.Column("group"); g.Strings[0] != "dockers" || g.Strings[last] != Everyone {
			t.Errorf("groups from %s to %s", g.Strings[0], g.Strings[last])
		}
		for _, name := range []string{"first_age", "last_age", "wealth_fifth"} {
			if c := table.Column(name); c.IsMissing(0) || !c.IsMissing(last) || c.Ints[0] != map[string]int64{"first_age": 25, "last_age": 34, "wealth_fifth": 1}[name] {
				t.Errorf("column %s begins with %d and ends without a value: %v", name, c.Ints[0], c.IsMissing(last))
			}
		}
		if table.Column("years_since").Ints[last] != 1 || table.Column("statistic").Strings[last] != "share_of_transfer" || table.Column("variable").Strings[last] != "assets" {
			t.Error("the last row is not the assets of the last year")
		}
	}
	empty := experiment(1000)
	for i := range empty.Cells {
		if i%5 == 4 {
			empty.Cells[i] = TransferSums{Consumed: make([][64]float64, 2), Kept: make([][64]float64, 2)}
		}
	}
	if got, want := empty.Table().Len(), 3*3*5*kinds; got != want {
		t.Errorf("%d rows with an empty fifth, want %d", got, want)
	}
}
