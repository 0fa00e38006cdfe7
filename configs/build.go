package configs

import (
	"errors"
	"math"
	"strings"

	"cistern/income"
	"cistern/policy"
)

// build puts a household together. Where that is not possible it reports why, at
// the keys concerned, and returns what there is.
func (d *draft) build(s *section, in *files) Group {
	g := Group{Process: Process{d.process.Autocorrelation, d.process.InnovationSD, d.method, d.points, d.initial}}
	before := len(s.w.faults.list)
	survival := d.buildSurvival(s, in)
	profile := d.buildProfile(s, in)
	utility := d.buildUtility(s)
	if d.pension.ClaimAge <= d.firstAge {
		s.at("public.pension.claim_age", "is %d, want above first_age, %d", d.pension.ClaimAge, d.firstAge)
	}
	if len(s.w.faults.list) > before || utility == nil || survival == nil || profile == nil {
		return g
	}
	h := policy.Household{FirstAge: d.firstAge, Survival: survival, Utility: utility, DiscountFactor: d.discount.def,
		Bequest: d.bequest, Return: d.ret, Limit: d.limit, Pension: d.pension}
	if h.Earnings = d.buildEarnings(s, profile); h.Earnings == nil {
		return g
	}
	if err := h.Validate(); err != nil {
		s.report(err)
		return g
	}
	g.Household = h
	for i := range d.spread { // the middles of equal slices of mean ± half_width
		g.Discounts = append(g.Discounts, d.discount.def+d.halfWidth*(float64(2*i+1)/float64(d.spread)-1))
	}
	return g
}

func (d *draft) buildSurvival(s *section, in *files) []float64 {
	var curve []float64
	var err error
	switch d.survival {
	case 0:
		table := in.lifeTable(s.w.faults, d.table, d.sex, d.year)
		if table == nil {
			return nil
		}
		curve, err = table.Survival(d.firstAge, d.lastAge)
	case 1:
		curve, err = d.gompertz.Survival(d.firstAge, d.lastAge)
	case 2:
		curve = income.Certain(d.firstAge, d.lastAge)
	}
	if err != nil {
		s.report(err)
		return nil
	}
	return curve
}

// outcomes is the number of income outcomes of all ages and nodes.
func (d *draft) outcomes() int { return d.workingYears() * d.points * (d.transitory.Nodes + 1) }

// workingYears is the number of years before the claim age.
func (d *draft) workingYears() int {
	return max(min(d.pension.ClaimAge, d.lastAge+1)-d.firstAge, 1)
}

func (d *draft) buildForm() income.Form {
	if d.form == "level" {
		return income.Level
	}
	return income.Log
}

func (d *draft) buildProfile(s *section, in *files) []float64 {
	years := d.workingYears()
	switch d.profile {
	case 0:
		return income.Polynomial(d.buildForm(), d.polynomial, d.from, d.firstAge, years)
	case 1:
		ages, earnings := in.profileTable(s.w.faults, d.earnings)
		if ages == nil {
			return nil
		}
		profile, err := income.Table(ages, earnings, d.firstAge, years)
		if err != nil {
			s.report(err)
			return nil
		}
		return profile
	case 2:
		return income.Constant(d.constant, years)
	}
	return nil
}

func (d *draft) buildUtility(s *section) policy.Utility {
	var u policy.Utility
	var err error
	switch d.family {
	case "crra":
		u, err = policy.NewCRRA(d.gamma)
	case "cara":
		u, err = policy.NewCARA(d.alpha)
	case "quadratic":
		u, err = policy.NewQuadratic(d.bliss)
	case "stone_geary":
		u, err = policy.NewStoneGeary(d.gamma, d.subsistence)
	default:
		return nil
	}
	if err != nil {
		return nil // the value was already out of range
	}
	return u
}

func (d *draft) buildEarnings(s *section, profile []float64) *income.Earnings {
	var method income.Discretiser = income.Rouwenhorst{Points: d.points}
	if d.method == "tauchen" {
		method = income.Tauchen{Points: d.points, Span: d.span}
	}
	chain, err := method.Discretise(d.process)
	if err != nil {
		s.report(err)
		return nil
	}
	initial := chain.Stationary()
	if !math.IsNaN(d.initial) {
		initial = chain.Project(d.initial)
	}
	meaning := income.Mean
	if d.meaning == "median" {
		meaning = income.Median
	}
	e, err := income.Process{FirstAge: d.firstAge, Profile: profile, Form: d.buildForm(), ProfileIs: meaning, Chain: chain,
		Initial: initial, Transitory: d.transitory, JobLoss: d.jobLoss}.Build()
	if err != nil {
		s.report(err)
		return nil
	}
	return e
}

// report files the field errors of the libraries under the keys they come from.
func (s *section) report(err error) {
	if joined, ok := err.(interface{ Unwrap() []error }); ok {
		for _, e := range joined.Unwrap() {
			s.report(e)
		}
		return
	}
	var p *policy.FieldError
	var i *income.FieldError
	switch {
	case errors.As(err, &p):
		s.at(keyOf(p.Field), "%s", wants(p.Value, p.Want))
	case errors.As(err, &i):
		s.at(keyOf(i.Field), "%s", wants(i.Value, i.Want))
	default:
		s.at("", "%s", err.Error())
	}
}

func wants(value any, want string) string {
	if x, ok := value.(float64); ok {
		return "is " + format(x) + ", want " + want
	}
	if x, ok := value.(string); ok {
		return "is " + x + ", want " + want
	}
	return "want " + want
}

// keyOf is the key behind a field of the libraries.
func keyOf(field string) string {
	for _, k := range []struct{ prefix, key string }{
		{"Limit", "saving.borrowing_limit"}, {"Earnings", "income"}, {"Bequest.Shift", "preferences.bequest.shift"},
		{"Bequest", "preferences.bequest"}, {"Survival", "life.survival"}, {"Q", "life.survival"}, {"Profile", "income.profile"},
		{"table", "income.profile.table"}, {"Transitory", "income.transitory"}, {"JobLoss", "income.job_loss"}, {"Points", "income.persistent.points"},
		{"InnovationSD", "income.persistent.innovation_sd"}, {"Autocorrelation", "income.persistent.autocorrelation"},
	} {
		if strings.HasPrefix(field, k.prefix) {
			return k.key
		}
	}
	return "income"
}

// at reports a fault at a dotted key below s, at the place of the nearest key that
// is written.
func (s *section) at(key, format string, args ...any) {
	n := s.n
	for _, k := range strings.Split(key, ".") {
		v := n.get(k)
		if v == nil {
			break
		}
		n = v
	}
	s.fault(n, key, format, args...)
}
