package report

import (
	"math"
	"strconv"
	"strings"
)

// scale maps values to places on the page.
type scale struct {
	low, high float64 // values
	from, to  float64 // places
	ticks     []float64
	step      float64
}

func (s *scale) at(x float64) float64 {
	return s.from + (x-s.low)/(s.high-s.low)*(s.to-s.from)
}

// steps are the distances of ticks, times powers of ten.
var steps = []float64{1, 2, 2.5, 5, 10}

// newScale chooses round ticks, about n of them, around low … high.
func newScale(low, high float64, a Axis, n int) scale {
	if a.Zero {
		low, high = math.Min(low, 0), math.Max(high, 0)
	}
	if low < 0 && low > -0.02*high { // a hair below 0 takes no tick of its own
		low = 0
	}
	if !(high > low) {
		d := math.Max(math.Abs(low)*0.1, 1)
		low, high = low-d, high+d
	}
	if a.Integer { // ages are short
		n += 2
	}
	raw := (high - low) / float64(n)
	power := math.Pow(10, math.Floor(math.Log10(raw)))
	step := 10 * power
	for _, s := range steps {
		if s*power >= raw*0.999 && !(a.Integer && s*power != math.Round(s*power)) {
			step = s * power
			break
		}
	}
	if a.Integer {
		step = math.Max(1, step)
	}
	s := scale{step: step}
	if a.Integer { // ages: the axis ends where life does
		s.low, s.high = low, high
	} else {
		s.low, s.high = math.Floor(low/step+1e-9)*step, math.Ceil(high/step-1e-9)*step
		if a.Share && high <= 1.02 {
			s.high = math.Min(s.high, 1)
		}
	}
	for k := math.Ceil(s.low/step - 1e-9); k*step <= s.high+step*1e-9; k++ {
		s.ticks = append(s.ticks, k*step)
	}
	return s
}

// tick writes the value at a tick.
func (s *scale) tick(x float64, a Axis) string {
	if a.Share {
		return decimals(100*x, digits(100*s.step)) + " %"
	}
	return decimals(x, digits(s.step))
}

// digits is the number of decimals that multiples of step need.
func digits(step float64) int {
	for d := range 6 {
		if p := math.Pow(10, float64(d)); math.Abs(step*p-math.Round(step*p)) < 1e-6 {
			return d
		}
	}
	return 6
}

// decimals writes x with n decimals and its thousands apart.
func decimals(x float64, n int) string {
	s := strconv.FormatFloat(math.Abs(x), 'f', n, 64)
	whole, rest, _ := strings.Cut(s, ".")
	for i := len(whole) - 3; i > 0; i -= 3 {
		whole = whole[:i] + "," + whole[i:]
	}
	if rest != "" {
		whole += "." + rest
	}
	if x < 0 && strings.Trim(whole, "0.,") != "" {
		return "−" + whole
	}
	return whole
}

// rounded writes x with as many digits as an error of se warrants; without an error
// with four.
func rounded(x, se float64) string {
	if !finite(x) {
		return "–"
	}
	step := se / 2
	if !(se > 0) || !finite(se) {
		step = math.Abs(x) / 1000
	}
	if step == 0 {
		return "0"
	}
	power := math.Floor(math.Log10(step))
	if power >= 0 {
		p := math.Pow(10, power)
		return decimals(math.Round(x/p)*p, 0)
	}
	return decimals(x, int(min(8, -power)))
}

// percent writes a fraction as per cent.
func percent(x, se float64) string {
	if !finite(x) {
		return "–"
	}
	if !(se > 0) {
		return decimals(100*x, 1) + " %"
	}
	return rounded(100*x, math.Max(100*se, 0.02)) + " %"
}

// value writes a value of an axis.
func (a Axis) value(x, se float64) string {
	if a.Share {
		return percent(x, se)
	}
	return rounded(x, se)
}
