package survey

import (
	"context"
	"errors"
	"fmt"
	"math"

	"cistern/output"
	"cistern/output/distribution"
)

// Describe returns the tidy table of the files: a row a combination of the columns
// told apart, variable and statistic, with the columns
//
//	(the columns told apart), variable, statistic, level, estimate, standard_error, lower, upper, rows
//
// Rows that take all values of a column together have "all" there, or nothing where
// it holds numbers. Statistics are those of [distribution.Result.Figures], and
// share_nonpositive.
func Describe(ctx context.Context, o Options) (*output.Table, error) {
	o.Workers = max(1, o.Workers)
	if err := errors.Join(o.names(), o.Levels()); err != nil {
		return nil, err
	}
	l, err := examine(&o)
	if err != nil {
		return nil, err
	}
	if l.rows == 0 {
		return nil, errNothing
	}
	c, err := l.findCells(ctx)
	if err != nil {
		return nil, err
	}
	targets, keys, masks := l.targets(c)
	study, err := distribution.NewStudy(l.study(c, targets, masks))
	if err != nil {
		return nil, err
	}
	gone := make([]int64, len(l.variables))
	for more := true; more; {
		stage := fmt.Sprintf("pass %d", study.Passes())
		first := study.Passes() == 1
		err := l.sweep(ctx, stage, func(worker, k int, g rowGroup, r *reader) (func() error, error) {
			rows, missing, left, err := l.load(c, k, g, r)
			if err != nil {
				return nil, err
			}
			commit, err := study.Add(worker, rows)
			if err != nil {
				return nil, err
			}
			return func() error {
				if first {
					c.left += left
					for i, n := range missing {
						gone[i] += n
					}
				}
				if commit != nil {
					return commit()
				}
				return nil
			}, nil
		})
		if err != nil {
			return nil, err
		}
		if more, err = study.EndPass(); err != nil {
			return nil, err
		}
	}
	return l.table(study, c, targets, keys, gone), nil
}

// targets lists every combination of values, and every one in which some columns
// are taken together. keys says which value of each column a target has, nil where
// all are taken together, and masks the same as bits.
func (l *layout) targets(c *cells) (targets [][]distribution.Cell, keys [][]*value, masks []int) {
	for together := 0; together < 1<<len(l.o.By); together++ {
		at := map[string]int{}
		for cell, values := range c.list {
			key := make([]*value, len(values))
			id := fmt.Sprint(together)
			for i := range values {
				if together>>i&1 == 0 {
					key[i] = &values[i]
					id += fmt.Sprintf("\x00%d\x00%s", values[i].number, values[i].text)
				}
			}
			k, known := at[id]
			if !known {
				k = len(targets)
				at[id] = k
				targets, keys, masks = append(targets, nil), append(keys, key), append(masks, together)
			}
			targets[k] = append(targets[k], distribution.Cell{Index: cell, Weight: 1})
		}
	}
	return targets, keys, masks
}

// study is what the engine is asked.
func (l *layout) study(c *cells, targets [][]distribution.Cell, masks []int) distribution.Options {
	o := distribution.Options{Cells: len(c.list), Percentiles: l.o.Percentiles, Lorenz: l.o.Lorenz, TopShares: l.o.TopShares, Shortfalls: l.o.Shortfalls,
		Rows: l.rows, Weighted: l.o.Weight != "", Workers: l.o.Workers, Budget: l.o.Budget}
	if l.o.Tail > 0 {
		o.Tails = []float64{l.o.Tail}
	}
	wants := distribution.Percentiles | distribution.Gini
	if len(l.o.Lorenz)+len(l.o.TopShares) > 0 {
		wants |= distribution.Concentration
	}
	if len(l.o.Shortfalls) > 0 {
		wants |= distribution.Shortfall
	}
	if l.o.Tail > 0 {
		wants |= distribution.Tail
	}
	every := make([]distribution.Set, len(l.variables))
	for i, name := range l.variables {
		o.Variables = append(o.Variables, distribution.Variable{Name: name, Optional: l.optional[i], Held: true, Shares: []distribution.Threshold{{Value: 0}}})
		every[i] = wants
	}
	for i, t := range targets {
		independent := l.o.Weight == "" && c.alone[masks[i]]
		o.Targets = append(o.Targets, distribution.Target{Cells: t, Wants: every, Independent: independent})
	}
	return o
}

