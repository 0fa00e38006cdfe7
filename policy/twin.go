package policy

import "cistern/income"

// Twin returns the certain twin: the same household with every income shock
// replaced by its mean at that age, so that the persistent part, the transitory
// shock and job loss are off while mean income at every age is untouched. What
// the household saves beyond its twin is precautionary (Leland 1968, Quarterly
// Journal of Economics 82; Kimball 1990, Econometrica 58). Under Laws the twin earns
// mean earnings and the laws make of them what they do: mean net income differs
// where they are progressive.
func (h Household) Twin() (Household, error) {
	process := income.Process{
		FirstAge:   h.FirstAge,
		Profile:    make([]float64, h.WorkingYears()),
		Form:       income.Level,
		Chain:      income.Degenerate(),
		Initial:    []float64{1},
		Transitory: income.Transitory{Nodes: 1},
	}
	for t := range process.Profile {
		process.Profile[t] = h.Earnings.Mean(t)
	}
	earnings, err := process.Build()
	if err != nil {
		return Household{}, err
	}
	twin := h
	twin.Earnings = earnings
	if h.Laws != nil {
		return twin, nil
	}
	twin.Pension.FinalEarningsRate, twin.Pension.Flat = 0, 0
	if h.WorkingYears() < h.Years() {
		whole := h
		whole.Pension.Worth = nil // the twin's pension lags behind prices as h's does
		twin.Pension.Flat = whole.MeanIncome(h.WorkingYears())
	}
	return twin, nil
}
