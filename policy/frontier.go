package policy

import "math"

// segment is one piece of a rule ready for evaluation: for cash-on-hand below
// high, consumption less subsistence is the cubic c0 + c1·u + c2·u² + c3·u³ in
// u = m − origin.
type segment struct{ high, origin, c0, c1, c2, c3 float64 }

// line is a segment of a linear rule with power utility: below high, consumption
// less subsistence is level + slope·m. Half as long as a segment, twice as many
// stay in the first-level cache.
type line struct{ high, level, slope float64 }

// frontier is next year's rule as the backward step reads it: for every state (a
// persistent node and, with an entitlement, an entitlement node: [node][entitlement])
// the segments in order, the constrained one first and the line
// above the grid last, and the kinks. Linear rules with power utility have lines
// in place of segments.
type frontier struct {
	segments [][]segment
	kinks    [][]kink
	lines    [][]line
}

func (f *frontier) reset(states int) {
	for len(f.segments) < states {
		f.segments = append(f.segments, nil)
		f.kinks = append(f.kinks, nil)
		f.lines = append(f.lines, nil)
	}
	f.segments, f.kinks, f.lines = f.segments[:states], f.kinks[:states], f.lines[:states]
}

// set replaces the rule of state j by curve c. A point within tolerance below a
// node counts as being on it, so that the assets placed for a kink meet the
// slope above it whatever the rounding. shift is subtracted from consumption. It
// reports whether cash-on-hand ascends and consumption stays at or above shift:
// false also where a number is not finite.
func (f *frontier) set(j int, c *Curve, tolerance, shift float64) (sound bool) {
	n := len(c.Cash)
	if cap(f.segments[j]) < n+1 {
		f.segments[j] = make([]segment, n+1, n+n/2+1)
	}
	sg := f.segments[j][:n+1]
	f.segments[j], f.kinks[j] = sg, f.kinks[j][:0]
	tolerance *= 4
	if math.IsInf(c.Bound, -1) {
		sg[0] = segment{c.Cash[0] - tolerance, c.Cash[0], c.Consumption[0] - shift, c.Left[0], 0, 0}
	} else {
		sg[0] = segment{c.Cash[0] - tolerance, c.Bound, -shift, 1, 0, 0}
	}
	sg[n] = segment{math.Inf(1), c.Cash[n-1], c.Consumption[n-1] - shift, c.Right[n-1], 0, 0}
	f.noteKinks(j, c)
	return setCubic(sg[1:n], c, tolerance, shift)
}

// setLines replaces the rule of state j by the linear rule c, whose slopes it sets
// in k on the way: k[0] below the first node, k[n] above the last. It reports what
// set does.
func (f *frontier) setLines(j int, c *Curve, k []float64, tolerance, shift float64) (sound bool) {
	n := len(c.Cash)
	if cap(f.lines[j]) < n+1 {
		f.lines[j] = make([]line, n+1, n+n/2+1)
	}
	ln := f.lines[j][:n+1]
	f.lines[j] = ln
	cash, consumption := c.Cash, c.Consumption[:n]
	k = k[:n+1]
	tolerance *= 4
	sound = true
	m, x := cash[0], consumption[0]-shift
	k[0] = 1
	ln[0] = line{m - tolerance, -shift - c.Bound, 1}
	for i := 1; i < len(cash); i++ {
		next, y := cash[i], consumption[i]-shift
		slope := (y - x) / (next - m)
		k[i] = slope
		ln[i] = line{next - tolerance, x - slope*m, slope}
		sound = sound && next > m && x >= 0
		m, x = next, y
	}
	k[n] = k[n-1]
	ln[n] = line{math.Inf(1), x - k[n]*m, k[n]}
	return sound && x >= 0 && x <= math.MaxFloat64
}

func setCubic(sg []segment, c *Curve, tolerance, shift float64) (sound bool) {
	cash, consumption := c.Cash[:len(sg)+1], c.Consumption[:len(sg)+1]
	left, right := c.Left[:len(sg)+1], c.Right[:len(sg)]
	sound = true
	m, x := cash[0], consumption[0]-shift
	for i := range sg {
		next, y := cash[i+1], consumption[i+1]-shift
		h := 1 / (next - m)
		k := (y - x) * h
		a, b := right[i], left[i+1]
		sg[i] = segment{next - tolerance, m, x, a, (3*k - 2*a - b) * h, (a + b - 2*k) * (h * h)}
		sound = sound && next > m && x >= 0 && a <= math.MaxFloat64
		m, x = next, y
	}
	return sound && x >= 0 && x <= math.MaxFloat64
}

