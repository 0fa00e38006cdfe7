package sim

import (
	"errors"
	"fmt"
	"math"

	"cistern/policy"
)

// Unit is the number of households of a block. It is fixed, so that nothing can
// depend on how blocks are shared out.
const Unit = 4096

// Type is a set of households that share a rule: a group, or the part of a group
// with one discount factor.
type Type struct {
	Group int          // index into Population.Groups
	Rule  *policy.Rule // how they consume
	Twin  *policy.Rule // how their certain twins do; nil: no twins
	Start Start        // assets at the start
}

// Start is the law of a household's assets at the end of the year before its
// first, in money: zero with probability ZeroShare, otherwise lognormal with the
// given median; or Constant where Median is 0.
type Start struct {
	Median    float64 // > 0, or 0 for Constant
	LogSD     float64 // ≥ 0
	ZeroShare float64 // from 0 to 1
	Constant  float64
}

// Group is a part of the population.
type Group struct {
	Name  string
	Share float64 // of households; all shares sum to 1
	Types []int   // into Population.Types: equally likely, drawn at birth
}

// Population is what is simulated. Household ids run from 0 to Households−1.
type Population struct {
	Seed       uint64
	Households int64
	Groups     []Group
	Types      []Type
}

// Years returns the number of years of the longest possible life.
func (p *Population) Years() int { return p.Types[0].Rule.Household.Years() }

// GroupOf returns the group of a household: the fractional part of
// id·0.6180339887498949 among the cumulated shares. Multiples of the golden ratio
// are spread so evenly that any range of ids has the groups in their shares, to
// within a few households.
func (p *Population) GroupOf(id int64) int {
	const golden = 0.6180339887498949
	x := float64(id) * golden
	x -= math.Floor(x)
	sum := 0.0
	for g := range p.Groups {
		sum += p.Groups[g].Share
		if x < sum {
			return g
		}
	}
	return len(p.Groups) - 1
}

// Validate reports every fault of the population at once.
func (p *Population) Validate() error {
	var errs []error
	bad := func(format string, args ...any) { errs = append(errs, fmt.Errorf("sim: "+format, args...)) }
	if p.Households < 1 {
		bad("households: is %d, want at least 1", p.Households)
	}
	if len(p.Groups) == 0 || len(p.Types) == 0 {
		bad("a population needs a group and a type")
		return errors.Join(errs...)
	}
	sum := 0.0
	for g, group := range p.Groups {
		sum += group.Share
		if !(group.Share >= 0) {
			bad("share of group %s: is %v, want at least 0", group.Name, group.Share)
		}
		if len(group.Types) == 0 {
			bad("group %s has no type", group.Name)
		}
		for _, i := range group.Types {
			if i < 0 || i >= len(p.Types) || p.Types[i].Group != g {
				bad("group %s: type %d is not one of its own", group.Name, i)
			}
		}
	}
	if !(math.Abs(sum-1) < 1e-9) {
		bad("shares sum to %v, want 1", sum)
	}
	years := 0 // of the first type that has a rule
	for i, t := range p.Types {
		if t.Rule != nil && years == 0 {
			years = t.Rule.Household.Years()
		}
		errs = append(errs, t.validate(i, years))
	}
	return errors.Join(errs...)
}

func (t Type) validate(i, years int) error {
	var errs []error
	bad := func(format string, args ...any) {
		errs = append(errs, fmt.Errorf("sim: type %d: "+format, append([]any{i}, args...)...))
	}
	if t.Rule == nil {
		bad("has no rule")
		return errors.Join(errs...)
	}
	if n := t.Rule.Household.Years(); n != years {
		bad("lives up to %d years, others %d", n, years)
	}
	if n := t.Rule.Household.Nodes(); n > 256 {
		bad("has %d persistent nodes, want at most 256", n)
	}
	if t.Twin != nil && t.Twin.Household.Years() != years {
		bad("its twin lives up to %d years, others %d", t.Twin.Household.Years(), years)
	}
	s := t.Start
	if !(s.Median >= 0) || !(s.LogSD >= 0) || !(s.ZeroShare >= 0 && s.ZeroShare <= 1) || math.IsNaN(s.Constant) ||
		math.IsInf(s.Median, 1) || math.IsInf(s.LogSD, 1) || math.IsInf(s.Constant, 0) {
		bad("start assets %+v, want median and log_sd at least 0, zero_share from 0 to 1, all finite", s)
	}
	return errors.Join(errs...)
}
