package sim

import (
	"math"
	"sync"

	"gonum.org/v1/gonum/mathext"
)

// normalQuantile maps 64 random bits to the normal number Φ⁻¹(u) that they stand
// for: the highest bit chooses the tail, the next 52, w, give u = (w + ½)·2^−53 in
// it, so that the law is symmetric to the bit.
func normalQuantile(bits uint64) float64 {
	x := mathext.NormalQuantile((float64(int64(bits<<1>>12)) + 0.5) * unitScale)
	if bits>>63 == 1 {
		return -x
	}
	return x
}

// normalTable maps 64 random bits to f(normalQuantile) by piecewise cubics, f being
// σ·x or exp(σ·x − shift). A piece is an exponent and six bits of mantissa of w + ½;
// its cubic interpolates f at the Chebyshev points, which for x itself and for σ up
// to ½ is good to 1e-10.
type normalTable [2 << tableBits][4]float64

const (
	pieceBits = 6                 // pieces an octave: 2^6
	tableBits = 12                // exponents −1 … 51 in 6 bits, pieces in 6
	octaves   = 53                // of w + ½
	lowest    = 1022 << pieceBits // the piece of w + ½ = ½
	pieceMask = 1<<tableBits - 1  // pieces wrap round: the lowest is not at 0
	bodyShift = 12 + pieceBits    // sign, exponent and piece bits
	tailShift = 63 - tableBits    // moves the highest bit to the table's upper half
	tailMask  = 1 << tableBits    // the upper tail's half
	unitScale = 1.0 / (1 << 53)   // of u
)

func newNormalTable(f func(x float64) float64) *normalTable {
	t := new(normalTable)
	for i, x := range quantilePoints() {
		for tail, sign := range []float64{1, -1} {
			c := cubicThrough(f(sign*x[0]), f(sign*x[1]), f(sign*x[2]), f(sign*x[3]))
			for k := range c { // the local coordinate is an integer of 52 bits
				c[k] = math.Ldexp(c[k], -52*k)
			}
			t[(i+lowest)&pieceMask|tail<<tableBits] = c
		}
	}
	return t
}

// chebyshev are the points on [0, 1] where a piece's cubic meets its function.
var chebyshev = func() (x [4]float64) {
	for k := range x {
		x[k] = 0.5 - 0.5*math.Cos(float64(2*k+1)*math.Pi/8)
	}
	return x
}()

// quantilePoints returns Φ⁻¹ at the points of every piece of the lower tail.
var quantilePoints = sync.OnceValue(func() [][4]float64 {
	points := make([][4]float64, octaves<<pieceBits)
	for i := range points {
		exponent, piece := i>>pieceBits-1, i&(1<<pieceBits-1)
		start := math.Ldexp(1+float64(piece)/(1<<pieceBits), exponent)
		width := math.Ldexp(1.0/(1<<pieceBits), exponent)
		for k, y := range chebyshev {
			points[i][k] = mathext.NormalQuantile((start + width*y) * unitScale)
		}
	}
	return points
})

// cubicThrough returns the monomial coefficients, on [0, 1], of the cubic with the
// values d at the Chebyshev points.
func cubicThrough(d ...float64) [4]float64 {
	x := &chebyshev
	for k := 1; k < 4; k++ { // Newton's divided differences
		for j := 3; j >= k; j-- {
			d[j] = (d[j] - d[j-1]) / (x[j] - x[j-k])
		}
	}
	c := [4]float64{d[3]}
	for k := 2; k >= 0; k-- {
		for j := 3; j > 0; j-- {
			c[j] = c[j-1] - x[k]*c[j]
		}
		c[0] = d[k] - x[k]*c[0]
	}
	return c
}

// at returns f at the normal number that bits stand for.
func (t *normalTable) at(bits uint64) float64 {
	b := math.Float64bits(float64(int64(bits<<1>>12)) + 0.5)
	c := &t[b>>(52-pieceBits)&pieceMask|bits>>tailShift&tailMask]
	y := float64(int64(b << bodyShift >> 12))
	return c[0] + y*(c[1]+y*(c[2]+y*c[3]))
}
