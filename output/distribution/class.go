package distribution

import "math"

// RowsIn returns the number of rows in class, from 0, of variable v; where rows or
// cells differ in weight, the number that makes the same share of all rows.
func (r *Result) RowsIn(v, class int) int64 {
	k, o := r.wants(v, Classes), &r.s.o
	if k.partial == nil {
		return 0
	}
	p, first := k.partial, o.firstClass()
	inside := p.own.whole(-1)
	whole := inside.mass
	if class < o.Classes-1 {
		inside = p.own.upTo(p.of[first+class], -1)
	}
	if class > 0 {
		inside = inside.less(p.own.upTo(p.of[first+class-1], -1))
	}
	return int64(math.Round(inside.mass / whole * float64(k.rows)))
}
