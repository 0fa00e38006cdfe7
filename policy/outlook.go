package policy

import "math"

// outlook is what laws make of next year's income outcomes, seen from each
// persistent node and this year's entitlement nodes that are solved together:
// arrays are [node][entitlement][outcome].
type outlook struct {
	outcomes int
	income   []float64
	next     []Entitlement
	weights  []float64 // [outcome]
	atom     []bool    // [outcome] not from a shock that is continuous in truth
	from     int       // first persistent node
	low      int       // first entitlement node
	width    int       // entitlement nodes
	pension  [1]float64
}

// at returns where the outcomes of a node and an entitlement node begin.
func (l *outlook) at(node, k int) int { return ((node-l.from)*l.width + k - l.low) * l.outcomes }

// lookAhead prepares the outcomes of year t, the next, for the nodes in [from, to)
// and the entitlement nodes in [low, high) of the year before.
func (s *Solver) lookAhead(t, from, to, low, high int) {
	if s.h.Laws == nil || !s.h.Working(t) {
		return
	}
	l := &s.outlook
	l.from, l.low, l.width = from, low, high-low
	l.income, l.next, l.weights, l.atom = l.income[:0], l.next[:0], l.weights[:0], l.atom[:0]
	continuous := s.h.Earnings.TransitorySD(t) > 0
	for j := from; j < to; j++ {
		for k := low; k < high; k++ {
			e, first := s.entitlement(t-1, k), j == from && k == low
			s.h.outcomes(t, j, func(earnings float64, employed bool, weight float64) {
				y, next := s.h.Laws.Work(t, e, earnings, employed)
				l.income, l.next = append(l.income, y), append(l.next, next)
				if first {
					l.weights, l.atom = append(l.weights, weight), append(l.atom, !continuous || !employed)
				}
			})
		}
	}
	l.outcomes = len(l.weights)
}

// entitlement returns the entitlement at node k of year t.
func (s *problem) entitlement(t, k int) Entitlement {
	if s.grids == nil {
		low, _ := s.h.Laws.Initial()
		return low
	}
	return s.grids[t].Node(k)
}

// incomes returns the net incomes of year t, the next, with their probabilities,
// for a household at persistent node j that this year has entitlement node k.
func (s *Solver) incomes(t, j, k int) (values, weights []float64) {
	l := &s.outlook
	switch {
	case s.h.Laws == nil:
		return s.h.Income(t, j)
	case s.h.Working(t):
		at := l.at(j, k)
		return l.income[at : at+l.outcomes], l.weights
	}
	l.pension[0] = s.h.Laws.Pension(t, s.entitlement(t, k), s.h.Earnings.Final(j))
	return l.pension[:], certainty
}

// blends reports whether what follows in year t, the next, lies between
// entitlement nodes: while it is worked and there are several.
func (s *Solver) blends(t int) bool { return s.h.Working(t) && s.width(t) > 1 }

// pensionsAlike reports whether after the claim nothing depends on the persistent
// node any more.
func (h Household) pensionsAlike(grids []EntitlementGrid) bool {
	if grids == nil {
		return false
	}
	e := h.Earnings
	for t := h.WorkingYears(); t < h.Years(); t++ {
		for k := range grids[t].Len() {
			x := grids[t].Node(k)
			one := h.Laws.Pension(t, x, e.Final(0))
			for j := 1; j < h.Nodes(); j++ {
				if h.Laws.Pension(t, x, e.Final(j)) != one {
					return false
				}
			}
		}
	}
	return true
}

// blended holds rows that are summed over entitlement nodes.
type blended struct {
	consumption, propensity []float64   // of the sum
	rows                    [][]float64 // consumption at each entitlement node
	held                    []bool      // which rows are there
}

// expectBlended is expect for the outcomes of persistent node j in year t that lie
// between entitlement nodes.
func (s *Solver) expectBlended(t, j, from, to, low, high int) {
	w, l := &s.work, &s.outlook
	for k := low; k < high && s.kind == exponentialKind && j == from; k++ {
		s.referBlended(&s.grounds[k-low], t, j, k)
	}
	for o, weight := range l.weights {
		if weight == 0 {
			continue
		}
		alike := s.lined() && s.alike(j, o, low, high)
		s.startRows(s.width(t), len(w.mixValue))
		for k := low; k < high; k++ {
			g, row, at := &s.grounds[k-low], (k-low)*(to-from)+j-from, l.at(j, k)+o
			var b blend
			s.grids[t].blend(l.next[at], &b)
			switch {
			case s.lined():
				s.expectLines(t, j, g, &b, l.income[at], weight, alike, w.value[row])
			default:
				s.readBlend(t, j, g.gross, &b, l.income[at])
				s.addMarginal(g, weight, w.value[row], w.slope[row])
			}
			s.rule.Updates += int64(len(g.assets))
		}
	}
}

// alike reports whether outcome o at node j leads to the same cash-on-hand from
// every entitlement node.
func (s *Solver) alike(j, o, low, high int) bool {
	l, g := &s.outlook, s.grounds
	for k := low + 1; k < high; k++ {
		if l.income[l.at(j, k)+o] != l.income[l.at(j, low)+o] || g[k-low].assets[0] != g[0].assets[0] {
			return false
		}
	}
	return true
}

func (s *Solver) startRows(nodes, n int) {
	b := &s.work.blended
	for len(b.rows) < nodes {
		b.rows, b.held = append(b.rows, nil), append(b.held, false)
	}
	for i := range b.rows {
		b.rows[i] = room(b.rows[i], n)
	}
	clear(b.held)
}

