package output

import "math"

// The values of summary variables that are made of columns, [row]. NaN says that a
// household has none.

// most is the largest ratio that is one: beyond it the denominator is nothing.
const most = 1e12

// rounded returns x to the nearest multiple of 2^-30, about 1e-9. Rules are lines
// over long stretches, on which propensities and changes are the same for all but for
// their last bits: rounded, they are one value that many have, and not a crowd that
// can only be told apart, for nothing, down to the last bit.
func rounded(x float64) float64 {
	const shift = 3 << (51 - 30) // the last bit of a float of this size is 2^-30
	return (x + shift) - shift
}

// propensity is the marginal propensity to consume.
func propensity(r *SummaryRows, to []float64) {
	for k, x := range r.Propensity[:len(to)] {
		to[k] = rounded(x)
	}
}

// precaution is what is held for precaution: assets less those of the certain twin.
func precaution(r *SummaryRows, to []float64) {
	assets, twin := r.Assets[:len(to)], r.TwinAssets[:len(to)]
	for k := range to {
		to[k] = assets[k] - twin[k]
	}
}

// wealthToIncome is assets over net income, of those who have income.
func wealthToIncome(r *SummaryRows, to []float64) {
	assets, income := r.Assets[:len(to)], r.Income[:len(to)]
	for k := range to {
		if to[k] = assets[k] / income[k]; !(income[k] > 0 && math.Abs(to[k]) <= most) {
			to[k] = math.NaN()
		}
	}
}

// runway is for how many months assets pay for consumption: 0 without assets.
// Consumption that is not positive has no end to it, and no runway here.
func runway(r *SummaryRows, to []float64) {
	assets, consumption := r.Assets[:len(to)], r.Consumption[:len(to)]
	for k := range to {
		a, c := assets[k], consumption[k]
		if to[k] = max(0, 12*a/c); !(c > 0 && to[k] <= 12*most) {
			to[k] = forever(a)
		}
	}
}

// forever is the runway of who does not consume: 0 without assets, none with them.
func forever(assets float64) float64 {
	if assets > 0 {
		return math.NaN()
	}
	return 0
}

// change is by what fraction consumption changes from last year's. Who lives its
// first year, or did not consume a positive amount last year, has none.
func change(r *SummaryRows, to []float64) {
	now, last := r.Consumption[:len(to)], r.LastConsumption[:len(to)]
	for k := range to {
		if to[k] = rounded(now[k]/last[k] - 1); !(last[k] > 0 && math.Abs(to[k]) <= most) {
			to[k] = math.NaN()
		}
	}
}

// changeAtJobLoss is change for those who lose their earnings this year.
func changeAtJobLoss(r *SummaryRows, to []float64) {
	change(r, to)
	for k, lost := range r.JobLost[:len(to)] {
		if !lost {
			to[k] = math.NaN()
		}
	}
}
