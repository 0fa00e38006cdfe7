package configs

import (
	"slices"
	"strings"

	"cistern/policy"
	"cistern/sim"
	"cistern/sim/decomposition"
)

// Experiments says which experiments a run makes beside its panel; nil: not made.
type Experiments struct {
	Transfer      *Transfer
	Decomposition *Decomposition
}

// Decomposition takes mean wealth apart by what it is held for.
type Decomposition struct {
	Order      []string // what is removed, one after the other: income_risk, longevity_risk, borrowing_limit
	Households int64    // the first so many; 0: all
}

// Transfer is an unexpected one-off transfer, or bill, to every household.
type Transfer struct {
	Amount float64 // money, not 0; negative: a bill
	Ages   []int   // of receipt, ascending
	Years  int     // looked at after that of receipt
}

func readExperiments(s *section, sc *Scenario) {
	e := s.optional("experiments", "experiments on the simulated households; each is made if its block is there")
	if e == nil {
		return
	}
	sc.Experiments.Transfer = readTransfer(e, sc)
	sc.Experiments.Decomposition = readDecomposition(e, sc)
	e.done()
}

func readDecomposition(e *section, sc *Scenario) *Decomposition {
	s := e.optional("decomposition", "mean wealth taken apart: how much is held because income is risky, life of uncertain length, borrowing limited")
	if s == nil {
		return nil
	}
	causes := []string{"income_risk", "longevity_risk", "borrowing_limit"}
	d := &Decomposition{Order: s.words("order", "what is removed, one after the other", causes, causes...)}
	if v := s.n.get("order"); v != nil && v.kind == list && len(v.values) == 0 {
		s.at("order", "is empty, want at least one of income_risk, longevity_risk and borrowing_limit")
	}
	for _, g := range sc.Groups {
		if g.Household.Utility == nil {
			continue // not built: at fault already
		}
		if err := decomposition.Feasible(g.Household, d.Causes()); err != nil {
			s.at("order", "%s, in group %s; leave it out, or remove it later", strings.ReplaceAll(err.Error(), "\n", "; "), g.Name)
			break
		}
	}
	d.Households = s.integer(number{key: "households", meaning: "the first so many households live again without each cause; 0: all", in: within(0, sim.Unit*1_000_000), def: 0})
	s.done()
	return d
}

// Causes returns Order as the experiment knows it.
func (d *Decomposition) Causes() (order []decomposition.Cause) {
	for _, name := range d.Order {
		for c := decomposition.IncomeRisk; c <= decomposition.BorrowingLimit; c++ {
			if c.String() == name {
				order = append(order, c)
			}
		}
	}
	return order
}

// passes returns how many times households live again, and how many times as many
// problems with risky income are solved as in a run without the experiment: one for
// each length of life, half as long on average, where death is known. (Those with
// certain income take next to nothing.)
func (d *Decomposition) passes(years int) (passes, problems float64) {
	passes = 1 // with all causes
	known, risky := false, true
	for _, c := range d.Causes() {
		known, risky = known || c == decomposition.LongevityRisk, risky && c != decomposition.IncomeRisk
		passes++
		if known {
			passes++ // to see who lives how long
		}
		switch {
		case risky && known:
			problems += float64(years+1) / 2
		case risky:
			problems++
		}
	}
	return passes, problems
}

func readTransfer(e *section, sc *Scenario) *Transfer {
	s := e.optional("transfer", "what households do with money that they did not expect, paid out once at the beginning of a year")
	if s == nil {
		return nil
	}
	const most = 1e12
	t := &Transfer{Amount: s.number(number{key: "amount", meaning: "money, not 0; negative: a bill", in: within(-most, most), def: 1, required: true})}
	if s.n != nil && t.Amount == 0 {
		s.at("amount", "is 0, want an amount above 0, or below 0 for a bill")
	}
	t.Ages = s.ages("ages", "ages of receipt, years: whoever is alive receives it at each of them, every time in a life of its own; without it the first age and all that end in 0 or 5", sc)
	t.Years = int(s.integer(number{key: "years", meaning: "years to look at after that of receipt", in: within(0, 60), def: 5}))
	s.done()
	return t
}

// ages reads a list of distinct ages within life, and returns them ascending. The
// default is the first age and every fifth.
func (s *section) ages(key, meaning string, sc *Scenario) []int {
	in := within(0, 120)
	if sc.LastAge > 0 {
		in = within(float64(sc.FirstAge), float64(sc.LastAge))
	}
	var def []int
	for age := sc.FirstAge; s.doc == nil && age <= sc.LastAge; age++ {
		if age == sc.FirstAge || age%5 == 0 {
			def = append(def, age)
		}
	}
	ages := s.integers(number{key: key, meaning: meaning, in: in}, def, 121)
	for i, age := range ages {
		if slices.Contains(ages[:i], age) {
			s.fault(s.n.get(key), key, "has %d twice", age)
		}
	}
	return slices.Sorted(slices.Values(ages))
}

// secondLife is the expected number of years that a household lives with the
// transfer, over all ages of receipt.
func (t *Transfer) secondLife(h policy.Household) (years float64) {
	alive := 1.0
	lived := make([]float64, h.Years()) // [t] chance to live to it
	for y, s := range h.Survival {
		lived[y] = alive
		alive *= s
	}
	for _, age := range t.Ages {
		from := age - h.FirstAge
		for y := from; y <= min(from+t.Years, h.Years()-1); y++ {
			years += lived[y]
		}
	}
	return years
}

// bytes is what the experiment's sums and second lives take: 64 numbers of eight
// bytes for every figure, band of ten years, group and fifth of wealth, once for
// every worker and once in all, and ten bytes a household of a block and age.
func (t *Transfer) bytes(groups, workers int) float64 {
	bands := float64(t.Ages[len(t.Ages)-1]-t.Ages[0])/10 + 2
	figures := float64(4 + 2*(t.Years+1))
	return 64*8*figures*bands*float64(groups)*5*float64(workers+1) + float64(workers*len(t.Ages))*sim.Unit*10
}
