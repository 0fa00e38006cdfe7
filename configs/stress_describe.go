package configs

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"cistern/sim/stress"
)

// Limits of what a stress may be.
const (
	maxStressYears = 120
	maxWindow      = 100
)

// describeStress is the format of stress files, as describe is that of scenarios.
// sc is nil where only the format is wanted.
func describeStress(s *section, sc *Scenario) *Stress {
	st := new(Stress)
	s.integer(number{key: "stress", meaning: "the format, 1", in: within(1, 1), def: 1, required: true})
	st.Title = s.text("title", "what happens, in a line", "", false, 200)
	if v := s.n.get("event"); v != nil && v.kind == mapping && len(v.keys) == 0 {
		s.fault(v, "event", "names nothing that happens, want job_loss, earnings, return or cost_of_living")
	}
	readEvent(s.section("event", "what happens; whatever is not named stays as usual", true), &st.Event)
	readHits(s.section("hits", "whom it hits", false), &st.Event, sc)
	if s.choice("households_expect", "in the years of the event: normal, usual times from next year on, so that every year of it is a surprise; or stressed, what is left of the event, and normal times after it",
		"normal", "normal", "stressed") == "stressed" {
		st.Event.Expect = stress.Foreseen
	}
	y := s.section("years", "calendar years to look at", false)
	st.Window.Before = int(y.integer(number{key: "before", meaning: "years before the event's", in: within(0, maxWindow), def: 2}))
	st.Window.After = int(y.integer(number{key: "horizon", meaning: "years after the event's", in: within(1, maxWindow), def: 10}))
	y.done()
	readMeasures(s.section("measures", "what is measured", false), st)
	s.done()
	if sc != nil {
		checkRates(s, st, sc)
	}
	return st
}

func readMeasures(s *section, st *Stress) {
	st.Percentiles = s.levels("percentiles", "of assets, consumption and runway, in percent", between(0, 100), 5, 10, 25, 50, 75, 90, 95)
	st.RunwayMonths = s.levels("runway_months", "the share of households with assets for fewer months of consumption is counted", aboveTo(0, 1200), 1, 3, 6)
	st.DryMonths = s.number(number{key: "dry_months", meaning: "a household is dry while what it can still spend, assets above its borrowing limit, is less than so many months of its consumption", in: aboveTo(0, 1200), def: 0.25})
	st.Worst = s.levels("worst", "the mean fall of consumption is taken among the worst so many percent", aboveTo(0, 100), 1, 5)
	st.Within = s.number(number{key: "recovered_within", meaning: "a figure is back while it is within so many percent of what it would be", in: aboveTo(0, 100), def: 5}) / 100
	s.done()
}

// readHits reads who is hit. Ages are those of the event's year.
func readHits(s *section, e *stress.Event, sc *Scenario) {
	first, last := 0, 120
	if sc != nil {
		first, last = sc.FirstAge, sc.LastAge
	}
	a := s.section("ages", "ages in the event's year, both ends included; who begins later counts with the first age of life", false)
	in := within(float64(first), float64(last))
	e.FirstAge = int(a.integer(number{key: "from", meaning: "years; by default the first age of life", in: in, def: float64(first)}))
	e.LastAge = int(a.integer(number{key: "to", meaning: "years; by default the last age of life", in: in, def: float64(last)}))
	if a.n != nil && e.LastAge < e.FirstAge {
		a.fault(a.n.get("to"), "to", "is %d, want at least from, %d", e.LastAge, e.FirstAge)
	}
	a.done()
	var groups []string
	if sc != nil {
		for _, g := range sc.Groups {
			groups = append(groups, g.Name)
		}
	}
	if hit := s.names("groups", "names of the groups that are hit; all by default", groups); sc != nil {
		for _, g := range groups {
			e.Groups = append(e.Groups, slices.Contains(hit, g))
		}
	}
	s.done()
}