// load reads a row group, its rows ordered by cell.
func (l *layout) load(c *cells, k int, g rowGroup, r *reader) (rows *distribution.Rows, missing []int64, left int64, err error) {
	order, spans, left, err := l.arrange(c, g, r)
	if err != nil {
		return nil, nil, 0, err
	}
	n := len(order)
	rows = &distribution.Rows{First: int64(k), N: n, Spans: spans, Unit: make([]int64, n), Values: make([][]float64, len(l.variables))}
	missing = make([]int64, len(l.variables))
	for i, name := range l.variables {
		if rows.Values[i], missing[i], err = l.values(g, r, name, order, l.optional[i]); err != nil {
			return nil, nil, 0, err
		}
	}
	if l.o.Weight != "" {
		if rows.Weight, _, err = l.values(g, r, l.o.Weight, order, false); err != nil {
			return nil, nil, 0, err
		}
		for i, w := range rows.Weight {
			if w < 0 {
				return nil, nil, 0, &ValueError{l.o.Files[g.file], l.o.Weight, g.before + int64(order[i]) + 1, "is negative"}
			}
		}
	}
	if l.o.Unit == "" {
		for i := range rows.Unit {
			rows.Unit[i] = g.before + int64(order[i])
		}
		return rows, missing, left, nil
	}
	unit, err := r.column(g, l.o.Unit)
	if err != nil {
		return nil, nil, 0, err
	}
	for i, at := range order {
		if unit.IsMissing(int(at)) {
			return nil, nil, 0, &ValueError{l.o.Files[g.file], l.o.Unit, g.before + int64(at) + 1, "has no value"}
		}
		rows.Unit[i] = unitOf(unit, int(at))
	}
	return rows, missing, left, nil
}

// arrange orders the rows of a row group by cell, those of one cell as they come.
func (l *layout) arrange(c *cells, g rowGroup, r *reader) (order []int32, spans []distribution.Span, left int64, err error) {
	places, err := l.placesOf(c, g, r)
	if err != nil {
		return nil, nil, 0, err
	}
	counts := make([]int, len(c.list)+1)
	for _, p := range places {
		counts[p+1]++
	}
	left = int64(counts[0])
	at := 0
	starts := make([]int, len(c.list))
	for cell := range c.list {
		starts[cell] = at
		if n := counts[cell+1]; n > 0 {
			spans = append(spans, distribution.Span{Cell: cell, From: at, To: at + n})
			at += n
		}
	}
	order = make([]int32, at)
	for k, p := range places {
		if p >= 0 {
			order[starts[p]] = int32(k)
			starts[p]++
		}
	}
	return order, spans, left, nil
}

// placesOf returns the cell of every row, −1 where a value is missing.
func (l *layout) placesOf(c *cells, g rowGroup, r *reader) ([]int32, error) {
	out := make([]int32, g.rows)
	if len(l.o.By) == 0 {
		return out, nil
	}
	codes, err := l.combinations(g, r, func(i int, _ output.Kind, v value) (int32, error) { return c.codes[i][v], nil })
	if err != nil {
		return nil, err
	}
	for k, p := range codes {
		switch {
		case p == none:
			out[k] = -1
		case k > 0 && p == codes[k-1]:
			out[k] = out[k-1]
		default:
			out[k] = int32(c.index[p])
		}
	}
	return out, nil
}

// values reads a column of numbers in the order of cells; NaN stands for no value
// where that is allowed.
func (l *layout) values(g rowGroup, r *reader, name string, order []int32, optional bool) (x []float64, missing int64, err error) {
	c, err := r.column(g, name)
	if err != nil {
		return nil, 0, err
	}
	x = make([]float64, len(order))
	if c.Kind == output.Float {
		for i, at := range order {
			x[i] = c.Floats[at]
		}
	} else {
		for i, at := range order {
			x[i] = float64(c.Ints[at])
		}
	}
	bad := func(at int32, problem string) error {
		return &ValueError{l.o.Files[g.file], name, g.before + int64(at) + 1, problem}
	}
	for i, at := range order {
		switch {
		case c.IsMissing(int(at)):
			if !optional {
				return nil, 0, bad(at, "has no value")
			}
			x[i] = math.NaN()
			missing++
		case x[i]-x[i] != 0:
			return nil, 0, bad(at, fmt.Sprintf("is %v", x[i]))
		}
	}
	return x, missing, nil
}
