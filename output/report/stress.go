package report

import (
	"fmt"
	"slices"
	"strings"

	"cistern/output"
)

// StressRun is what a page says about an event that households did not foresee.
type StressRun struct {
	Title       string    // of scenario and event
	Words       []string  // the answer
	Hit         []Section // words about the groups that the event hits, if not all
	Currency    string
	Table       *output.Table // stress.parquet
	Assumptions []Assumption
	Event       []Assumption // the settings of the event
	Provenance  [][2]string
	Warnings    []string
	Caution     string
}

// StressPage makes the page about a stress: baseline and event side by side, year by
// year, and the difference.
func StressPage(r *StressRun) *Page {
	s := readStress(r.Table)
	p := &Page{Title: r.Title, Lead: r.Words, Caution: r.Caution, Groups: s.groups}
	if len(r.Words) > 0 {
		p.Subtitle = "All households, held against the same years on the same luck without the event"
	}
	p.Sections = append(p.Sections, r.Hit...)
	for _, section := range []Section{s.dry(), s.runway(), s.money(r), s.shortfall(), s.after(r)} {
		if len(section.Charts)+len(section.Tables) > 0 {
			p.Sections = append(p.Sections, section)
		}
	}
	if len(r.Warnings) > 0 {
		p.Sections = append(p.Sections, Section{ID: "warnings", Title: "To be noted", Words: r.Warnings})
	}
	event := settings("event", "The event", r.Event)
	closing := []Section{event, assumptions(&Run{Assumptions: r.Assumptions}), provenance(&Run{Provenance: r.Provenance})}
	for _, section := range closing {
		if len(section.Tables) > 0 {
			p.Sections = append(p.Sections, section)
		}
	}
	return p
}

func settings(id, title string, list []Assumption) Section {
	section := Section{ID: id, Title: title}
	if len(list) == 0 {
		return section
	}
	t := Table{ID: id + "-table", Title: "Every setting of the event", Head: []string{"key", "value", "meaning"}, Numbers: []bool{false, false, false}}
	for _, a := range list {
		t.Rows = append(t.Rows, []string{a.Key, a.Value, a.Meaning})
	}
	section.Tables = []Table{t}
	return section
}

// stressPlace says what a line of a stress table is about.
type stressPlace struct {
	world, group, ages, variable, statistic string
	level                                   string
}

// stressed finds lines by year in the table of a stress.
type stressed struct {
	lines        map[stressPlace]*Series
	groups, ages []string
	within       []string // levels of recovery
}

func readStress(t *output.Table) *stressed {
	s := &stressed{lines: map[stressPlace]*Series{}}
	if t == nil {
		return s
	}
	level := t.Column("level")
	for i := range t.Len() {
		p := stressPlace{world: t.Column("world").Strings[i], group: t.Column("group").Strings[i], ages: t.Column("ages").Strings[i],
			variable: t.Column("variable").Strings[i], statistic: t.Column("statistic").Strings[i]}
		if !level.IsMissing(i) {
			p.level = fmt.Sprint(level.Floats[i])
		}
		if year := t.Column("year"); !year.IsMissing(i) && !t.Column("estimate").IsMissing(i) {
			if s.lines[p] == nil {
				s.lines[p] = &Series{}
			}
			s.lines[p].push(float64(year.Ints[i]), estimateAt(t, i))
		}
		if p.statistic == "household_share_recovered" && !slices.Contains(s.within, p.level) {
			s.within = append(s.within, p.level)
		}
		if !slices.Contains(s.groups, p.group) {
			s.groups = append(s.groups, p.group)
		}
		if !slices.Contains(s.ages, p.ages) {
			s.ages = append(s.ages, p.ages)
		}
	}
	first := func(a, b string) int { return everyoneFirst(a) - everyoneFirst(b) }
	slices.SortStableFunc(s.groups, first)
	slices.SortStableFunc(s.ages, first)
	return s
}

var yearAxis = Axis{Label: "years since the event", Integer: true}

// both is a chart with baseline and event; gap one with their difference.
func (s *stressed) both(id, title, caption string, y Axis, variable, statistic, level string) Chart {
	c := Chart{ID: id, Title: title, Caption: caption, X: yearAxis, Y: y, Choice: "Age now"}
	for _, g := range s.groups {
		for _, a := range s.ages {
			v := View{Group: g, Option: ageName(a)}
			for i, world := range []string{"baseline", "stress"} {
				if line := s.lines[stressPlace{world, g, a, variable, statistic, level}]; line != nil {
					v.Series = append(v.Series, line.values().named(world, world, i))
				}
			}
			c.Views = append(c.Views, v)
		}
	}
	return c
}

