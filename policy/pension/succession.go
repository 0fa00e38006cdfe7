package pension

import "fmt"

// Then returns the parameter that is p up to the year before the given one, and next
// from that year on: what a reform makes of p. by says which years these are. It is
// an error if p or next is a table by the other kind of year, or has no value in the
// years where they meet.
func (p Parameter) Then(by By, year int, next Parameter) (Parameter, error) {
	before, err := p.rows(by, Always, year-1)
	if err != nil {
		return Parameter{}, err
	}
	after, err := next.rows(by, year, Forever)
	if err != nil {
		return Parameter{}, err
	}
	_, last := p.At(year-1, year-1)
	if _, first := next.At(year, year); !last || !first {
		return Parameter{}, fmt.Errorf("pension: a change in %d takes values for %d and %d", year, year-1, year)
	}
	// Neighbouring rows leave nothing between them to fill, so that steps may stand
	// in a linear table.
	linear := p.Table != nil && p.Table.Linear || next.Table != nil && next.Table.Linear
	return Parameter{Table: &Table{By: by, Linear: linear, Rows: append(before, after...)}}, nil
}

// rows returns the rows of p cut to the years from … to.
func (p Parameter) rows(by By, from, to int) ([]Row, error) {
	if p.Table == nil {
		return []Row{{from, to, p.Constant}}, nil
	}
	if p.Table.By != by {
		return nil, fmt.Errorf("pension: a table by %v cannot change by %v", p.Table.By, by)
	}
	var rows []Row
	for i, r := range p.Table.Rows {
		for _, edge := range []int{from, to} { // of the cut, where it falls between rows
			if i > 0 && edge > p.Table.Rows[i-1].To && edge < r.From {
				v, _ := p.At(edge, edge)
				rows = append(rows, Row{edge, edge, v})
			}
		}
		if cut := (Row{max(r.From, from), min(r.To, to), r.Value}); cut.From <= cut.To {
			rows = append(rows, cut)
		}
	}
	return rows, nil
}
