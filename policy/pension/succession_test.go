package pension_test

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"cistern/policy/pension"
)

// drawParameter draws a constant or a table by calendar year.
func drawParameter(t *rapid.T, name string) pension.Parameter {
	if rapid.Bool().Draw(t, name+" constant") {
		return constant(rapid.Float64Range(0, 1).Draw(t, name))
	}
	table := &pension.Table{Linear: rapid.Bool().Draw(t, name+" linear")}
	from := rapid.SampledFrom([]int{pension.Always, 1990, 2000}).Draw(t, name+" from")
	end := max(from, 1995)
	for i := range rapid.IntRange(1, 4).Draw(t, name+" rows") {
		to := end + rapid.IntRange(0, 8).Draw(t, "length")
		if i > 0 {
			from = end + 1
			if table.Linear {
				from += rapid.IntRange(0, 8).Draw(t, "ramp")
			}
			to = from + rapid.IntRange(0, 8).Draw(t, "length")
		}
		table.Rows = append(table.Rows, pension.Row{From: from, To: to, Value: rapid.Float64Range(0, 1).Draw(t, "value")})
		end = to
	}
	if rapid.Bool().Draw(t, name+" for ever") {
		table.Rows[len(table.Rows)-1].To = pension.Forever
	}
	return pension.Parameter{Table: table}
}

// A reform changes nothing before it and everything from it on, and leaves a table
// that can be.
func TestThen(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		before, after := drawParameter(t, "before"), drawParameter(t, "after")
		year := rapid.IntRange(1985, 2060).Draw(t, "year")
		p, err := before.Then(pension.CalendarYear, year, after)
		_, last := before.At(0, year-1)
		if _, first := after.At(0, year); !last || !first {
			if err == nil {
				t.Fatalf("a reform in %d with no value on one side of it", year)
			}
			return
		}
		if err != nil {
			t.Fatal(err)
		}
		for y := 1980; y < 2070; y++ {
			want, there := before.At(0, y)
			if y >= year {
				want, there = after.At(0, y)
			}
			got, ok := p.At(0, y)
			if ok != there || math.Abs(got-want) > 1e-15 {
				t.Fatalf("reform in %d: %v (%v) in %d, want %v (%v); table %+v", year, got, ok, y, want, there, *p.Table)
			}
		}
	})
	rate, err := constant(65).Then(pension.BirthYear, 1965, constant(67))
	if err != nil {
		t.Fatal(err)
	}
	for birth, want := range map[int]float64{1900: 65, 1964: 65, 1965: 67, 2020: 67} {
		got, _ := rate.At(birth, 2000)
		near(t, "claim age", got, want, 0)
	}
	if _, err := rate.Then(pension.CalendarYear, 2030, constant(68)); err == nil {
		t.Error("a table by birth year that changes by calendar year")
	}
	if _, err := constant(68).Then(pension.CalendarYear, 2030, rate); err == nil {
		t.Error("a constant that a table by birth year follows by calendar year")
	}
}
