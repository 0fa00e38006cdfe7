package survey

import (
	"cmp"
	"context"
	"fmt"
	"hash/fnv"
	"slices"
	"sync"

	"cistern/output"
)

// value is a value of a column that is told apart: text, or a whole number.
type value struct {
	text   string
	number int64
}

func compare(a, b []value) int {
	for i := range a {
		if c := cmp.Or(cmp.Compare(a[i].number, b[i].number), cmp.Compare(a[i].text, b[i].text)); c != 0 {
			return c
		}
	}
	return 0
}

// cells are the combinations of values that occur.
type cells struct {
	kinds  []output.Kind // [column]
	codes  []map[value]int32
	values [][]value         // [column][code]
	found  map[[4]int32]bool // combinations of codes while they are collected
	index  map[[4]int32]int  // cell by combination
	list   [][]value         // [cell]
	left   int64             // rows without a value in one of the columns

	// alone says, for the columns that are taken together as bits, whether no unit
	// has two rows in what is left: as far as an ascending order of units tells.
	alone [1 << mostColumns]bool
}

// mostColumns is how many columns may be told apart.
const mostColumns = 4

// findCells reads the columns that are told apart, and the units.
func (l *layout) findCells(ctx context.Context) (*cells, error) {
	c := &cells{codes: make([]map[value]int32, len(l.o.By)), values: make([][]value, len(l.o.By)), kinds: make([]output.Kind, len(l.o.By)),
		found: map[[4]int32]bool{}}
	for together := range 1 << len(l.o.By) {
		c.alone[together] = true
	}
	for i := range c.codes {
		c.codes[i] = map[value]int32{}
	}
	if len(l.o.By) == 0 && l.o.Unit == "" {
		c.found[[4]int32{}] = true
		return c.settle(), nil
	}
	var mu sync.Mutex
	var last int64
	any := false
	err := l.sweep(ctx, "reading", func(_, _ int, g rowGroup, r *reader) (func() error, error) {
		places, err := l.places(g, r, c, &mu)
		if err != nil {
			return nil, err
		}
		first, final, alone, err := l.order(g, r, places)
		if err != nil {
			return nil, err
		}
		return func() error {
			for together := range c.alone {
				c.alone[together] = c.alone[together] && alone[together] && !(any && first <= last)
			}
			last, any = final, true
			return nil
		}, nil
	})
	if err != nil {
		return nil, err
	}
	if len(c.found) == 0 {
		return nil, errNothing
	}
	return c.settle(), nil
}

// none is the combination of a row that lacks one of the values.
var none = [4]int32{-1}

// combinations returns the combination of codes of every row; none where a value is
// missing. code numbers the values of a column.
func (l *layout) combinations(g rowGroup, r *reader, code func(column int, kind output.Kind, v value) (int32, error)) ([][4]int32, error) {
	rows := make([][4]int32, g.rows)
	for i, name := range l.o.By {
		column, err := r.column(g, name)
		if err != nil {
			return nil, err
		}
		var before value
		now := int32(-1)
		for k := range rows {
			if column.IsMissing(k) {
				rows[k] = none
				continue
			}
			var v value
			if column.Kind == output.String {
				v.text = column.Strings[k]
			} else {
				v.number = column.Ints[k]
			}
			if now < 0 || v != before {
				if now, err = code(i, column.Kind, v); err != nil {
					return nil, err
				}
				before = v
			}
			if rows[k] != none {
				rows[k][i] = now
			}
		}
	}
	return rows, nil
}

