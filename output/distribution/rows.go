package distribution

import (
	"fmt"
	"math"
)

// Rows are a block of rows. Blocks are numbered by First; Add keeps no reference.
type Rows struct {
	First  int64       // place of the block in the order of blocks
	N      int         // rows
	Spans  []Span      // stretches of one cell, adjoining from 0 to N
	Unit   []int64     // [row]
	Values [][]float64 // [variable][row]
	Weight []float64   // [row] at least 0 and finite, 0: the row is not there; nil unless Options.Weighted
}

// Span says that the rows From ≤ k < To are of one cell.
type Span struct{ Cell, From, To int }

// check reports rows that do not fit the options.
func (s *Study) check(r *Rows) error {
	bad := func(format string, a ...any) error {
		return fmt.Errorf("distribution: block %d: "+format, append([]any{r.First}, a...)...)
	}
	if len(r.Unit) < r.N || len(r.Values) != len(s.o.Variables) {
		return bad("%d units and %d variables, want %d and %d", len(r.Unit), len(r.Values), r.N, len(s.o.Variables))
	}
	for v, column := range r.Values {
		if len(column) < r.N {
			return bad("column %s has %d rows, want %d", s.o.Variables[v].Name, len(column), r.N)
		}
	}
	if s.o.Weighted && len(r.Weight) < r.N || !s.o.Weighted && r.Weight != nil {
		return bad("%d weights for %d rows", len(r.Weight), r.N)
	}
	for k, w := range r.Weight[:min(r.N, len(r.Weight))] {
		if !(w >= 0 && w <= math.MaxFloat64) {
			return bad("row %d weighs %v, want at least 0", k, w)
		}
	}
	at := 0
	for _, sp := range r.Spans {
		if sp.From != at || sp.To < sp.From || sp.To > r.N {
			return bad("span of rows %d to %d follows row %d of %d", sp.From, sp.To, at, r.N)
		}
		if sp.Cell < 0 || sp.Cell >= s.o.Cells {
			return bad("cell %d of %d", sp.Cell, s.o.Cells)
		}
		at = sp.To
	}
	if at != r.N {
		return bad("spans cover %d rows of %d", at, r.N)
	}
	return nil
}
