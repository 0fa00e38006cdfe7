package sim

import (
	"encoding/binary"
	"math/bits"

	//lint:ignore SA1019 the project fixes this package; its generator is used in this file only
	"golang.org/x/exp/rand"
)

const (
	// BirthDraws is the number of draws a household takes before its first year: 0
	// whether start assets are zero, 1 start assets, 2 persistent node, 3 type within
	// the group; the others are in reserve.
	BirthDraws = 8
	// YearDraws is the number of draws of every year: 0 transitory shock; 1 survival
	// (high 32 bits) and next persistent node (low 32); 2 job loss (high 32), low 32 in
	// reserve.
	YearDraws = 3
)

// NewStream returns the random stream of a household from its birth on.
func NewStream(seed uint64, id int64) rand.PCGSource {
	var s rand.PCGSource
	high, low := streamState(seed, id)
	var bytes [16]byte
	binary.BigEndian.PutUint64(bytes[:8], high)
	binary.BigEndian.PutUint64(bytes[8:], low)
	if err := s.UnmarshalBinary(bytes[:]); err != nil {
		panic("sim: " + err.Error())
	}
	return s
}

// streamState hashes seed and id to the 128 bits of a generator's state. States
// that were close together would give correlated streams.
func streamState(seed uint64, id int64) (high, low uint64) {
	key := scramble(scramble(seed^0x6a09e667f3bcc909) + uint64(id)*0x9e3779b97f4a7c15)
	return scramble(key ^ 0xbb67ae8584caa73b), scramble(key + 0x3c6ef372fe94f82b)
}

// scramble is the finaliser of SplitMix64 (Steele, Lea & Flood 2014, OOPSLA): a
// bijection in which every input bit moves half of the output.
func scramble(x uint64) uint64 {
	x ^= x >> 30
	x *= 0xbf58476d1ce4e5b9
	x ^= x >> 27
	x *= 0x94d049bb133111eb
	return x ^ x>>31
}

// state is the state of a PCGSource, for the loop over households: a call of the
// library for each draw would take half of the simulation's time. That both give
// the same numbers is tested.
type state struct{ high, low uint64 }

// The generator's step is s → s·a + c mod 2^128 (O'Neill 2014); k steps at once
// are s·a^k + c·(1 + a + … + a^(k−1)).
type jump struct{ mulHigh, mulLow, addHigh, addLow uint64 }

var (
	one   = jump{2549297995355413924, 4865540595714422341, 6364136223846793005, 1442695040888963407}
	two   = jumps(2)
	three = jumps(3)
	four  = jumps(4)
	// born leads from the hashed state to where a household's state stands before its
	// first year, at draw 7 of birth: that is to draw 0 of a year as draw 1 of the
	// year before is.
	born = jumps(BirthDraws - 1)
)

func jumps(n int) jump {
	j := one
	for range n - 1 {
		j = j.then(one)
	}
	return j
}

// then returns the jump that makes j and then k.
func (j jump) then(k jump) jump {
	mh, ml := multiply(j.mulHigh, j.mulLow, k.mulHigh, k.mulLow)
	ah, al := multiply(j.addHigh, j.addLow, k.mulHigh, k.mulLow)
	al, carry := bits.Add64(al, k.addLow, 0)
	ah, _ = bits.Add64(ah, k.addHigh, carry)
	return jump{mh, ml, ah, al}
}

func multiply(ah, al, bh, bl uint64) (high, low uint64) {
	high, low = bits.Mul64(al, bl)
	return high + ah*bl + al*bh, low
}

// after returns the state after a jump.
func (s state) after(j *jump) state {
	h, l := bits.Mul64(s.low, j.mulLow)
	h += s.high*j.mulLow + s.low*j.mulHigh
	l, carry := bits.Add64(l, j.addLow, 0)
	h, _ = bits.Add64(h, j.addHigh, carry)
	return state{h, l}
}

// output is the number that a state stands for: XSL RR.
func (s state) output() uint64 {
	return bits.RotateLeft64(s.high^s.low, -int(s.high>>58))
}

// A household's state always stands at draw 1 of its last year, the one that every
// year needs: a year's draws 0, 1 and 2 are then two, three and four steps away, and
// those that nobody looks at cost nothing.

// drawFates sets draw 1 of a year for every household and moves the streams on.
func drawFates(streams []state, x1 []uint64) {
	x1 = x1[:len(streams)]
	b := three
	for i, s := range streams {
		s = s.after(&b)
		x1[i] = s.output()
		streams[i] = s
	}
}

// drawShocks sets draw 0 of the coming year for every household.
func drawShocks(streams []state, x0 []uint64) {
	x0 = x0[:len(streams)]
	a := two
	for i, s := range streams {
		x0[i] = s.after(&a).output()
	}
}

// drawJobs sets draw 2 of the coming year for every household.
func drawJobs(streams []state, x2 []uint64) {
	x2 = x2[:len(streams)]
	c := four
	for i, s := range streams {
		x2[i] = s.after(&c).output()
	}
}

// drawBirth returns a household's draws at birth and its state before its first
// year.
func drawBirth(seed uint64, id int64) (x [BirthDraws]uint64, s state) {
	source := NewStream(seed, id)
	for k := range x {
		x[k] = source.Uint64()
	}
	high, low := streamState(seed, id)
	return x, state{high, low}.after(&born)
}
