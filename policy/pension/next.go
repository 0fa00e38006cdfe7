package pension

// Years returns T, the number of years from the first to the last possible age.
func (l *Law) Years() int { return len(l.years) }

// Rules returns the rules that the law comes from; they must not be changed.
func (l *Law) Rules() *Rules { return &l.rules }

// Kinds returns the kinds of the pillars that accrue an entitlement, in the order
// of [Entitlement].
func (l *Law) Kinds() []Kind {
	kinds := make([]Kind, len(l.pillars))
	for i, p := range l.pillars {
		kinds[i] = p.kind
	}
	return kinds
}

// Claims returns the years of the first pension: at the statutory age, at the
// earliest and at the latest claim.
func (l *Law) Claims() (normal, earliest, latest int) {
	return l.claims.normal, l.claims.earliest, l.claims.latest
}

// Wage returns average earnings in year t, money.
func (l *Law) Wage(t int) float64 { return l.years[t].wage }

// Next returns the entitlement after year t of a household that entered it with e,
// has not claimed, and has gross earnings, or without employment a benefit. It does
// not fall with either.
func (l *Law) Next(t int, e Entitlement, earnings float64, employed bool) Entitlement {
	y := &l.years[t]
	if !employed && !y.onBenefits {
		earnings = 0
	}
	a, b := &y.motion[0], &y.motion[1]
	e[0] = float64(a.grow*e[0]) + float64(a.credit*capped(earnings, a.cap))
	if b.cap > 0 { // there is a second pillar
		e[1] = float64(b.grow*e[1]) + float64(b.credit*capped(earnings, b.cap))
	}
	return e
}

// Growth returns the slopes of [Law.Next] in the entitlements: pillar by pillar
// what becomes of a unit.
func (l *Law) Growth(t int) Entitlement {
	var g Entitlement
	for i := range l.pillars {
		g[i] = l.years[t].motion[i].grow
	}
	return g
}

// NextSlopes returns the slopes of [Law.Next] in earnings, on one side.
func (l *Law) NextSlopes(t int, earnings float64, employed bool, side Side) Entitlement {
	y := &l.years[t]
	var d Entitlement
	if !employed && !y.onBenefits {
		return d
	}
	for i := range l.pillars {
		d[i] = y.motion[i].credit * cappedSlope(earnings, y.motion[i].cap, side)
	}
	return d
}

// NextKinks returns the earnings at which [Law.Next] bends, ascending.
func (l *Law) NextKinks(t int, employed bool) []float64 {
	y := &l.years[t]
	if !employed && !y.onBenefits {
		return nil
	}
	var kinks []float64
	for i := range l.pillars {
		if y.motion[i].credit > 0 {
			kinks = append(kinks, 0, y.motion[i].cap)
		}
	}
	return tidy(kinks)
}
