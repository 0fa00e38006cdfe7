package policy

import (
	"math"
	"slices"
)

// marginal is how the solver reckons with marginal utility. The built-in families
// have loops of their own; any other Utility goes through its methods.
type marginal struct {
	kind    marginalKind
	u       Utility
	gamma   float64     // γ, power kind
	unit    int         // powers are of consumption in units of 2^unit of money
	shift   float64     // subsistence c̲, power kind
	forward *powerTable // x^−γ
	inward  *powerTable // x^(−1/γ)
	alpha   float64
	bliss   float64
}

type marginalKind int

const (
	powerKind       marginalKind = iota // (c − c̲)^−γ
	exponentialKind                     // exp(−αc)
	linearKind                          // B − c
	anyKind
)

// marginalOf returns the marginal utility of a household, with the tables of last
// where they are the same. Powers are taken in a unit of money near its income: a
// factor common to both sides of every Euler equation.
func marginalOf(h Household, last marginal) marginal {
	u := h.Utility
	unit := int(math.Round(math.Log2(h.peakIncome())))
	switch f := u.(type) {
	case CRRA:
		return last.power(u, f.gamma, 0, unit)
	case StoneGeary:
		return last.power(u, f.gamma, f.subsistence, unit)
	case CARA:
		return marginal{kind: exponentialKind, u: u, alpha: f.alpha}
	case Quadratic:
		return marginal{kind: linearKind, u: u, bliss: f.bliss}
	}
	return marginal{kind: anyKind, u: u}
}

func (last marginal) power(u Utility, gamma, shift float64, unit int) marginal {
	m := marginal{kind: powerKind, u: u, gamma: gamma, shift: shift, unit: unit, forward: last.forward, inward: last.inward}
	if m.forward == nil || last.gamma != gamma || last.unit != unit {
		m.forward, m.inward = newScaledPowerTable(-gamma, unit, 0), newScaledPowerTable(-1/gamma, 0, unit)
	}
	return m
}

// expect adds to value[i] the expected marginal utility of next year's rule in a
// state with asset i of g, and to slope[i] the matching sum whose ratio to value
// gives the slope of this year's rule (see slopes).
func (s *Solver) expect(state int, g *ground, values, weights, value, slope []float64) {
	sg := s.next.segments[state]
	for k, y := range values {
		w := weights[k]
		switch {
		case w == 0:
		case s.lined():
			sweepLines(s.next.lines[state], y, w, s.forward, g.gross, value)
		case s.kind == powerKind:
			sweepPower(sg, y, w, s.forward, g.gross, value, slope)
		case s.kind == exponentialKind:
			sweepExponential(sg, y, w, s.alpha, g.gross, g.reference, value, slope)
		case s.kind == linearKind:
			sweepLinear(sg, y, w, s.bliss, g.gross, value, slope)
		default:
			sweepAny(sg, y, w, s.u, g.gross, value, slope)
		}
	}
}

// refer sets the consumption that exponential utility is measured from, so that
// neither very rich nor indebted states overflow: next year's at the lowest
// income.
func (s *Solver) refer(state int, g *ground, values []float64) {
	low := slices.Min(values)
	sg := s.next.segments[state]
	for i, x := range g.gross {
		q := find(sg, x+low)
		u := x + low - q.origin
		g.reference[i] = q.c0 + u*(q.c1+u*(q.c2+u*q.c3))
	}
}

func find(sg []segment, x float64) *segment {
	low, high := 0, len(sg)-1
	for low < high {
		mid := int(uint(low+high) >> 1)
		if x >= sg[mid].high {
			low = mid + 1
		} else {
			high = mid
		}
	}
	return &sg[low]
}

// addBequest turns expected marginal utility in v and its slope sum d into
// s·v + (1−s)·v′(R·a) and its like.
func (s *Solver) addBequest(g *ground, v, d []float64) {
	live := s.euler.live
	die := (1 - live) * s.h.Bequest.Weight
	for i, x := range g.gross {
		x += s.h.Bequest.Shift
		var mv, md float64
		switch s.kind {
		case powerKind:
			mv = s.forward.at(x - s.shift)
			md = mv / (x - s.shift)
		case exponentialKind:
			mv = math.Exp(-s.alpha * (x - g.reference[i]))
			md = mv
		case linearKind:
			mv, md = s.bliss-x, 1
		default:
			mv = s.u.Marginal(x)
			md = mv * s.u.AbsoluteRiskAversion(x)
		}
		v[i] = live*v[i] + die*mv
		d[i] = live*d[i] + die*md
	}
}

// inverse sets c[i] to the consumption whose marginal utility is growth·v[i].
func (s *Solver) inverse(g *ground, c, v []float64) {
	growth := s.euler.growth
	switch s.kind {
	case powerKind:
		s.inward.into(c, v, growth)
		if s.shift != 0 {
			for i := range c {
				c[i] += s.shift
			}
		}
	case exponentialKind:
		for i, x := range v {
			c[i] = g.reference[i] - math.Log(growth*x)/s.alpha
		}
	case linearKind:
		for i, x := range v {
			c[i] = s.bliss - growth*x
		}
	default:
		for i, x := range v {
			c[i] = s.u.Inverse(growth * x)
		}
	}
}

// assetSlope returns dc/da at consumption c where the expectation is v and its
// slope sum d.
func (s *Solver) assetSlope(c, v, d float64) float64 {
	switch s.kind {
	case powerKind:
		return s.returns * d * (c - s.shift) / v
	case exponentialKind:
		return s.returns * d / v
	case linearKind:
		return s.euler.growth * s.returns * d
	}
	return s.returns * d / (v * s.u.AbsoluteRiskAversion(c))
}

// slopeTerm is what one kink adds to the slope sum: the weight of an outcome
// times the derivative of marginal utility, in the units of the kind.
func (s *Solver) slopeTerm(g *ground, consumption, weight float64, asset int) float64 {
	switch s.kind {
	case powerKind:
		x := consumption - s.shift
		return weight * s.forward.at(x) / x
	case exponentialKind:
		return weight * math.Exp(-s.alpha*(consumption-g.reference[asset]))
	case linearKind:
		return weight
	}
	return weight * s.u.Marginal(consumption) * s.u.AbsoluteRiskAversion(consumption)
}