// expectLines adds expected marginal utility where rules are lines: each line rule
// is read once for an outcome that is alike at every entitlement node.
func (s *Solver) expectLines(t, j int, g *ground, b *blend, y, weight float64, alike bool, value []float64) {
	w := &s.work.blended
	for i := range b.n {
		k := b.node[i]
		if !alike || !w.held[k] {
			readLines(s.next.lines[s.state(t, j, k)], y, g.gross, w.rows[k])
			w.held[k] = true
		}
	}
	switch b.n {
	case 1:
		addPair(s.forward, weight, 1, w.rows[b.node[0]], 0, w.rows[b.node[0]], value[:len(g.gross)])
	case 2:
		addPair(s.forward, weight, b.weight[0], w.rows[b.node[0]], b.weight[1], w.rows[b.node[1]], value[:len(g.gross)])
	default:
		c := room(w.consumption, len(g.gross))
		w.consumption = c
		clear(c)
		for i := range b.n {
			addScaled(c, b.weight[i], w.rows[b.node[i]])
		}
		addPair(s.forward, weight, 1, c, 0, c, value[:len(g.gross)])
	}
}

// readBlend reads next year's rule (of year t) at node j between entitlement nodes,
// with cash-on-hand gross + y.
func (s *Solver) readBlend(t, j int, gross []float64, b *blend, y float64) {
	w := &s.work.blended
	w.consumption, w.propensity = room(w.consumption, len(gross)), room(w.propensity, len(gross))
	clear(w.consumption)
	clear(w.propensity)
	kink := s.kinkOf(t, j, b)
	for i := range b.n {
		state := s.state(t, j, b.node[i])
		readSegments(s.next.segments[state], y+s.grids[t].shift(s.rule.Curves[t][state].Cash[0], kink), b.weight[i], gross, w.consumption, w.propensity)
	}
}

// kinkOf returns the cash-on-hand at which the limit stops binding in year t, the
// next, between entitlement nodes.
func (s *Solver) kinkOf(t, j int, b *blend) float64 {
	kink := 0.0
	for i := range b.n {
		kink += b.weight[i] * s.rule.Curves[t][s.state(t, j, b.node[i])].Cash[0]
	}
	return kink
}

// referBlended is refer between entitlement nodes.
func (s *Solver) referBlended(g *ground, t, j, k int) {
	l := &s.outlook
	at := l.at(j, k)
	worst := 0
	for o, y := range l.income[at : at+l.outcomes] {
		if y < l.income[at+worst] {
			worst = o
		}
	}
	var b blend
	s.grids[t].blend(l.next[at+worst], &b)
	s.readBlend(t, j, g.gross, &b, l.income[at+worst])
	copy(g.reference, s.work.consumption)
}

// sightBlended is sight for the rule of year t, the next, at node j between
// entitlement nodes, seen from entitlement node k. Kinks that a continuous shock
// smooths away in truth are left out: they are the quadrature's own. The limit's
// kink is where the blend has it; later ones are those of the nearest node.
func (s *Solver) sightBlended(g *ground, t, j, k int) {
	l := &s.outlook
	at := l.at(j, k)
	for o, weight := range l.weights {
		if weight == 0 || !l.atom[o] {
			continue
		}
		var b blend
		s.grids[t].blend(l.next[at+o], &b)
		main := 0
		for i := range b.n {
			if b.weight[i] > b.weight[main] {
				main = i
			}
		}
		first := s.kinkOf(t, j, &b)
		state := s.state(t, j, b.node[main])
		shift := s.grids[t].shift(s.rule.Curves[t][state].Cash[0], first)
		for _, kink := range s.next.kinks[state] {
			if l.outcomes > 1 && !kink.first && kink.jump*weight <= s.o.KinkThreshold {
				continue
			}
			kink.cash -= shift
			if b.n > 1 {
				kink.consumption = s.readPoint(t, j, &b, kink.cash)
			}
			g.kinks = append(g.kinks, sighting{assets: (kink.cash - l.income[at+o]) / s.returns, node: int32(j), consumption: kink.consumption, delta: kink.jump, weight: weight})
		}
	}
}

// readPoint reads next year's rule (of year t) at node j between entitlement nodes
// with cash-on-hand m: consumption as in the records of segments, plus subsistence.
func (s *Solver) readPoint(t, j int, b *blend, m float64) float64 {
	kink, c := s.kinkOf(t, j, b), s.shift
	for i := range b.n {
		state := s.state(t, j, b.node[i])
		x := m + s.grids[t].shift(s.rule.Curves[t][state].Cash[0], kink)
		y, _ := find(s.next.segments[state], x).at(x)
		c += b.weight[i] * y
	}
	return c
}

// shift returns how much further along the rule with its kink at own is read than
// the sum with its kink at kink.
func (g *EntitlementGrid) shift(own, kink float64) float64 {
	if !g.aligned {
		return 0
	}
	return own - kink
}

// addMarginal adds the marginal utility of the summed rows, an outcome of the given
// probability, to value and what goes with it to slope (see expect).
func (s *Solver) addMarginal(g *ground, weight float64, value, slope []float64) {
	n := len(g.gross)
	c, d := s.work.consumption[:n], s.work.propensity[:n]
	value, slope = value[:n], slope[:n]
	switch s.kind {
	case powerKind:
		addPower(s.forward, weight, c, d, value, slope)
	case exponentialKind:
		for i, x := range c {
			v := weight * math.Exp(-s.alpha*(x-g.reference[i]))
			value[i] += v
			slope[i] += v * d[i]
		}
	case linearKind:
		for i, x := range c {
			value[i] += weight * (s.bliss - x)
			slope[i] += weight * d[i]
		}
	default:
		for i, x := range c {
			v := weight * s.u.Marginal(x)
			value[i] += v
			slope[i] += v * s.u.AbsoluteRiskAversion(x) * d[i]
		}
	}
}