// names reads a list of distinct names out of those there are; without it all.
func (s *section) names(key, meaning string, there []string) []string {
	v := s.child(key, false)
	if s.doc != nil {
		s.doc.put(key, false, map[string]any{"type": "array", "items": map[string]any{"type": "string"}, "uniqueItems": true, "minItems": 1, "description": meaning})
	}
	x := there
	if v != nil {
		x = nil
		if v.kind != list || len(v.values) == 0 {
			s.fault(v, key, "is %s, want a list of %s", v.show(), oneOf(there))
		}
		for i, e := range v.values {
			if e.kind != scalar || !slices.Contains(there, e.text) || slices.Contains(x, e.text) {
				s.fault(e, fmt.Sprintf("%s[%d]", key, i), "is %s, want each of %s at most once%s", e.show(), oneOf(there), suggest(e.text, there))
				continue
			}
			x = append(x, e.text)
		}
	}
	var quoted []string
	for _, name := range x {
		quoted = append(quoted, strconv.Quote(name))
	}
	s.out.put(key, "["+strings.Join(quoted, ", ")+"]")
	return x
}

// yearly is a value for every year of a part of the event: one for all of its years,
// or a list.
type yearly struct {
	values []float64 // empty: not named
	list   bool
}

// in returns the value of year s, of a part that lasts for so many years; there is
// false where it has none.
func (y yearly) in(s, lasts int) (x float64, there bool) {
	if len(y.values) == 0 || s >= lasts {
		return 0, false
	}
	if y.list {
		return y.values[s], true
	}
	return y.values[0], true
}

func (s *section) yearly(f number) yearly {
	v := s.child(f.key, f.required)
	if s.doc != nil {
		one := rangeOf(f.in, "number")
		s.doc.put(f.key, f.required, map[string]any{"description": f.meaning + "; or a list, year by year",
			"anyOf": []any{one, map[string]any{"type": "array", "items": one, "minItems": 1, "maxItems": maxStressYears}}})
	}
	if v == nil {
		return yearly{}
	}
	return s.yearlyValue(v, f)
}

func (s *section) yearlyValue(v *node, f number) yearly {
	switch {
	case v.kind == list && (len(v.values) < 1 || len(v.values) > maxStressYears):
		s.fault(v, f.key, "has %d entries, want 1 to %d, one a year", len(v.values), maxStressYears)
		return yearly{}
	case v.kind == list:
		y := yearly{list: true}
		var words []string
		for i, e := range v.values {
			y.values = append(y.values, s.value(e, fmt.Sprintf("%s[%d]", f.key, i), f.in, f.def))
			words = append(words, format(y.values[i]))
		}
		s.out.put(f.key, "["+strings.Join(words, ", ")+"]")
		return y
	case v.kind == mapping:
		s.fault(v, f.key, "is %s, want a number %s, or a list of them, one a year", v.show(), f.in.words())
		return yearly{}
	}
	x := s.value(v, f.key, f.in, f.def)
	s.out.put(f.key, format(x))
	return yearly{values: []float64{x}}
}

// rate reads what becomes of a rate: a value in its place, or {times: …}.
type rate struct {
	yearly
	times bool
}

func (s *section) rate(f number) rate {
	times := number{key: "times", meaning: "what the usual rate is multiplied by", in: within(0, 1000), required: true}
	if s.doc != nil {
		inside := &section{w: &walk{faults: new(faults)}, doc: new(schema)}
		inside.yearly(times)
		one := rangeOf(f.in, "number")
		s.known = append(s.known, f.key)
		s.doc.put(f.key, false, map[string]any{"description": f.meaning + "; a value in place of the usual one, or {times: x}; or lists, year by year",
			"anyOf": []any{one, map[string]any{"type": "array", "items": one, "minItems": 1, "maxItems": maxStressYears}, inside.doc.object()}})
		return rate{}
	}
	v := s.n.get(f.key)
	if v == nil || v.kind != mapping {
		return rate{yearly: s.yearly(f)}
	}
	s.child(f.key, false)
	sub := &section{w: s.w, path: join(s.path, f.key), n: v, out: s.out.branch(f.key)}
	r := rate{yearly: sub.yearly(times), times: true}
	sub.done()
	return r
}

// in returns what becomes of the rate in year s.
func (r rate) in(s, lasts int) (stress.Rate, bool) {
	x, there := r.yearly.in(s, lasts)
	return stress.Rate{Replace: !r.times, X: x}, there
}