func (f *frontier) noteKinks(j int, c *Curve) {
	if &c.Left[0] == &c.Right[0] {
		return
	}
	right := c.Right[:len(c.Left)-1]
	for i, r := range right {
		if jump := c.Left[i] - r; jump > kinkNoise {
			f.kinks[j] = append(f.kinks[j], kink{c.Cash[i], c.Consumption[i], jump, i == 0})
		}
	}
}

// kinkNoise is the slope jump below which a kink is rounding error.
const kinkNoise = 1e-9

// sight appends the kinks of a state with persistent node j as assets of the year
// before: through an income outcome y a kink at cash-on-hand m is met with assets
// (m − y)/R. Where several outcomes blur a kink it is passed on while its jump times
// the probability exceeds threshold; the limit's own kink always is.
func (f *frontier) sight(dst []sighting, state, j int, values, weights []float64, returns, threshold float64) []sighting {
	for _, k := range f.kinks[state] {
		for o, y := range values {
			if w := weights[o]; w > 0 && (len(values) == 1 || k.first || k.jump*w > threshold) {
				dst = append(dst, sighting{assets: (k.cash - y) / returns, node: int32(j), consumption: k.consumption, delta: k.jump, weight: w})
			}
		}
	}
	return dst
}

// scratch holds the sums of one backward step.
type scratch struct {
	value, slope       [][]float64 // [entitlement][next node][asset]: Σ w·u′ and its derivative in cash-on-hand
	mixValue, mixSlope []float64   // the same, expected over next nodes
	extra              []float64   // what the slope lacks on the left of kinks
	blended
}

// grow makes room for the given number of rows of up to n assets.
func (w *scratch) grow(rows, n int) {
	for len(w.value) < rows {
		w.value, w.slope = append(w.value, nil), append(w.slope, nil)
	}
	for i := range rows {
		w.value[i], w.slope[i] = room(w.value[i], n), room(w.slope[i], n)
	}
	w.value, w.slope = w.value[:rows], w.slope[:rows]
	w.mixValue, w.mixSlope, w.extra = room(w.mixValue, n), room(w.mixSlope, n), room(w.extra, n)
}

// room returns a slice of length n, the same memory where it is large enough.
func room(x []float64, n int) []float64 {
	if cap(x) < n {
		return make([]float64, n, n+n/2)
	}
	return x[:n]
}

// arena hands out slices of memory that a Solver reuses.
type arena struct {
	chunks [][]float64
	at     int // chunk in use
	free   []float64
}

const arenaChunk = 1 << 16

func (a *arena) reset() { a.at, a.free = 0, nil }

// take returns n numbers of undefined value.
func (a *arena) take(n int) []float64 {
	for len(a.free) < n {
		if a.at == len(a.chunks) {
			a.chunks = append(a.chunks, make([]float64, max(n, arenaChunk)))
		}
		a.free = a.chunks[a.at]
		a.at++
	}
	x := a.free[:n:n]
	a.free = a.free[n:]
	return x
}

// mix sets dst to Σ_y p[y]·rows[y], four rows at a time.
func mix(dst, p []float64, rows [][]float64) {
	n := len(dst)
	y := 0
	switch len(p) % 4 {
	case 0:
		clear(dst)
	case 1:
		a, p0 := rows[0][:n], p[0]
		for i := range dst {
			dst[i] = p0 * a[i]
		}
		y = 1
	case 2:
		a, b, p0, p1 := rows[0][:n], rows[1][:n], p[0], p[1]
		for i := range dst {
			dst[i] = p0*a[i] + p1*b[i]
		}
		y = 2
	case 3:
		a, b, c, p0, p1, p2 := rows[0][:n], rows[1][:n], rows[2][:n], p[0], p[1], p[2]
		for i := range dst {
			dst[i] = p0*a[i] + p1*b[i] + p2*c[i]
		}
		y = 3
	}
	for ; y+4 <= len(p); y += 4 {
		a, b, c, d := rows[y][:n], rows[y+1][:n], rows[y+2][:n], rows[y+3][:n]
		p0, p1, p2, p3 := p[y], p[y+1], p[y+2], p[y+3]
		for i := range dst {
			dst[i] += p0*a[i] + p1*b[i] + p2*c[i] + p3*d[i]
		}
	}
}
