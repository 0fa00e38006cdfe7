package pension

import "math"

// Assistance is a means-tested benefit that, with income Y and assets A, pays
//
//	max(0, Amount − D_Y − D_A),   D_Y = τ_Y·max(0, Y − exempt_Y),   D_A = τ_A·max(0, A − exempt_A),
//
// or under the stricter of the tests max(0, Amount − max(D_Y, D_A)). Y is the year's
// net income from earnings and pensions, A what was kept at the end of the year
// before (debt counts as 0, for what is exempt is at least 0). Interest does not
// count as income; what assets should earn belongs into τ_A.
type Assistance struct {
	Amount   Parameter // money a year in the base year, at least 0
	FromAge  Parameter // first age at which it is paid
	Income   Test
	Assets   Test
	Stricter bool // the test that takes more counts, in place of the sum of both
	Uprating Index
}

// A Test is what a means test takes per crown above an exempt amount.
type Test struct {
	Exempt Parameter // money in the base year, at least 0
	Taper  Parameter // 0 to 1
}

func (a *Assistance) validate(f *faults) {
	if a == nil {
		return
	}
	a.Amount.validate(f, "Assistance.Amount", notBelow0)
	a.FromAge.validate(f, "Assistance.FromAge", someAge)
	a.Income.validate(f, "Assistance.Income")
	a.Assets.validate(f, "Assistance.Assets")
	a.Uprating.validate(f, "Assistance.Uprating")
}

func (x Test) validate(f *faults, field string) {
	x.Exempt.validate(f, field+".Exempt", notBelow0)
	x.Taper.validate(f, field+".Taper", fraction)
}

// A Support is assistance in one year, in real money. The zero Support pays nothing.
type Support struct {
	Amount                    float64
	IncomeExempt, IncomeTaper float64
	AssetsExempt, AssetsTaper float64
	Stricter                  bool
}

// taken returns D_Y and D_A.
func (s *Support) taken(income, assets float64) (byIncome, byAssets float64) {
	return s.IncomeTaper * max(0, income-s.IncomeExempt), s.AssetsTaper * max(0, assets-s.AssetsExempt)
}

// At returns the benefit with a net pension, other net income and assets.
func (s *Support) At(pension, other, assets float64) float64 {
	if s.Amount == 0 {
		return 0
	}
	y, a := s.taken(pension+other, assets)
	if s.Stricter {
		return max(0, s.Amount-max(y, a))
	}
	return max(0, s.Amount-y-a)
}

// Slopes returns the benefit's slopes in income and in assets, each on one side.
func (s *Support) Slopes(pension, other, assets float64, side Side) (income, asset float64) {
	y, a := s.taken(pension+other, assets)
	left := s.Amount - y - a
	if s.Stricter {
		left = s.Amount - max(y, a)
	}
	if !(left > 0 || left == 0 && side == Below) || s.Amount == 0 {
		return 0, 0
	}
	if side.past(pension+other, s.IncomeExempt) && (!s.Stricter || side.past(y, a)) {
		income = -s.IncomeTaper
	}
	if side.past(assets, s.AssetsExempt) && (!s.Stricter || side.past(a, y)) {
		asset = -s.AssetsTaper
	}
	return income, asset
}

// IncomeKinks returns the incomes at which the benefit bends with the given assets,
// ascending; at the last of them it ends, and the slope of what a household can
// spend rises again: there its problem is not concave.
func (s *Support) IncomeKinks(assets float64) []float64 {
	_, a := s.taken(0, assets)
	return s.bends(s.IncomeExempt, s.IncomeTaper, a)
}

// AssetKinks returns the assets at which the benefit bends with the given income,
// ascending; at the last of them it ends.
func (s *Support) AssetKinks(income float64) []float64 {
	y, _ := s.taken(income, 0)
	return s.bends(s.AssetsExempt, s.AssetsTaper, y)
}

// bends returns the kinks along one test while the other takes the given amount.
func (s *Support) bends(exempt, taper, other float64) []float64 {
	if taper == 0 || s.Amount <= other {
		return nil
	}
	if s.Stricter { // flat until this test takes as much as the other
		return []float64{exempt + other/taper, exempt + s.Amount/taper}
	}
	return []float64{exempt, exempt + (s.Amount-other)/taper}
}

// supports returns assistance by year, [T].
func (a *Assistance) supports(r *resolver) []Support {
	all := make([]Support, len(r.cohort.Survival))
	if a == nil {
		return all
	}
	uprating := r.levels("Assistance.Uprating", a.Uprating)
	amounts := r.amounts("Assistance.Amount", a.Amount, uprating)
	income, assets := r.amounts("Assistance.Income.Exempt", a.Income.Exempt, uprating), r.amounts("Assistance.Assets.Exempt", a.Assets.Exempt, uprating)
	for t := range all {
		if float64(r.cohort.FirstAge+t) < math.Ceil(r.at("Assistance.FromAge", a.FromAge, t)) {
			continue
		}
		all[t] = Support{amounts[t], income[t], r.at("Assistance.Income.Taper", a.Income.Taper, t),
			assets[t], r.at("Assistance.Assets.Taper", a.Assets.Taper, t), a.Stricter}
	}
	return all
}
