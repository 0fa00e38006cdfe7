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
}

// Amount returns the yearly pension, in money, of a household whose persistent
// part ended working life at node.
func (p Pension) Amount(e *income.Earnings, node int) float64 {
	return float64(p.FinalEarningsRate*e.Base[e.Years()-1][node]) + p.Flat
}
