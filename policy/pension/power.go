package pension

import "math"

// A Power is the two-parameter tax function: of taxable income x, in units of
// average earnings, a household keeps λ·x^(1−τ), so that with W average earnings
//
//	T(x) = x − λ·W·(x/W)^(1−τ),   T′(x) = 1 − (1−τ)·λ·(x/W)^(−τ),   T = 0 for x ≤ 0
//
// (Benabou 2002, Econometrica 70; Heathcote, Storesletten and Violante 2017,
// Quarterly Journal of Economics 132). τ is the progressivity, 1 − λ the average
// tax at average earnings. With τ > 0 low incomes are subsidised, and the first
// crown infinitely so at the margin.
type Power struct {
	keep     float64 // 1 − τ
	scale    float64 // λ·W^τ
	progress float64 // τ
}

// NewPower returns the schedule with level λ > 0, progressivity τ < 1 and average
// earnings W > 0, all finite; else *FieldError values.
func NewPower(level, progressivity, average float64) (*Power, error) {
	var f faults
	if !(level > 0) || math.IsInf(level, 1) {
		f.add("Level", level, powerLevel.want)
	}
	if !powerProgress.ok(progressivity) {
		f.add("Progressivity", progressivity, powerProgress.want)
	}
	if !(average > 0) || math.IsInf(average, 1) {
		f.add("Average", average, "positive and finite")
	}
	if f != nil {
		return nil, f.err()
	}
	return newPower(level, progressivity, average), nil
}

var (
	powerLevel    = limits{"positive and finite", func(x float64) bool { return x > 0 && !math.IsInf(x, 1) }}
	powerProgress = limits{"above -1 and below 1", func(x float64) bool { return x > -1 && x < 1 }}
)

func newPower(level, progressivity, average float64) *Power {
	return &Power{keep: 1 - progressivity, scale: level * math.Pow(average, progressivity), progress: progressivity}
}

// Tax returns the tax on taxable income x, negative where it is a subsidy.
func (p *Power) Tax(x float64) float64 {
	if !(x > 0) {
		return 0
	}
	return x - float64(p.scale*math.Exp(p.keep*math.Log(x)))
}

// Marginal returns T′ on one side of x; −Inf just above 0 if τ > 0.
func (p *Power) Marginal(x float64, side Side) float64 {
	if !side.past(x, 0) {
		return 0
	}
	return 1 - float64(p.keep*p.scale*math.Pow(max(x, 0), -p.progress))
}

// Kinks returns 0, where taxes begin.
func (p *Power) Kinks() []float64 { return []float64{0} }

// reach returns the income from which on the household keeps less than a share of
// the next crown; +Inf where there is none.
func (p *Power) reach(share float64) float64 {
	if p.progress <= 0 || share <= 0 {
		return math.Inf(1)
	}
	return math.Pow(p.keep*p.scale/share, 1/p.progress)
}
