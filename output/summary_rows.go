package output

import (
	"fmt"

	"cistern/output/distribution"
)

// SummaryRows are the rows of one block of households, all their years alive,
// as for [Rows]: spans of constant age and group adjoin from 0 to N, and every
// column has N entries or more. Add keeps no reference.
type SummaryRows struct {
	First     int64 // id of the first household of the block
	N         int
	Spans     []Span
	Household []int64

	Income, Consumption, Assets []float64 // money
	Propensity                  []float64 // marginal propensity to consume; nil: left out
	AtLimit                     []bool    // borrowing limit binds; nil: left out
	TwinAssets                  []float64 // money, assets of the certain twin; nil: left out
	LastConsumption             []float64 // money, of last year; NaN in a household's first year; nil: left out
	JobLost                     []bool    // earnings are lost this year; nil, or without LastConsumption: left out
}

// check reports rows that do not fit the options.
func (s *Summary) check(r *SummaryRows) error {
	bad := func(format string, a ...any) error {
		return fmt.Errorf("output: summary: block of household %d: "+format, append([]any{r.First}, a...)...)
	}
	if len(r.Household) < r.N {
		return bad("column household has %d rows, want %d", len(r.Household), r.N)
	}
	for i := range summaryVariables {
		v := &summaryVariables[i]
		if n := v.source(r); n < r.N && (v.required || n > 0) {
			return bad("column %s has %d rows, want %d", v.key, n, r.N)
		}
	}
	at := 0
	for _, sp := range r.Spans {
		if sp.From != at || sp.To < sp.From || sp.To > r.N {
			return bad("span of rows %d to %d follows row %d of %d", sp.From, sp.To, at, r.N)
		}
		if int(sp.Age) < s.o.FirstAge || int(sp.Age) > s.o.LastAge || sp.Group < 0 || sp.Group >= len(s.o.Groups) {
			return bad("age %d of group %d, want ages %d to %d and %d groups", sp.Age, sp.Group, s.o.FirstAge, s.o.LastAge, len(s.o.Groups))
		}
		at = sp.To
	}
	if at != r.N {
		return bad("spans cover %d rows of %d", at, r.N)
	}
	if r.N == 0 {
		return nil
	}
	return s.settle(r, bad)
}

// settle makes the study of the variables of the first block, and reports a block
// whose variables differ from those.
func (s *Summary) settle(r *SummaryRows, bad func(string, ...any) error) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.study != nil {
		at := 0
		for i := range summaryVariables {
			known := at < len(s.variables) && s.variables[at].key == summaryVariables[i].key
			if known {
				at++
			}
			if there := summaryVariables[i].source(r) > 0; there != known {
				return bad("column %s is there in some blocks only", summaryVariables[i].key)
			}
		}
		return nil
	}
	for i := range summaryVariables {
		if v := summaryVariables[i]; v.required || v.source(r) > 0 {
			s.variables = append(s.variables, v)
		}
	}
	return s.newStudy()
}

// workspace holds the rows of a block as a study reads them; its slices are reused.
type workspace struct {
	rows distribution.Rows
	made [][]float64 // [variable]
}

// translate returns the rows as the study reads them.
func (s *Summary) translate(w *workspace, r *SummaryRows) *distribution.Rows {
	d := &w.rows
	d.First, d.N, d.Unit = r.First, r.N, r.Household
	d.Spans = d.Spans[:0]
	for _, sp := range r.Spans {
		d.Spans = append(d.Spans, distribution.Span{Cell: (int(sp.Age)-s.o.FirstAge)*len(s.o.Groups) + sp.Group, From: sp.From, To: sp.To})
	}
	if d.Values == nil {
		d.Values, w.made = make([][]float64, len(s.variables)), make([][]float64, len(s.variables))
	}
	for i := range s.variables {
		v := &s.variables[i]
		if !v.made() {
			d.Values[i] = v.column(r)
			continue
		}
		if cap(w.made[i]) < r.N {
			w.made[i] = make([]float64, r.N)
		}
		w.made[i] = w.made[i][:r.N]
		if s.study.Passes() == 1 || v.wants != 0 { // a later pass reads distributions only
			v.make(r, w.made[i])
		}
		d.Values[i] = w.made[i]
	}
	return d
}
