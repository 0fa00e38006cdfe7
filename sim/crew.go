package sim

import "math"

// chunk is the number of households whose draws are held at a time: three arrays
// of it stay in the first-level cache.
const chunk = 1024

// crew is what one worker works with: the block it fills and the state of the
// households alive in it.
type crew struct {
	pl   *plan
	want Columns
	only func(id int64) bool // nil: everybody
	out  Block

	members [][]int32 // [type] households of the block, by their place in it
	births  []birth   // by place in the block
	slot    []int32   // of the living: place in the block
	streams []state
	node    []uint8
	assets  []float64 // at the end of last year
	spent   []float64 // consumption of last year; NaN before the first
	twin    []float64 // the twins' assets
	lives   []int32   // by place in the block: years lived
	slots   []int32   // of every row, where Position is wanted
	event   *eventCrew

	x0, x1, x2  [chunk]uint64
	dead        []int32
	counts      []Count // [group] of the block
	highestCash float64
	read        float64 // what warming tables returns
}

// birth is what a household draws before its first year.
type birth struct {
	stream state
	assets float64
	node   uint8
}

func newCrew(pl *plan, want Columns, only func(id int64) bool) *crew {
	c := &crew{pl: pl, want: want, only: only, members: make([][]int32, len(pl.types)), births: make([]birth, Unit),
		slot: make([]int32, Unit), streams: make([]state, Unit), node: make([]uint8, Unit),
		assets: make([]float64, Unit), spent: make([]float64, Unit), twin: make([]float64, Unit), lives: make([]int32, Unit),
		dead: make([]int32, 0, Unit), counts: make([]Count, len(pl.p.Groups))}
	rows := int(Unit * pl.longestLife() * 1.03)
	if pl.event != nil {
		c.event = newEventCrew()
		c.want |= underEvent
		rows = min(rows, Unit*(pl.event.last-pl.event.first+1))
	}
	if only != nil {
		rows = 0 // as many as will be
	}
	c.out.resize(rows, c.want)
	if want&Order != 0 {
		c.slots = make([]int32, 0, rows)
	}
	return c
}

// block simulates households first … first+n−1 into out.
func (c *crew) block(first int64, n int) error {
	c.out.First, c.out.Households, c.out.N, c.out.Runs = first, n, 0, c.out.Runs[:0]
	c.highestCash = math.Inf(-1)
	clear(c.counts)
	c.slots = c.slots[:0]
	c.bear(first, n)
	for k := range c.members {
		if len(c.members[k]) == 0 {
			continue
		}
		live := c.live
		if c.event != nil {
			live = c.liveThrough
		}
		if err := live(k); err != nil {
			return err
		}
	}
	c.out.resize(c.out.N, c.want)
	if c.want&Order != 0 {
		c.place(n)
	}
	return nil
}

// bear draws type, start assets and first node of every household.
func (c *crew) bear(first int64, n int) {
	for k := range c.members {
		c.members[k] = c.members[k][:0]
	}
	p := c.pl.p
	for i := range n {
		id := first + int64(i)
		if c.only != nil && !c.only(id) {
			c.lives[i] = 0
			continue
		}
		x, stream := drawBirth(p.Seed, id)
		types := p.Groups[p.GroupOf(id)].Types
		k := types[(x[3]>>32)*uint64(len(types))>>32]
		tp := &c.pl.types[k]
		b := birth{stream: stream, assets: tp.start.Constant}
		if tp.start.Median > 0 {
			b.assets = 0
			if x[0]>>32 >= tp.zeroShare {
				b.assets = tp.start.Median * math.Exp(tp.startLog.at(x[1]))
			}
		}
		for x[2]>>32 >= tp.initial[b.node] {
			b.node++
		}
		c.births[i] = b
		c.members[k] = append(c.members[k], int32(i))
	}
}

// live runs the households of type k through their years.
func (c *crew) live(k int) error {
	tp := &c.pl.types[k]
	alive := len(c.members[k])
	c.begin(k)
	for t := 0; t < c.pl.years && alive > 0; t++ {
		row := c.out.N
		c.out.N += alive
		c.counts[tp.group].HouseholdYears += int64(alive)
		c.out.resize(c.out.N, c.want)
		c.out.Runs = append(c.out.Runs, Run{T: t, Type: k, Group: tp.group, From: row, To: c.out.N})
		if c.want&Order != 0 {
			c.slots = append(c.slots, c.slot[:alive]...)
		}
		c.dead = c.dead[:0]
		c.read += tp.laws[t].rule.Warm(alive)
		for from := 0; from < alive; from += chunk {
			to := min(from+chunk, alive)
			if err := c.year(tp, t, from, to, row+from); err != nil {
				return err
			}
		}
		alive = c.bury(t, alive)
	}
	return nil
}

// begin makes the households of type k those that live, in the order of members.
func (c *crew) begin(k int) {
	c.counts[c.pl.types[k].group].Households += int64(len(c.members[k]))
	for i, place := range c.members[k] {
		b := &c.births[place]
		c.slot[i], c.streams[i], c.node[i], c.assets[i], c.twin[i] = place, b.stream, b.node, b.assets, b.assets
		c.spent[i] = math.NaN()
	}
}

// bury replaces the dead, noted in ascending order, by the last of the living.
func (c *crew) bury(t, alive int) int {
	for k := len(c.dead) - 1; k >= 0; k-- {
		i := c.dead[k]
		c.lives[c.slot[i]] = int32(t + 1)
		alive--
		c.slot[i], c.streams[i], c.node[i] = c.slot[alive], c.streams[alive], c.node[alive]
		c.assets[i], c.spent[i], c.twin[i] = c.assets[alive], c.spent[alive], c.twin[alive]
	}
	return alive
}

// place sets every row's place in the order household, year.
func (c *crew) place(n int) {
	start := int32(0)
	for i, years := range c.lives[:n] {
		c.lives[i] = start // from here on: the household's first row
		start += years
	}
	for _, r := range c.out.Runs {
		t := int32(r.T)
		position := c.out.Position[r.From:r.To]
		for i, s := range c.slots[r.From:r.To] {
			position[i] = c.lives[s] + t
		}
	}
}
