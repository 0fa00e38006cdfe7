package sim

import (
	"errors"
	"fmt"
	"slices"

	"cistern/policy"
)

// An Event reaches households of all ages in one calendar year and changes years
// of their lives from then on. Calendar years are counted from that year, 0; those
// before are negative.
//
// Every household lives twice, with the same draws and the same death: as usual,
// its rows the same to the bit as in a simulation without event, and under the
// event. A block holds the rows of the calendar years First … Last, and its runs
// tell years apart.
type Event struct {
	Entry       func(id int64) int // calendar year of a household's first year of life; safe for concurrent use
	First, Last int                // First ≤ 0 ≤ Last

	// Course returns what households of a type whose first year of life is the
	// calendar year entry live through in place of their usual years; nil: nothing.
	Course func(kind, entry int) *Course
}

// A Course is a stretch of a life under an event: what is earned in its years and
// how households consume then. Years count from the first age. It is immutable
// once made.
type Course struct {
	from, until int
	household   policy.Household
	tables      []*policy.Table // [t−from]; nil where the usual rule is followed
	bounds      [][]float64     // [t−from][node]
}

// NewCourse returns the course through the years from … until−1 of rule's
// household, whose consumption is rule's. Where rule has the curves of usual, the
// rule that the type follows otherwise, nothing is kept twice. The two households
// have the same ages, nodes and survival.
func NewCourse(usual, rule *policy.Rule, from, until int) *Course {
	if from < 0 || until < from || until > len(rule.Curves) || len(rule.Curves) != len(usual.Curves) {
		panic("sim: a course outside of life")
	}
	c := &Course{from: from, until: until, household: rule.Household}
	for t := from; t < until; t++ {
		var table *policy.Table
		var bounds []float64
		if &rule.Curves[t][0] != &usual.Curves[t][0] {
			table = rule.Table(t)
			for j := range rule.Curves[t] {
				bounds = append(bounds, rule.Curves[t][j].Bound)
			}
		}
		c.tables, c.bounds = append(c.tables, table), append(c.bounds, bounds)
	}
	return c
}

// validate reports every fault of the event at once.
func (e *Event) validate(p *Population, want Columns) error {
	var errs []error
	bad := func(format string, args ...any) { errs = append(errs, fmt.Errorf("sim: event: "+format, args...)) }
	if e.Entry == nil || e.Course == nil {
		bad("wants Entry and Course")
	}
	if e.First > 0 || e.Last < 0 {
		bad("years %d to %d, want the event's year 0 among them", e.First, e.Last)
	}
	if want&Order != 0 {
		bad("its blocks hold a part of every life: there is no Position")
	}
	return errors.Join(errs...)
}

// eventPlan is an event ready for simulation.
type eventPlan struct {
	entry       func(int64) int
	first, last int
	earliest    int       // entry that has rows
	courses     [][][]law // [type][entry−earliest] laws of the years from … of a course; nil: usual
	from        [][]int   // [type][entry−earliest]
}

func newEventPlan(pl *plan, e *Event, want Columns, tables *tableCache) *eventPlan {
	ev := &eventPlan{entry: e.Entry, first: e.First, last: e.Last, earliest: e.First - pl.years + 1}
	for k := range pl.types {
		var courses [][]law
		var from []int
		for entry := ev.earliest; entry <= ev.last; entry++ {
			c := e.Course(k, entry)
			var laws []law
			if c != nil {
				laws = c.laws(&pl.types[k], want, tables)
				from = append(from, c.from)
			} else {
				from = append(from, 0)
			}
			courses = append(courses, laws)
		}
		ev.courses, ev.from = append(ev.courses, courses), append(ev.from, from)
	}
	return ev
}

func (c *Course) laws(tp *typePlan, want Columns, tables *tableCache) []law {
	laws := make([]law, 0, c.until-c.from)
	for t := c.from; t < c.until; t++ {
		l := newLaw(&c.household, t, want, tables)
		usual := &tp.laws[t]
		l.rule, l.top, l.bound = usual.rule, usual.top, usual.bound
		if table := c.tables[t-c.from]; table != nil {
			l.setRule(table, c.bounds[t-c.from])
		}
		laws = append(laws, l)
	}
	return laws
}

// law returns the law of year t of life of households of type k that entered in a
// calendar year.
func (ev *eventPlan) law(tp *typePlan, k, entry, t int) *law {
	i := entry - ev.earliest
	if at := t - ev.from[k][i]; at >= 0 && at < len(ev.courses[k][i]) {
		return &ev.courses[k][i][at]
	}
	return &tp.laws[t]
}

// eventCrew is the part of a crew's state that an event needs.
type eventCrew struct {
	kind    int       // the type that lives
	entries []int32   // by place in the block
	entry   []int32   // of the living, ascending
	assets  []float64 // under the event, at the end of last year
	cash    [chunk]float64
}

func newEventCrew() *eventCrew {
	return &eventCrew{entries: make([]int32, Unit), entry: make([]int32, Unit), assets: make([]float64, Unit)}
}

