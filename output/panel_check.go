package output

import "fmt"

// check reports rows that do not fit the panel. The Parquet library would take
// them and write a broken file.
func (r *Rows) check(o *PanelOptions) error {
	bad := func(format string, a ...any) error {
		return fmt.Errorf("output: panel: unit from household %d: "+format, append([]any{r.First}, a...)...)
	}
	if r.First < o.From || r.First >= o.To || (r.First-o.From)%int64(o.Unit) != 0 {
		return bad("want a start at a multiple of %d between %d and %d", o.Unit, o.From, o.To)
	}
	if want := min(int64(o.Unit), o.To-r.First); int64(r.Households) != want {
		return bad("%d households, want %d", r.Households, want)
	}
	for _, c := range []struct {
		name string
		n    int
	}{
		{"position", len(r.Position)}, {"household", len(r.Household)},
		{"persistent", len(r.Persistent)}, {"transitory", len(r.Transitory)}, {"employed", len(r.Employed)},
		{"earnings", len(r.Earnings)}, {"pension", len(r.Pension)}, {"taxes", len(r.Taxes)}, {"income", len(r.Income)},
		{"cash_on_hand", len(r.CashOnHand)}, {"consumption", len(r.Consumption)}, {"assets", len(r.Assets)},
		{"died", len(r.Died)},
	} {
		if c.n < r.N {
			return bad("column %s has %d rows, want %d", c.name, c.n, r.N)
		}
	}
	if r.N < r.Households {
		return bad("%d rows, want at least one a household", r.N)
	}
	at := 0
	for _, s := range r.Spans {
		if s.From != at || s.To < s.From || s.To > r.N {
			return bad("span of rows %d to %d follows row %d of %d", s.From, s.To, at, r.N)
		}
		if s.Group < 0 || s.Group >= len(o.Groups) {
			return bad("group %d of %d", s.Group, len(o.Groups))
		}
		at = s.To
	}
	if at != r.N {
		return bad("spans cover %d rows of %d", at, r.N)
	}
	return nil
}