// places returns the combination of codes of every row, entering new ones.
func (l *layout) places(g rowGroup, r *reader, c *cells, mu *sync.Mutex) ([][4]int32, error) {
	rows, err := l.combinations(g, r, func(i int, kind output.Kind, v value) (int32, error) { return c.code(i, kind, v, mu) })
	if err != nil {
		return nil, err
	}
	seen := map[[4]int32]bool{}
	for k, p := range rows {
		if p != none && (k == 0 || p != rows[k-1]) {
			seen[p] = true
		}
	}
	mu.Lock()
	defer mu.Unlock()
	for p := range seen {
		c.found[p] = true
	}
	if len(c.found) > MostCells {
		return nil, fmt.Errorf("the columns to tell apart have more than %d combinations of values", MostCells)
	}
	return rows, nil
}

// code returns the number of a value of column i, a new one where it is new.
func (c *cells) code(i int, kind output.Kind, v value, mu *sync.Mutex) (int32, error) {
	mu.Lock()
	defer mu.Unlock()
	c.kinds[i] = kind
	code, known := c.codes[i][v]
	if !known {
		code = int32(len(c.values[i]))
		if code > MostCells {
			return 0, fmt.Errorf("a column to tell apart has more than %d values", MostCells)
		}
		c.codes[i][v] = code
		c.values[i] = append(c.values[i], v)
	}
	return code, nil
}

// order reports whether units ascend, and by the columns taken together whether no
// unit has two rows in what is left.
func (l *layout) order(g rowGroup, r *reader, places [][4]int32) (first, last int64, alone [1 << mostColumns]bool, err error) {
	for together := range 1 << len(l.o.By) {
		alone[together] = true
	}
	if l.o.Unit == "" {
		return int64(g.file)<<32 | int64(g.group), int64(g.file)<<32 | int64(g.group), alone, nil
	}
	unit, err := r.column(g, l.o.Unit)
	if err != nil || unit.Kind != output.Int {
		return 0, 0, [1 << mostColumns]bool{}, err
	}
	ids := unit.Ints
	start := 0
	for k := range ids {
		if unit.IsMissing(k) || k > 0 && ids[k] < ids[k-1] {
			return ids[0], ids[len(ids)-1], [1 << mostColumns]bool{}, nil
		}
		if k+1 < len(ids) && ids[k+1] == ids[k] {
			continue
		}
		for together := range 1 << len(l.o.By) {
			alone[together] = alone[together] && distinct(places[start:k+1], together, len(l.o.By))
		}
		start = k + 1
	}
	return ids[0], ids[len(ids)-1], alone, nil
}

// distinct reports whether the rows of a unit differ from each other in the columns
// that are not taken together.
func distinct(rows [][4]int32, together, columns int) bool {
	if len(rows) < 2 {
		return true
	}
	for i := range columns {
		strict := together>>i&1 == 0 // ascending values differ
		for k := 1; k < len(rows) && strict; k++ {
			strict = rows[k][i] > rows[k-1][i]
		}
		if strict {
			return true
		}
	}
	for k := range rows {
		for j := range k {
			same := true
			for i := range columns {
				same = same && (together>>i&1 == 1 || rows[k][i] == rows[j][i])
			}
			if same {
				return false
			}
		}
	}
	return true
}

// settle numbers the cells in the order of their values.
func (c *cells) settle() *cells {
	var keys [][4]int32
	for k := range c.found {
		keys = append(keys, k)
	}
	of := func(k [4]int32) []value {
		v := make([]value, len(c.values))
		for i := range v {
			v[i] = c.values[i][k[i]]
		}
		return v
	}
	slices.SortFunc(keys, func(a, b [4]int32) int { return compare(of(a), of(b)) })
	c.index = map[[4]int32]int{}
	for _, k := range keys {
		c.index[k] = len(c.list)
		c.list = append(c.list, of(k))
	}
	c.found = nil
	return c
}

// unitOf is the number by which units are dealt to jackknife groups: the unit
// itself, or a hash of its name.
func unitOf(c *output.Column, k int) int64 {
	if c.Kind == output.Int {
		return c.Ints[k]
	}
	h := fnv.New64a()
	_, _ = h.Write([]byte(c.Strings[k]))
	return int64(h.Sum64())
}