// liveThrough runs the households of type k through their years up to the event's
// last. Among the living those who entered first stand first: in a year of life
// the calendar year ascends.
func (c *crew) liveThrough(k int) error {
	tp, e, ev := &c.pl.types[k], c.event, c.pl.event
	e.kind = k
	members := c.members[k]
	for _, place := range members {
		e.entries[place] = int32(ev.entry(c.out.First + int64(place)))
	}
	slices.SortStableFunc(members, func(a, b int32) int { return int(e.entries[a]) - int(e.entries[b]) })
	c.begin(k)
	for i, place := range members {
		e.entry[i], e.assets[i] = e.entries[place], c.assets[i]
	}
	alive := len(members)
	for alive > 0 && int(e.entry[alive-1]) > ev.last {
		alive--
	}
	early := 0 // gone before the first year that is wanted
	for early < alive && int(e.entry[early]) < ev.earliest {
		early++
	}
	c.dead = c.dead[:0]
	for i := range early {
		c.dead = append(c.dead, int32(i))
	}
	alive = c.buryInOrder(alive)
	for t := 0; t < c.pl.years && alive > 0; t++ {
		c.counts[tp.group].HouseholdYears += int64(alive)
		c.dead = c.dead[:0]
		c.read += tp.laws[t].rule.Warm(alive)
		before := 0 // in calendar years before the first
		for before < alive && int(e.entry[before])+t < ev.first {
			before++
		}
		// Rows of earlier years are overwritten by those that are wanted.
		row := c.out.N
		for _, part := range [2][2]int{{0, before}, {before, alive}} {
			c.out.N = row + part[1] - part[0]
			c.out.resize(c.out.N, c.want)
			for from := part[0]; from < part[1]; from += chunk {
				if err := c.year(tp, t, from, min(from+chunk, part[1]), row+from-part[0]); err != nil {
					return err
				}
			}
		}
		c.noteRuns(tp, t, before, alive, row)
		alive = c.buryInOrder(alive)
		for alive > 0 && int(e.entry[alive-1])+t+1 > ev.last {
			alive--
		}
	}
	return nil
}

// noteRuns notes the calendar years of the rows of the living from … to−1.
func (c *crew) noteRuns(tp *typePlan, t, from, to, row int) {
	entry := c.event.entry
	for i := from; i < to; {
		j := i + 1
		for j < to && entry[j] == entry[i] {
			j++
		}
		c.out.Runs = append(c.out.Runs, Run{T: t, Type: c.event.kind, Group: tp.group, Year: int(entry[i]) + t, From: row + i - from, To: row + j - from})
		i = j
	}
}

// buryInOrder removes the dead, noted in ascending order, and keeps the order of
// the living.
func (c *crew) buryInOrder(alive int) int {
	if len(c.dead) == 0 {
		return alive
	}
	e := c.event
	to := int(c.dead[0])
	for k, d := range c.dead {
		from, end := int(d)+1, alive
		if k+1 < len(c.dead) {
			end = int(c.dead[k+1])
		}
		copy(c.slot[to:], c.slot[from:end])
		copy(c.streams[to:], c.streams[from:end])
		copy(c.node[to:], c.node[from:end])
		copy(c.assets[to:], c.assets[from:end])
		copy(c.spent[to:], c.spent[from:end])
		copy(c.twin[to:], c.twin[from:end])
		copy(e.entry[to:], e.entry[from:end])
		copy(e.assets[to:], e.assets[from:end])
		to += end - from
	}
	return to
}

// yearThrough takes the living from … to−1 through year t under the event, after
// the usual year and with its draws.
func (c *crew) yearThrough(tp *typePlan, t, from, to, row int) error {
	e, ev, b := c.event, c.pl.event, &c.out
	for i := from; i < to; {
		entry := int(e.entry[i])
		now := entry+t >= 0
		l := ev.law(tp, e.kind, entry, t)
		j := i + 1
		for j < to && (e.entry[j] == e.entry[j-1] || now == (int(e.entry[j])+t >= 0) && (!now || ev.law(tp, e.kind, int(e.entry[j]), t) == l)) {
			j++
		}
		r, s := row+i-from, row+j-from
		tp.laws[t].lowest(b.Lowest[r:s], c.node[i:j])
		if !now { // nothing has happened yet
			copy(b.EventIncome[r:s], b.Income[r:s])
			copy(b.EventConsumption[r:s], b.Consumption[r:s])
			copy(b.EventAssets[r:s], b.Assets[r:s])
			copy(b.EventLowest[r:s], b.Lowest[r:s])
			if c.want&Changes != 0 {
				copy(b.EventJobLost[r:s], b.JobLost[r:s])
			}
			copy(e.assets[i:j], c.assets[i:j])
		} else if err := c.undergo(tp, l, t, from, i, j, r); err != nil {
			return err
		}
		i = j
	}
	return nil
}

// undergo takes the living i … j−1 of a chunk that begins at from through a year
// that is as law l says; their rows begin at row.
func (c *crew) undergo(tp *typePlan, l *law, t, from, i, j, row int) error {
	e, b := c.event, &c.out
	end := row + j - i
	node := c.node[i:j]
	income, consumption, assets := b.EventIncome[row:end], b.EventConsumption[row:end], b.EventAssets[row:end]
	cash := e.cash[:j-i]
	if l.working {
		x0, x2 := c.x0[i-from:j-from], c.x2[i-from:j-from]
		if l.jobLoss > 0 && tp.laws[t].jobLoss == 0 {
			drawJobs(c.streams[i:j], x2)
		}
		l.earn(node, x0, x2, income)
		if c.want&Changes != 0 {
			l.jobLosses(x2, b.EventJobLost[row:end])
		}
	} else {
		l.retire(node, income)
		if c.want&Changes != 0 {
			clear(b.EventJobLost[row:end])
		}
	}
	l.collect(cash, e.assets[i:j], income)
	l.rule.Evaluate(node, cash, consumption, nil)
	highest, at := l.settle(node, cash, consumption, assets, tp.floor)
	if at >= 0 {
		err := c.stateError(tp, t, i+at, cash[at], consumption[at])
		err.Event = true
		return err
	}
	if c.highestCash = max(c.highestCash, highest); highest > l.top {
		c.counts[tp.group].AboveTop += l.above(node, cash)
	}
	l.lowest(b.EventLowest[row:end], node)
	copy(e.assets[i:j], assets)
	return nil
}
