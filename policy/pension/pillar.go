package pension

// MaxPillars is how many pillars may accrue an entitlement.
const MaxPillars = 2

// Entitlement is what a household has accrued in each pillar, in the order of
// [Law.Kinds]; pillars that there are not stay 0.
type Entitlement = [MaxPillars]float64

// Kind is a kind of pillar.
type Kind int

// The kinds of pillar that accrue an entitlement.
const (
	CareerAverageKind Kind = iota
	PointsKind
	NotionalKind
	FundedKind
)

// String returns the name used in scenario files.
func (k Kind) String() string {
	return [...]string{"career_average", "points", "notional_account", "funded_account"}[k]
}

// field returns the name of the field of [Rules].
func (k Kind) field() string {
	return [...]string{"CareerAverage", "Points", "NotionalAccount", "FundedAccount"}[k]
}

// Unit names the unit of a pillar's entitlement.
func (k Kind) Unit() string {
	switch k {
	case CareerAverageKind:
		return "accrued pension a year, in average earnings"
	case PointsKind:
		return "points, years at average earnings"
	}
	return "balance, in average earnings of a year"
}

// A motion is the law of motion of one year, e′ = grow·e + credit·min(y, cap).
type motion struct{ grow, credit, cap float64 }

// A claimable is what an entitlement pays in the year in which it is claimed:
// unit·F(e) money, F the formula.
type claimable struct {
	unit    float64
	formula *Piecewise // nil: F(e) = e
}

// A pillar is a rule that accrues an entitlement.
type pillar interface {
	kind() Kind
	validate(f *faults)
	// motions returns the law of motion by year, [T].
	motions(r *resolver, ceiling []float64) []motion
	// claimed returns what an entitlement comes to when claimed in year c at a
	// pension level index (of which only ratios count), before any factor for the
	// claim age.
	claimed(r *resolver, c int, index []float64) claimable
	// payment returns how pensions in payment are indexed, and for how many years
	// they are paid, 0 for life.
	payment() (Index, int)
	// adjusted reports whether the factor for the claim age applies.
	adjusted() bool
}
