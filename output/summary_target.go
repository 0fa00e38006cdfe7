package output

import (
	"fmt"
	"slices"
)

// The variables whose distribution a summary describes.
const (
	income = iota
	consumption
	assets
	variables
)

var variableNames = [variables]string{"income", "consumption", "assets"}

// target is a set of cells that is described as one: an age, a band or all ages,
// of one group or of all.
type target struct {
	first, last int // ages
	group       int // index, −1 for everybody
	band        int // index into Bands, −1 for a row of the table
	cells       []int
}

// newTargets lists what the table needs, groups before everybody and ages
// ascending, then the bands in the same order.
func newTargets(o SummaryOptions) []target {
	groups := []int{-1}
	if slices.Contains(o.By, ByGroup) {
		groups = append(seq(len(o.Groups)), -1)
	}
	var list []target
	for _, g := range groups {
		if slices.Contains(o.By, ByAge) {
			for a := o.FirstAge; a <= o.LastAge; a++ {
				list = append(list, newTarget(o, a, a, g, -1))
			}
		} else {
			list = append(list, newTarget(o, o.FirstAge, o.LastAge, g, -1))
		}
	}
	for _, g := range append(seq(len(o.Groups)), -1) {
		for i, b := range o.Bands {
			list = append(list, newTarget(o, b.First, b.Last, g, i))
		}
	}
	return list
}

func newTarget(o SummaryOptions, first, last, group, band int) target {
	t := target{first: first, last: last, group: group, band: band}
	for a := first; a <= last; a++ {
		for g := range o.Groups {
			if group < 0 || group == g {
				t.cells = append(t.cells, (a-o.FirstAge)*len(o.Groups)+g)
			}
		}
	}
	return t
}

// independent reports whether the rows of the target are independent, one a
// household.
func (t *target) independent() bool { return t.first == t.last }

// percentiles returns what the target needs of a variable: the table all that
// was asked for, a band the median of assets.
func (t *target) percentiles(o *SummaryOptions, variable int) []float64 {
	switch {
	case t.band < 0:
		return o.Percentiles
	case variable == assets:
		return []float64{50}
	}
	return nil
}

// wantsGini reports whether the target needs Gini coefficients.
func (t *target) wantsGini() bool { return t.band < 0 }

func seq(n int) []int {
	s := make([]int, n)
	for i := range s {
		s[i] = i
	}
	return s
}

// check reports rows that do not fit the options.
func (s *Summary) check(r *SummaryRows) error {
	bad := func(format string, a ...any) error {
		return fmt.Errorf("output: summary: block of household %d: "+format, append([]any{r.First}, a...)...)
	}
	for _, c := range []struct {
		name     string
		n        int
		optional bool
	}{
		{"household", len(r.Household), false}, {"income", len(r.Income), false},
		{"consumption", len(r.Consumption), false}, {"assets", len(r.Assets), false},
		{"propensity", len(r.Propensity), true}, {"at_limit", len(r.AtLimit), true}, {"twin_assets", len(r.TwinAssets), true},
	} {
		if c.n < r.N && !(c.optional && c.n == 0) {
			return bad("column %s has %d rows, want %d", c.name, c.n, r.N)
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
	return s.checkColumns(r, bad)
}

// checkColumns reports a block whose optional columns differ from those before.
func (s *Summary) checkColumns(r *SummaryRows, bad func(string, ...any) error) error {
	if r.N == 0 {
		return nil
	}
	has := columns{len(r.Propensity) > 0, len(r.AtLimit) > 0, len(r.TwinAssets) > 0, true}
	s.mu.Lock()
	defer s.mu.Unlock()
	if !s.seen.known {
		s.seen = has
	}
	if has != s.seen && s.pass == 1 {
		return bad("propensity, at_limit or twin_assets is there in some blocks only")
	}
	return nil
}
