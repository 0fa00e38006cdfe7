package policy

import (
	"context"
	"errors"
	"fmt"
)

// Continue returns the rule of a household that from year from on lives as ahead
// says: the years first … from−1 are solved backwards from ahead's rule of year
// from, with the returns, earnings and pensions that h has in them, and the rest is
// ahead's own. With from equal to h's years everything is solved and ahead is not
// looked at. Curves before first are nil.
//
// It serves problems that change from year to year: a household that at some age
// learns of a change, and knows how long it lasts, follows this rule from that age
// on. That the years from from on are those of ahead's household is the caller's
// part to see to. So is that ahead's entitlement nodes reach as far as h's entitlements
// in year from: beyond them they count as their ends.
//
// Faults are reported as by [Solve].
func Continue(ctx context.Context, h Household, o Options, ahead *Rule, from, first int) (*Rule, error) {
	if err := errors.Join(h.Validate(), o.Validate()); err != nil {
		return nil, err
	}
	T := h.Years()
	if first < 0 || from < first || from > T || from < T && !ahead.continues(h, from) {
		panic(fmt.Sprintf("policy: years %d to %d of %d cannot go on from that rule", first, from-1, T))
	}
	s := NewSolver(from - first)
	if err := s.begin(h, o, ahead, from); err != nil {
		return nil, err
	}
	if from < T {
		for t := from; t < T; t++ {
			s.rule.Curves[t] = ahead.Curves[t]
		}
		s.takeUp(from)
	}
	for t := range first {
		s.rule.Curves[t] = nil
	}
	return s.back(ctx, first, from)
}

// continues reports whether the rule has the shape of h's from year from on.
func (r *Rule) continues(h Household, from int) bool {
	if len(r.Curves) != h.Years() || (r.Entitlements == nil) != (h.pillars() == 0) {
		return false
	}
	n := h.Nodes()
	if r.Entitlements != nil {
		n *= r.Entitlements[from].Len()
	}
	return len(r.Curves[from]) == n
}

// takeUp makes the curves of year t the rule of next year.
func (s *Solver) takeUp(t int) {
	curves := s.rule.Curves[t]
	for j := range s.apart(t) * s.width(t) {
		c := &curves[j]
		if s.lined() {
			s.next.setLines(j, c, make([]float64, len(c.Cash)+1), s.tolerance(), s.shift)
		} else {
			s.next.set(j, c, s.tolerance(), s.shift)
		}
	}
}
