package configs

import (
	"fmt"
	"slices"
)

// Mobility is a pair of ages between which moves through the distribution of
// assets are described.
type Mobility struct {
	FromAge, ToAge int
	Quantiles      int // classes of equal size
}

// mobilityStep is how many years later a household is looked at again.
const mobilityStep = 20

// mobility reads pairs of ages: a block, or a list of blocks. The default is one
// pair, 35 and 55 where life has them.
func (s *section) mobility(sc *Scenario) []Mobility {
	const key = "mobility"
	v := s.child(key, false)
	s.docMobility(key, sc)
	if v == nil {
		v = &node{kind: list, values: []*node{{kind: mapping}}}
		if s.n == nil {
			return nil // only the format is wanted
		}
	}
	entries := []*node{v}
	if v.kind == list {
		entries = v.values
	}
	if len(entries) > 20 {
		s.fault(v, key, "has %d entries, want at most 20", len(entries))
		return nil
	}
	if len(entries) == 0 {
		s.out.put(key, "[]")
		return nil
	}
	out := s.out.branch(key)
	var all []Mobility
	for i, e := range entries {
		path := key
		if v.kind == list {
			path = fmt.Sprintf("%s[%d]", key, i)
		}
		if e.kind != mapping {
			s.fault(e, path, "is %s, want {from_age, to_age, quantiles}, or a list of such blocks", e.show())
			continue
		}
		if e.source == "" { // the default
			e = &node{kind: mapping, source: s.n.source, line: s.n.line, column: s.n.column}
		}
		sub := &section{w: s.w, path: join(s.path, path), n: e, out: new(tree)}
		m := readMobility(sub, sc)
		sub.done()
		if out != nil {
			out.items = append(out.items, sub.out)
		}
		if slices.Contains(all, m) {
			s.fault(e, path, "stands twice: ages %d and %d, %d quantiles", m.FromAge, m.ToAge, m.Quantiles)
		}
		all = append(all, m)
	}
	return all
}

// readMobility reads one pair of ages. With the ages of life unknown, because they
// are at fault, anything goes.
func readMobility(s *section, sc *Scenario) Mobility {
	first, last := 0, 120
	if sc.LastAge > 0 {
		first, last = sc.FirstAge, sc.LastAge
	}
	from := 35
	if from < first || from >= last {
		from = first
	}
	m := Mobility{FromAge: int(s.integer(number{key: "from_age", meaning: "first age, years; without it 35, or the first age of life", in: within(float64(first), float64(last-1)), def: float64(from)}))}
	m.ToAge = int(s.integer(number{key: "to_age", meaning: "second age, years, above from_age; without it 20 years later, or the last age of life", in: within(float64(first+1), float64(last)), def: float64(min(m.FromAge+mobilityStep, last))}))
	if s.n != nil && m.ToAge <= m.FromAge {
		s.at("to_age", "is %d, want above from_age, %d", m.ToAge, m.FromAge)
	}
	m.Quantiles = int(s.integer(number{key: "quantiles", meaning: "classes of assets, equal parts of the households alive at both ages", in: within(2, 20), def: 5}))
	return m
}

// docMobility describes the key in the schema.
func (s *section) docMobility(key string, sc *Scenario) {
	if s.doc == nil {
		return
	}
	inside := new(schema)
	readMobility(&section{w: &walk{faults: new(faults)}, path: join(s.path, key), doc: inside}, sc)
	for _, age := range []string{"from_age", "to_age"} {
		delete(inside.properties[age].(map[string]any), "default") // depends on the ages of life
	}
	one := inside.object()
	s.doc.put(key, false, map[string]any{"anyOf": []any{one, map[string]any{"type": "array", "items": one, "maxItems": 20}},
		"description": "moves between quantiles of assets from one age to another; [] for none"})
}
