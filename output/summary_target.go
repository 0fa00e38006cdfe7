package output

import (
	"fmt"
	"math"
	"slices"

	"cistern/output/distribution"
)

// target is a set of cells that is described as one: an age, a band or all ages,
// of one group or of all.
type target struct {
	first, last int // ages
	group       int // index, −1 for everybody
	band        int // index into Bands, −1 for a row of the table
	whole       bool
}

// newTargets lists what the table needs, groups before everybody and ages
// ascending, all ages together last; then the bands in the same order.
func newTargets(o *SummaryOptions) []target {
	groups := []int{-1}
	if slices.Contains(o.By, ByGroup) {
		groups = append(seq(len(o.Groups)), -1)
	}
	var list []target
	for _, g := range groups {
		if slices.Contains(o.By, ByAge) {
			for a := o.FirstAge; a <= o.LastAge; a++ {
				list = append(list, target{a, a, g, -1, false})
			}
		}
		list = append(list, target{o.FirstAge, o.LastAge, g, -1, true})
	}
	for _, g := range append(seq(len(o.Groups)), -1) {
		for i, b := range o.Bands {
			list = append(list, target{b.First, b.Last, g, i, false})
		}
	}
	return list
}

// independent reports whether the rows of the target are independent, one a
// household.
func (t *target) independent() bool { return t.first == t.last }

// cells lists the cells of the target with their weights: where births grow, an
// age is the rarer the longer ago its households were born.
func (t *target) cells(o *SummaryOptions) []distribution.Cell {
	var list []distribution.Cell
	for a := t.first; a <= t.last; a++ {
		for g := range o.Groups {
			if t.group < 0 || t.group == g {
				list = append(list, distribution.Cell{Index: (a-o.FirstAge)*len(o.Groups) + g, Weight: o.weight(a)})
			}
		}
	}
	return list
}

func (o *SummaryOptions) weight(age int) float64 {
	return math.Pow(1+o.Growth, -float64(age-o.FirstAge))
}

// wants returns what the target needs of a variable: a band the median of assets,
// everybody of an age and all ages of a group all there is, a group at an age
// percentiles and the Gini coefficient, since few households are in its tails.
func (t *target) wants(v *summaryVariable) distribution.Set {
	switch {
	case t.band >= 0 && v.key == "assets":
		return distribution.Median
	case t.band >= 0:
		return 0
	case t.whole || t.group < 0:
		return v.wants
	}
	return v.wants & (distribution.Percentiles | distribution.Gini)
}

// newStudy makes the study of the variables that are there.
func (s *Summary) newStudy() error {
	o := &s.o
	years := int64(o.LastAge - o.FirstAge + 1)
	d := distribution.Options{Cells: int(years) * len(o.Groups), Percentiles: o.Percentiles, Lorenz: o.Lorenz, TopShares: o.TopShares, Shortfalls: o.Shortfalls,
		Rows: o.Households * years, Workers: o.Workers, Budget: o.MemoryBudget}
	if o.Tail > 0 {
		d.Tails = []float64{o.Tail}
	}
	if v := s.variable("propensity"); v >= 0 {
		d.Classes, d.Means = wealthClasses, []int{v}
	}
	for i := range s.variables {
		v := &s.variables[i]
		variable := distribution.Variable{Name: v.key, Optional: v.gaps, MeanOnly: v.wants == 0, Held: v.wants != 0}
		if v.shares != nil {
			for _, share := range v.shares(o) {
				variable.Shares = append(variable.Shares, share.at)
			}
		}
		d.Variables = append(d.Variables, variable)
	}
	for i := range s.targets {
		t := &s.targets[i]
		to := distribution.Target{Cells: t.cells(o), Independent: t.independent()}
		for v := range s.variables {
			wants := t.wants(&s.variables[v])
			if d.Classes == 0 {
				wants &^= distribution.Classes
			}
			to.Wants = append(to.Wants, wants)
		}
		d.Targets = append(d.Targets, to)
	}
	var err error
	if s.study, err = distribution.NewStudy(d); err != nil {
		return fmt.Errorf("output: summary: %w", err)
	}
	return nil
}

// households counts the households of a target, each once: those alive at its
// youngest age, since households leave by death only.
func (s *Summary) households(t *target) int64 {
	groups := len(s.o.Groups)
	var sum int64
	for g := range groups {
		if t.group >= 0 && t.group != g {
			continue
		}
		var most int64
		for a := t.first; a <= t.last; a++ {
			most = max(most, s.study.CellRows((a-s.o.FirstAge)*groups+g))
		}
		sum += most
	}
	return sum
}

func seq(n int) []int {
	s := make([]int, n)
	for i := range s {
		s[i] = i
	}
	return s
}
