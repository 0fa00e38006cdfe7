package policy

import "math"

// powerTable computes x^g for one fixed exponent g without logarithm or
// exponential. With x = 2^e·f, f in [1, 2), and a cell of f whose centre is ζ,
//
//	x^g = 2^(e·g) · ζ^g · (1+r)^g,   r = f/ζ − 1,   |r| ≤ 2^−9,
//
// the last factor by the first six terms of the binomial series. What is left out
// is about |C(g,6)|·2^−54, relative: 4e-16 at g = −2, 3e-13 at g = −10, 1e-11 at
// g = −20. Where x is not positive, or below the smallest normal number, the
// power counts as that of 0.
type powerTable struct {
	series [6]float64       // binomial coefficients of g
	cell   [256][2]float64  // 1/ζ and ζ^g, by the top 8 bits of the mantissa
	scale  [1 << 12]float64 // 2^(e·g) by sign and exponent bits: as long as the bits, so that no bound is checked
}

func newPowerTable(g float64) *powerTable {
	p := new(powerTable)
	b := 1.0
	for k := range p.series {
		p.series[k] = b
		b *= (g - float64(k)) / float64(k+1)
	}
	for i := range p.cell {
		inverse := 1 / (1 + (float64(i)+0.5)/256)
		p.cell[i] = [2]float64{inverse, math.Pow(1/inverse, g)}
	}
	zero, infinite := 0.0, math.Inf(1)
	if g < 0 {
		zero, infinite = infinite, zero
	}
	for e := range p.scale {
		switch {
		case e == 0 || e > 0x7ff:
			p.scale[e] = zero
		case e == 0x7ff:
			p.scale[e] = infinite
		default:
			p.scale[e] = math.Exp2(float64(e-1023) * g)
		}
	}
	return p
}

// at returns x^g.
func (p *powerTable) at(x float64) float64 {
	bits := math.Float64bits(x)
	c := &p.cell[bits>>44&255]
	r := math.Float64frombits(bits&(1<<52-1)|1023<<52)*c[0] - 1
	return p.scale[bits>>52] * c[1] *
		(1 + r*(p.series[1]+r*(p.series[2]+r*(p.series[3]+r*(p.series[4]+r*p.series[5])))))
}

// into sets dst[i] to (f·src[i])^g.
func (p *powerTable) into(dst, src []float64, f float64) {
	dst = dst[:len(src)]
	b1, b2, b3, b4, b5 := p.series[1], p.series[2], p.series[3], p.series[4], p.series[5]
	for i, x := range src {
		bits := math.Float64bits(f * x)
		c := &p.cell[bits>>44&255]
		r := math.Float64frombits(bits&(1<<52-1)|1023<<52)*c[0] - 1
		dst[i] = p.scale[bits>>52] * c[1] * (1 + r*(b1+r*(b2+r*(b3+r*(b4+r*b5)))))
	}
}