func (s *stressed) gap(id, title, caption string, y Axis, variable, statistic, level string) Chart {
	c := Chart{ID: id, Title: title, Caption: caption, X: yearAxis, Y: y, Choice: "Age now"}
	for _, g := range s.groups {
		for _, a := range s.ages {
			if line := s.lines[stressPlace{"difference", g, a, variable, statistic, level}]; line != nil {
				c.Views = append(c.Views, View{Group: g, Option: ageName(a), Series: []Series{line.named("difference", "", 1)}})
			}
		}
	}
	return c
}

func ageName(ages string) string {
	if ages == output.Everyone {
		return "all ages"
	}
	return strings.ReplaceAll(ages, "-", " to ")
}

func (s *stressed) dry() Section {
	section := Section{ID: "dry", Title: "Who runs dry"}
	share := Axis{Label: "share of households", Share: true, Zero: true}
	section.add(s.both("dry-share", "Households that have nothing left to fall back on", "Year 0 is the year of the event. Both worlds meet the same luck.", share, "dry", "share", ""))
	section.add(s.gap("dry-more", "How many more than in the baseline", "The band is the 95 % interval of the paired difference.", share, "dry", "share", ""))
	return section
}

func (s *stressed) runway() Section {
	section := Section{ID: "runway", Title: "Runway"}
	section.add(s.both("runway-median", "Runway of the middle household", "Runway is assets over monthly consumption.", Axis{Label: "months", Zero: true}, "runway_months", "percentile", "50"))
	section.add(s.gap("runway-under-three", "More households with less than three months", "The band is the 95 % interval of the paired difference.",
		Axis{Label: "share of households", Share: true, Zero: true}, "runway_months", "share_below", "3"))
	return section
}

func (s *stressed) money(r *StressRun) Section {
	section := Section{ID: "money", Title: "Consumption and wealth"}
	band := "The band is the 95 % interval of the paired difference."
	section.add(s.gap("consumption-change", "Change of mean consumption", band, Axis{Label: r.Currency + " a year", Zero: true}, "consumption", "mean", ""))
	section.add(s.gap("assets-change", "Change of mean assets", band, Axis{Label: r.Currency, Zero: true}, "assets", "mean", ""))
	return section
}

func (s *stressed) shortfall() Section {
	section := Section{ID: "shortfall", Title: "The worst hit"}
	c := Chart{ID: "relative-shortfall", Title: "By what share consumption falls short among the worst hit", Choice: "Age now", X: yearAxis, Y: Axis{Label: "share of usual consumption", Share: true, Zero: true},
		Caption: "The mean over those who fall short most, of their consumption in the baseline; bands are 95 % intervals."}
	for _, g := range s.groups {
		for _, a := range s.ages {
			v := View{Group: g, Option: ageName(a)}
			for i, level := range []string{"1", "5"} {
				if line := s.lines[stressPlace{"difference", g, a, "relative_shortfall", "expected_shortfall", level}]; line != nil {
					name := "worst " + level + " %"
					v.Series = append(v.Series, line.named(name, name, i))
				}
			}
			c.Views = append(c.Views, v)
		}
	}
	section.add(c)
	return section
}

// after is recovery, year by year, as far as the table has it.
func (s *stressed) after(*StressRun) Section {
	section := Section{ID: "recovery", Title: "Recovery"}
	c := Chart{ID: "recovered", Title: "Households that are back where they would have been", Choice: "Age now", X: yearAxis, Y: Axis{Label: "share of those thrown off", Share: true, Zero: true},
		Caption: "Of the households whose own assets or consumption were thrown off by more than the stated share: how many are back within it."}
	for _, g := range s.groups {
		for _, a := range s.ages {
			v := View{Group: g, Option: ageName(a)}
			for i, variable := range []string{"assets", "consumption"} {
				for _, level := range s.within {
					if line := s.lines[stressPlace{"difference", g, a, variable, "household_share_recovered", level}]; line != nil {
						v.Series = append(v.Series, line.named(variable, variable, i))
					}
				}
			}
			c.Views = append(c.Views, v)
		}
	}
	section.add(c)
	return section
}