// lasts reads for how many years a part of the event lasts, where no list says so.
func (s *section) lasts(parts ...yearly) int {
	years := 0
	for _, y := range parts {
		if !y.list {
			continue
		}
		if years > 0 && len(y.values) != years {
			s.fault(nil, "", "has lists of %d and %d years, want one length", years, len(y.values))
		}
		years = len(y.values)
	}
	f := number{key: "lasts", meaning: "years, from the event's year on; where a list of yearly values says so, not given", in: within(1, maxStressYears), def: 1}
	if years == 0 {
		return int(s.integer(f))
	}
	s.known = append(s.known, f.key)
	if v := s.n.get(f.key); v != nil {
		s.fault(v, f.key, "stands beside a list of yearly values, which says how long itself")
	}
	return years
}

// readEvent reads what happens.
func readEvent(s *section, e *stress.Event) {
	j := s.section("job_loss", "a year without earnings", false)
	probability := j.rate(number{key: "probability", meaning: "a year", in: within(0, 1)})
	benefit := j.rate(number{key: "benefit_rate", meaning: "benefit as a share of what would be earned", in: within(0, 10)})
	jobLasts := j.lasts(probability.yearly, benefit.yearly)
	j.done()

	a := s.section("earnings", "from work, and the benefit with them", false)
	level := a.yearly(number{key: "level", meaning: "share by which earnings change while it lasts, -0.05: a fall of 5 percent", in: within(-1, 10)})
	levelLasts := a.lasts(level)
	e.Persistent = a.number(number{key: "persistent", meaning: "shift of the persistent part of those who work in the event's year, log points, or money in form level; it decays by itself with its autocorrelation", in: within(-1e12, 1e12)})
	a.done()

	returns := s.yearly(number{key: "return", meaning: "r in place of the usual one, on what was kept the year before; one number: in the event's year", in: span{low: -0.99, high: 10}})

	c := s.section("cost_of_living", "prices run away from incomes: every crown of income buys 1/(1 + jump) until incomes have caught up, and wealth is worth less by every rise for good", false)
	prices := c.yearly(number{key: "jump", meaning: "how far prices stand above what incomes follow", in: within(0, 10)})
	pricesLast := c.lasts(prices)
	e.WealthKeepsValue = c.choice("wealth", "nominal, it loses by a rise of prices what they rise; or real, it keeps its value", "nominal", "nominal", "real") == "real"
	c.done()

	returnsLast := max(1, len(returns.values))
	for year := range max(jobLasts, levelLasts, returnsLast, pricesLast) {
		y := stress.UsualYear()
		if r, there := probability.in(year, jobLasts); there {
			y.JobLoss = r
		}
		if r, there := benefit.in(year, jobLasts); there {
			y.BenefitRate = r
		}
		y.Level, _ = level.in(year, levelLasts)
		if r, there := returns.in(year, returnsLast); there {
			y.Return = r
		}
		y.Prices, _ = prices.in(year, pricesLast)
		e.Years = append(e.Years, y)
	}
	e.Years = usualEnd(e.Years)
	s.done()
}

// checkRates refuses multiples that make probabilities above 1.
func checkRates(s *section, st *Stress, sc *Scenario) {
	for year, y := range st.Event.Years {
		for g, group := range sc.Groups {
			if !st.Event.Groups[g] || y.JobLoss.Replace || group.Household.Earnings == nil {
				continue
			}
			if p := y.JobLoss.X * group.Household.Earnings.JobLoss.Probability; p > 1 {
				s.at("event.job_loss.probability.times", "makes the probability of job loss of group %s %s in year %d of the event, want at most 1", group.Name, format(p), year)
			}
		}
	}
}

// usualEnd drops the years at the end in which nothing happens.
func usualEnd(years []stress.Year) []stress.Year {
	for len(years) > 0 && usual(years[len(years)-1]) {
		years = years[:len(years)-1]
	}
	return years
}

func usual(y stress.Year) bool {
	return y.JobLoss == stress.Same() && y.BenefitRate == stress.Same() && y.Level == 0 && math.IsNaN(y.Return) && y.Prices == 0
}
