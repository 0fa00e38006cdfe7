package sim

import "math"

// year takes the living from … to−1 of a type through year t; their rows begin at
// row.
func (c *crew) year(tp *typePlan, t, from, to, row int) error {
	b := &c.out
	l := &tp.laws[t]
	end := row + to - from
	node := c.node[from:to]
	cash, consumption, assets := b.CashOnHand[row:end], b.Consumption[row:end], b.Assets[row:end]
	if l.working {
		c.work(l, from, to, row)
	} else {
		c.retire(l, node, row, end)
	}
	l.collect(cash, c.assets[from:to], b.Income[row:end])
	var propensity []float64
	if c.want&Propensity != 0 {
		propensity = b.Propensity[row:end]
	}
	l.rule.Evaluate(node, cash, consumption, propensity)
	highest, i := l.settle(node, cash, consumption, assets, tp.floor)
	if i >= 0 {
		return c.stateError(tp, t, from+i, cash[i], consumption[i])
	}
	if c.highestCash = math.Max(c.highestCash, highest); highest > l.top {
		c.counts[tp.group].AboveTop += l.above(node, cash)
	}
	if c.want&Changes != 0 {
		copy(b.LastAssets[row:end], c.assets[from:to])
		copy(b.LastConsumption[row:end], c.spent[from:to])
		copy(c.spent[from:to], consumption)
	}
	copy(c.assets[from:to], assets)
	c.describe(tp, l, from, to, row)
	if c.want&Twins != 0 {
		if i := c.liveTwins(tp, t, c.twin[from:to], row, end); i >= 0 {
			err := c.stateError(tp, t, from+i, b.TwinAssets[row+i]+b.TwinConsumption[row+i], b.TwinConsumption[row+i])
			err.Twin = true
			return err
		}
	}
	if c.event != nil {
		if err := c.yearThrough(tp, t, from, to, row); err != nil {
			return err
		}
	}
	drawFates(c.streams[from:to], c.x1[:to-from])
	c.fates(tp, l, from, node, row, end)
	return nil
}

// describe fills those optional columns that restate a household's state.
func (c *crew) describe(tp *typePlan, l *law, from, to, row int) {
	b := &c.out
	end := row + to - from
	node := c.node[from:to]
	if c.want&Identity != 0 {
		household := b.Household[row:end]
		for i, s := range c.slot[from:to] {
			household[i] = b.First + int64(s)
		}
	}
	if c.want&States != 0 {
		copy(b.Node[row:end], node)
		persistent := b.Persistent[row:end]
		for i, j := range node {
			persistent[i] = tp.nodes[j]
		}
	}
	if c.want&Propensity != 0 {
		l.atLimit(b.AtLimit[row:end], node, b.Assets[row:end])
	}
}

// stateError is about the i-th of the living.
func (c *crew) stateError(tp *typePlan, t, i int, cash, consumption float64) *StateError {
	return &StateError{Group: c.pl.p.Groups[tp.group].Name, Age: tp.h.FirstAge + t, Household: c.out.First + int64(c.slot[i]),
		Cash: cash, Consumption: consumption}
}

// work sets the income of a working year, and its parts where they are wanted.
func (c *crew) work(l *law, from, to, row int) {
	b := &c.out
	end := row + to - from
	y := b.Income[row:end]
	x0, x2 := c.x0[:len(y)], c.x2[:len(y)]
	if l.sd > 0 {
		drawShocks(c.streams[from:to], x0)
	}
	if l.jobLoss > 0 {
		drawJobs(c.streams[from:to], x2)
	}
	l.earn(c.node[from:to], x0, x2, y)
	if c.want&Shocks != 0 {
		l.shocks(x0, x2, b.Transitory[row:end], b.Employed[row:end])
	}
	if c.want&Changes != 0 {
		l.jobLosses(x2, b.JobLost[row:end])
	}
	if c.want&Sources != 0 {
		copy(b.Earnings[row:end], y)
		clear(b.Pension[row:end])
		clear(b.Taxes[row:end])
	}
}

// retire sets the income of a retired year, and its parts where they are wanted.
func (c *crew) retire(l *law, node []uint8, row, end int) {
	b := &c.out
	y := b.Income[row:end]
	l.retire(node, y)
	if c.want&Shocks != 0 {
		clear(b.Transitory[row:end])
		clear(b.Employed[row:end])
	}
	if c.want&Changes != 0 {
		clear(b.JobLost[row:end])
	}
	if c.want&Sources != 0 {
		clear(b.Earnings[row:end])
		copy(b.Pension[row:end], y)
		clear(b.Taxes[row:end])
	}
}

// liveTwins takes the certain twins through the year. It returns the index of one
// whose consumption its utility does not allow, or −1. Types without twins have
// NaN.
func (c *crew) liveTwins(tp *typePlan, t int, twin []float64, row, end int) int {
	kept, spent := c.out.TwinAssets[row:end], c.out.TwinConsumption[row:end]
	if tp.twin == nil {
		for i := range kept {
			kept[i], spent[i] = math.NaN(), math.NaN()
		}
		return -1
	}
	R := tp.laws[t].returns
	for i, a := range twin {
		kept[i] = float64(R*a) + tp.twinMoney[t]
	}
	tp.twin[t].Evaluate(nil, kept, spent, nil)
	for i := range kept {
		kept[i] -= spent[i]
		twin[i] = kept[i]
	}
	return unsound(spent, tp.floor)
}

// fates says who dies at the end of the year, notes them and moves everybody's
// node on.
func (c *crew) fates(tp *typePlan, l *law, from int, node []uint8, row, end int) {
	draws := c.x1[:end-row]
	dead := c.dead
	for i, x := range draws {
		if x>>32 >= l.survive {
			dead = append(dead, int32(from+i))
		}
	}
	if c.want&Fates != 0 {
		died := c.out.Died[row:end]
		clear(died)
		for _, i := range dead[len(c.dead):] {
			died[int(i)-from] = true
		}
	}
	c.dead = dead
	if l.moves {
		tp.moves.move(node, draws)
	}
}
