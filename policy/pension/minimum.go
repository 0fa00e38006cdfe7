package pension

// A MinimumPension tops pensions up: with pension income P the top-up is
//
//	max(0, Amount − Taper·P).
//
// Taper 1 is a guarantee, max(P, Amount); below 1 part of a household's own pension
// stays on top of it; 0 is a supplement for every pensioner. What is topped up is
// the sum of all pillars, whatever the claim age.
type MinimumPension struct {
	Amount   Parameter // money a year in the base year, at least 0
	Taper    Parameter // 0 to 1
	Uprating Index
}

func (m *MinimumPension) validate(f *faults) {
	if m == nil {
		return
	}
	m.Amount.validate(f, "Minimum.Amount", notBelow0)
	m.Taper.validate(f, "Minimum.Taper", fraction)
	m.Uprating.validate(f, "Minimum.Uprating")
}

// A topUp is a minimum pension in one year, in real money.
type topUp struct{ amount, taper float64 }

// at returns the top-up of a pension.
func (m topUp) at(pension float64) float64 { return max(0, m.amount-float64(m.taper*pension)) }

// slope returns its slope on one side of a pension.
func (m topUp) slope(pension float64, side Side) float64 {
	left := m.amount - float64(m.taper*pension)
	if left > 0 || left == 0 && side == Below {
		return -m.taper
	}
	return 0
}

// kinks returns where it bends, among positive pensions.
func (m topUp) kinks() []float64 {
	if m.amount > 0 && m.taper > 0 {
		return []float64{m.amount / m.taper}
	}
	return nil
}
