package policy

import "math"

// powerTable computes x^g, x > 0, for one fixed real exponent g without
// logarithm or exponential. With x = 2^e·m, 1 ≤ m < 2, and d the centre of the
// 256th part of [1, 2) that m lies in,
//
//	x^g = 2^(e·g) · d^g · (1 + r)^g,   1 + r = m/d,   |r| ≤ 2^−9,
//
// the first two factors from tables, the third by five terms of the binomial
// series. The sixth term b₆r⁶ is replaced by the polynomial of degree 4 nearest
// to it (Chebyshev economisation; Lanczos 1938, Journal of Mathematics and
// Physics 17), which leaves b₆·2^−59.
//
// Error, relative: below 1e-15 for |g| ≤ 3, 2e-14 at |g| = 10, growing like g⁶.
//
// Outside the positive normal numbers: 0 and subnormal x count as 0, which gives
// +Inf for g < 0 and 0 for g > 0; +Inf gives the opposite, and so does NaN, which
// no comparison is spent on; x < 0 gives +Inf for g < 0, like marginal utility
// below its domain, and NaN for g > 0. g = 0 is not meant.
type powerTable struct {
	series [6]float64      // binomial coefficients, economised; series[0] is 1
	cell   [256][2]float64 // 1/d and d^g
	scale  [4096]float64   // 2^(e·g); indexed by sign and exponent bits, so no bounds check
}

const (
	mantissaBits = 1<<52 - 1
	exponentOne  = 1023 << 52 // exponent bits of numbers in [1, 2)
)

func newPowerTable(g float64) *powerTable { return newScaledPowerTable(g, 0, 0) }

// newScaledPowerTable computes 2^out·(x/2^in)^g instead: powers of amounts of money
// in a unit near them, which strong curvature would otherwise drive out of the
// range of numbers.
func newScaledPowerTable(g float64, in, out int) *powerTable {
	p := new(powerTable)
	base := p.expand(g)
	for k := range p.cell {
		inverse := 1 / (1 + (float64(k)+0.5)/256)
		p.cell[k] = [2]float64{inverse, base * math.Pow(1/inverse, g)}
	}
	for i := range p.scale {
		p.scale[i] = math.Ldexp(powerScale(g, i, in), out)
	}
	return p
}

// expand sets the series and returns its constant term, near 1, which belongs
// into the cells.
func (p *powerTable) expand(g float64) float64 {
	const rho = 1.0 / 512 // half-width of r
	var b [7]float64
	b[0] = 1
	for j := range 6 {
		b[j+1] = b[j] * (g - float64(j)) / float64(j+1)
	}
	// x⁶ = (48x⁴ − 18x² + 1)/32 + T₆(x)/32 on [−1, 1]
	b[4] += b[6] * rho * rho * 48 / 32
	b[2] -= b[6] * rho * rho * rho * rho * 18 / 32
	base := 1 + b[6]*math.Pow(rho, 6)/32
	for j := range p.series {
		p.series[j] = b[j] / base
	}
	p.series[0] = 1
	return base
}

// powerScale returns 2^((e−in)·g) for the sign and exponent bits i of a number,
// minding that the product rounds.
func powerScale(g float64, i, in int) float64 {
	e := float64(i - 1023 - in)
	switch {
	case i > 2048 && g > 0:
		return math.NaN() // negative
	case i == 0 || i >= 2048:
		e = math.Inf(-1) // zero; negative
	case i == 2047:
		e = math.Inf(1)
	}
	if math.IsInf(e, 0) {
		return math.Exp2(e * g)
	}
	x := e * g
	return math.Exp2(x) * (1 + math.Ln2*math.FMA(e, g, -x))
}

// at returns x^g.
func (p *powerTable) at(x float64) float64 {
	bits := math.Float64bits(x)
	cell := &p.cell[bits>>44&255]
	r := math.Float64frombits(bits&mantissaBits|exponentOne)*cell[0] - 1
	b := &p.series
	return p.scale[bits>>52] * cell[1] * (1 + r*(b[1]+r*(b[2]+r*(b[3]+r*(b[4]+r*b[5])))))
}

// into sets dst[i] to (f·src[i])^g. dst may be src. The body of at is repeated,
// since a call would double the time.
func (p *powerTable) into(dst, src []float64, f float64) {
	dst = dst[:len(src)]
	b1, b2, b3, b4, b5 := p.series[1], p.series[2], p.series[3], p.series[4], p.series[5]
	for i, x := range src {
		bits := math.Float64bits(f * x)
		cell := &p.cell[bits>>44&255]
		r := math.Float64frombits(bits&mantissaBits|exponentOne)*cell[0] - 1
		dst[i] = p.scale[bits>>52] * cell[1] * (1 + r*(b1+r*(b2+r*(b3+r*(b4+r*b5)))))
	}
}
