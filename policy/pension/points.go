package pension

// Points are collected by earnings relative to average earnings:
//
//	e_t = e_{t−1} + min(y_t, ceiling_t, Cap_t·W_t)/W_t,
//	pension claimed in year c = factor(c)·Value_c·W_c·e_{c−1}.
//
// Value is the yearly pension of a point in the year of claim as a share of average
// earnings; in payment pensions follow Indexation, whatever Value does then. Points
// bought with contributions are the same law: Value is then the service value over
// the purchase price times the contribution rate.
type Points struct {
	Cap        Parameter // most points of a year, positive; +Inf where there is none
	Value      Parameter // of a point, 0 to 1
	Indexation Index     // of pensions in payment
}

func (*Points) kind() Kind { return PointsKind }

func (*Points) adjusted() bool { return true }

func (p *Points) payment() (Index, int) { return p.Indexation, 0 }

func (p *Points) validate(f *faults) {
	p.Cap.validate(f, "Points.Cap", positive)
	p.Value.validate(f, "Points.Value", fraction)
	p.Indexation.validate(f, "Points.Indexation")
}

func (p *Points) motions(r *resolver, ceiling []float64) []motion {
	m := make([]motion, len(ceiling))
	for t, w := range r.wage {
		m[t] = motion{1, 1 / w, min(ceiling[t], r.at("Points.Cap", p.Cap, t)*w)}
	}
	return m
}

func (p *Points) claimed(r *resolver, c int, _ []float64) claimable {
	return claimable{unit: r.at("Points.Value", p.Value, c) * r.wage[c]}
}
