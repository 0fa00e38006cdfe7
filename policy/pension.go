package policy

import "cistern/income"

// Pension is the public pension paid every year from ClaimAge on: a share of the
// final earnings that the persistent part supports, plus a flat amount,
//
//	FinalEarningsRate · P_c·exp(z_c − κ_c) + Flat   (form log),
//	FinalEarningsRate · (P_c + z_c) + Flat          (form level),
//
// c the last working age.
type Pension struct {
	ClaimAge          int     // first age at which it is paid
	FinalEarningsRate float64 // share of final persistent earnings
	Flat              float64 // money a year

	// Worth, if set, is what a crown of pension is worth in each year of life, [T]:
	// below 1 while pensions lag behind prices. Nil means 1 throughout.
	Worth []float64
}

// Amount returns the yearly pension, in money, of a household whose persistent
// part ended working life at node, before Worth.
func (p Pension) Amount(e *income.Earnings, node int) float64 {
	return float64(p.FinalEarningsRate*e.Final(node)) + p.Flat
}

// PensionIn returns the pension of year t, in money.
func (h Household) PensionIn(t, node int) float64 {
	amount := h.Pension.Amount(h.Earnings, node)
	if h.Pension.Worth != nil {
		amount *= h.Pension.Worth[t]
	}
	return amount
}
