package distribution

import (
	"math"
	"math/bits"
)

// scale turns values into whole numbers, so that their sums do not depend on the
// order of rows: a value counts in parts of 2^−62 of a power of two that no value
// exceeds.
type scale struct{ factor float64 }

// zero is what 0 counts as: counts are not negative.
const zero = 1 << 62

// newScale returns the scale of values between low and high.
func newScale(low, high float64) scale {
	_, exponent := math.Frexp(max(math.Abs(low), math.Abs(high)))
	return scale{math.Ldexp(1, min(62-exponent, 1000))}
}

// count is a value as a whole number, exactly if it is not 2^−9 times smaller than
// the largest; otherwise rounded towards zero.
func (s scale) count(x float64) uint64 { return uint64(int64(x*s.factor) + zero) }

// total is a sum of counts, each times the weight of its row in units: whole
// numbers of 128 bits. It has room for units of 2^63 in all.
type total struct{ units, high, low uint64 }

func (t *total) add(unit, count uint64) {
	h, l := bits.Mul64(unit, count)
	var carry uint64
	t.units += unit
	t.low, carry = bits.Add64(t.low, l, 0)
	t.high, _ = bits.Add64(t.high, h, carry)
}

// addOne adds a row of one unit.
func (t *total) addOne(count uint64) {
	var carry uint64
	t.units++
	t.low, carry = bits.Add64(t.low, count, 0)
	t.high += carry
}

func (t *total) join(u *total) {
	var carry uint64
	t.units += u.units
	t.low, carry = bits.Add64(t.low, u.low, 0)
	t.high, _ = bits.Add64(t.high, u.high, carry)
}

// sum returns Σ unit·x.
func (t *total) sum(s scale) float64 {
	low, borrow := bits.Sub64(t.low, t.units<<62, 0)
	high, _ := bits.Sub64(t.high, t.units>>2, borrow)
	sign := 1.0
	if int64(high) < 0 {
		sign = -1
		low, borrow = bits.Sub64(0, low, 0)
		high, _ = bits.Sub64(0, high, borrow)
	}
	return sign * (math.Ldexp(float64(high), 64) + float64(low)) / s.factor
}
