package report

import (
	"math"
	"slices"
	"strconv"

	"cistern/output"
	"cistern/output/stats"
)

// summary finds figures in a tidy table with the columns of summary.parquet.
type summary struct {
	rows       map[string]stats.Estimate
	counts     map[string]int64
	groups     []string // in the order of the table, all together last
	ages       []int
	levels     map[string][]float64 // by variable and statistic, ascending
	households int64
}

// everyone is the age of rows about all ages together.
const everyone = -1

func key(group string, age int, variable, statistic string, level float64) string {
	l := ""
	if !math.IsNaN(level) {
		l = strconv.FormatFloat(level, 'g', -1, 64)
	}
	return group + "\x00" + strconv.Itoa(age) + "\x00" + variable + "\x00" + statistic + "\x00" + l
}

func readSummary(t *output.Table) *summary {
	s := &summary{rows: map[string]stats.Estimate{}, counts: map[string]int64{}, levels: map[string][]float64{}}
	if t == nil {
		return s
	}
	group, age, variable, statistic := t.Column("group"), t.Column("age"), t.Column("variable"), t.Column("statistic")
	level, count := t.Column("level"), t.Column("households")
	ages := map[int]bool{}
	for i := range t.Len() {
		a := everyone
		if !age.IsMissing(i) {
			a = int(age.Ints[i])
			ages[a] = true
		}
		l := floatAt(level, i)
		k := key(group.Strings[i], a, variable.Strings[i], statistic.Strings[i], l)
		s.rows[k] = stats.Estimate{Value: floatAt(t.Column("estimate"), i), StandardError: floatAt(t.Column("standard_error"), i),
			Lower: floatAt(t.Column("lower"), i), Upper: floatAt(t.Column("upper"), i)}
		s.counts[k] = count.Ints[i]
		s.households = max(s.households, count.Ints[i])
		if !slices.Contains(s.groups, group.Strings[i]) {
			s.groups = append(s.groups, group.Strings[i])
		}
		if name := variable.Strings[i] + "\x00" + statistic.Strings[i]; !math.IsNaN(l) && !slices.Contains(s.levels[name], l) {
			s.levels[name] = append(s.levels[name], l)
		}
	}
	for a := range ages {
		s.ages = append(s.ages, a)
	}
	slices.Sort(s.ages)
	for _, l := range s.levels {
		slices.Sort(l)
	}
	if i := slices.Index(s.groups, output.Everyone); i >= 0 { // first for a reader
		s.groups = append([]string{output.Everyone}, slices.Delete(slices.Clone(s.groups), i, i+1)...)
	}
	return s
}

func floatAt(c *output.Column, i int) float64 {
	if c == nil || c.IsMissing(i) {
		return math.NaN()
	}
	return c.Floats[i]
}

// at returns a figure; false where the table does not have it.
func (s *summary) at(group string, age int, variable, statistic string, level float64) (stats.Estimate, bool) {
	e, ok := s.rows[key(group, age, variable, statistic, level)]
	return e, ok && finite(e.Value)
}

// levelsOf lists the levels of a statistic, ascending.
func (s *summary) levelsOf(variable, statistic string) []float64 {
	return s.levels[variable+"\x00"+statistic]
}

// byAge returns a figure at every age that has it, with its interval.
func (s *summary) byAge(group, variable, statistic string, level float64) Series {
	var line Series
	for _, a := range s.ages {
		e, ok := s.at(group, a, variable, statistic, level)
		if !ok {
			continue
		}
		line.X = append(line.X, float64(a))
		line.Y = append(line.Y, e.Value)
		line.Lower = append(line.Lower, e.Lower)
		line.Upper = append(line.Upper, e.Upper)
	}
	return line
}

// values keeps the line and drops its interval.
func (s Series) values() Series {
	s.Lower, s.Upper = nil, nil
	return s
}

func (s Series) named(name, label string, style int) Series {
	s.Name, s.Label, s.Style = name, label, style
	return s
}

// ranged is the band between two figures at the ages that have both.
func (s *summary) ranged(group, variable, statistic string, low, high float64) Series {
	var band Series
	for _, a := range s.ages {
		l, ok := s.at(group, a, variable, statistic, low)
		u, also := s.at(group, a, variable, statistic, high)
		if ok && also {
			band.X = append(band.X, float64(a))
			band.Lower = append(band.Lower, l.Value)
			band.Upper = append(band.Upper, u.Value)
		}
	}
	band.Wide = true
	return band
}
