package policy

import "math"

// A sweep evaluates next year's rule at cash-on-hand gross[i] + y, ascending in
// i, for one persistent node and one income outcome of probability w, and adds
// w·u′ to value and w·(−u″)·dc/dm, in the units of the kind, to slope.
//
// Invariant of the search: segment j is the first whose high end lies above the
// point; it only moves forward since points ascend, and stops at the last
// segment, whose high end is infinite.

func sweepPower(sg []segment, y, w float64, p *powerTable, gross, value, slope []float64) {
	value, slope = value[:len(gross)], slope[:len(gross)]
	b1, b2, b3, b4, b5 := p.series[1], p.series[2], p.series[3], p.series[4], p.series[5]
	j := 0
	q := &sg[0]
	for i, a := range gross {
		x := a + y
		for x >= q.high {
			j++
			q = &sg[j]
		}
		u := x - q.origin
		e2 := q.c2 + u*q.c3
		e1 := q.c1 + u*e2
		c := q.c0 + u*e1
		d := e1 + u*(e2+u*q.c3)
		// c^−γ as in powerTable.at, by hand: a call would double the time
		bits := math.Float64bits(c)
		cell := &p.cell[bits>>44&255]
		r := math.Float64frombits(bits&(1<<52-1)|1023<<52)*cell[0] - 1
		v := w * p.scale[bits>>52] * cell[1] * (1 + r*(b1+r*(b2+r*(b3+r*(b4+r*b5)))))
		value[i] += v
		slope[i] += v / c * d
	}
}

// sweepLines is sweepPower for linear rules, which need no slopes.
func sweepLines(ln []line, y, w float64, p *powerTable, gross, value []float64) {
	value = value[:len(gross)]
	b1, b2, b3, b4, b5 := p.series[1], p.series[2], p.series[3], p.series[4], p.series[5]
	j := 0
	q := &ln[0]
	for i, a := range gross {
		x := a + y
		for x >= q.high {
			j++
			q = &ln[j]
		}
		bits := math.Float64bits(q.level + q.slope*x)
		cell := &p.cell[bits>>44&255]
		r := math.Float64frombits(bits&(1<<52-1)|1023<<52)*cell[0] - 1
		value[i] += w * p.scale[bits>>52] * cell[1] * (1 + r*(b1+r*(b2+r*(b3+r*(b4+r*b5)))))
	}
}

func sweepExponential(sg []segment, y, w, alpha float64, gross, reference, value, slope []float64) {
	j := 0
	for i, a := range gross {
		x := a + y
		for x >= sg[j].high {
			j++
		}
		c, d := sg[j].at(x)
		v := w * math.Exp(-alpha*(c-reference[i]))
		value[i] += v
		slope[i] += v * d
	}
}

func sweepLinear(sg []segment, y, w, bliss float64, gross, value, slope []float64) {
	j := 0
	for i, a := range gross {
		x := a + y
		for x >= sg[j].high {
			j++
		}
		c, d := sg[j].at(x)
		value[i] += w * (bliss - c)
		slope[i] += w * d
	}
}

func sweepAny(sg []segment, y, w float64, u Utility, gross, value, slope []float64) {
	j := 0
	for i, a := range gross {
		x := a + y
		for x >= sg[j].high {
			j++
		}
		c, d := sg[j].at(x)
		v := w * u.Marginal(c)
		value[i] += v
		slope[i] += v * u.AbsoluteRiskAversion(c) * d
	}
}

func (q *segment) at(x float64) (consumption, propensity float64) {
	u := x - q.origin
	e2 := q.c2 + u*q.c3
	e1 := q.c1 + u*e2
	return q.c0 + u*e1, e1 + u*(e2+u*q.c3)
}

// readSegments adds weight times a rule's consumption and propensity, at
// cash-on-hand gross[i] + y, ascending in i.
func readSegments(sg []segment, y, weight float64, gross, consumption, propensity []float64) {
	consumption, propensity = consumption[:len(gross)], propensity[:len(gross)]
	j := 0
	q := &sg[0]
	for i, a := range gross {
		x := a + y
		for x >= q.high {
			j++
			q = &sg[j]
		}
		u := x - q.origin
		e2 := q.c2 + u*q.c3
		e1 := q.c1 + u*e2
		consumption[i] += weight * (q.c0 + u*e1)
		propensity[i] += weight * (e1 + u*(e2+u*q.c3))
	}
}

// readLines sets row to the consumption of a linear rule at cash-on-hand
// gross[i] + y, ascending in i.
func readLines(ln []line, y float64, gross, row []float64) {
	row = row[:len(gross)]
	j := 0
	q := &ln[0]
	for i, a := range gross {
		x := a + y
		for x >= q.high {
			j++
			q = &ln[j]
		}
		row[i] = q.level + q.slope*x
	}
}

// addPower adds w·c^−γ to value and w·γ⁻¹·(−u″)·dc/dm to slope.
func addPower(p *powerTable, w float64, consumption, propensity, value, slope []float64) {
	propensity, value, slope = propensity[:len(consumption)], value[:len(consumption)], slope[:len(consumption)]
	b1, b2, b3, b4, b5 := p.series[1], p.series[2], p.series[3], p.series[4], p.series[5]
	for i, c := range consumption {
		bits := math.Float64bits(c)
		cell := &p.cell[bits>>44&255]
		r := math.Float64frombits(bits&(1<<52-1)|1023<<52)*cell[0] - 1
		v := w * p.scale[bits>>52] * cell[1] * (1 + r*(b1+r*(b2+r*(b3+r*(b4+r*b5)))))
		value[i] += v
		slope[i] += v / c * propensity[i]
	}
}

// addPair adds w·c^−γ to value, c = u·a + v·b.
func addPair(p *powerTable, w, u float64, a []float64, v float64, b, value []float64) {
	a, b = a[:len(value)], b[:len(value)]
	b1, b2, b3, b4, b5 := p.series[1], p.series[2], p.series[3], p.series[4], p.series[5]
	for i, x := range a {
		bits := math.Float64bits(u*x + v*b[i])
		cell := &p.cell[bits>>44&255]
		r := math.Float64frombits(bits&(1<<52-1)|1023<<52)*cell[0] - 1
		value[i] += w * p.scale[bits>>52] * cell[1] * (1 + r*(b1+r*(b2+r*(b3+r*(b4+r*b5)))))
	}
}

func addScaled(dst []float64, w float64, row []float64) {
	row = row[:len(dst)]
	for i := range dst {
		dst[i] += w * row[i]
	}
}
