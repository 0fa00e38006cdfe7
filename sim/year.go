package sim

import (
	"math"

	"cistern/income"
)

// year takes the living from … to−1 of a type through year t; their rows begin at
// row.
func (c *crew) year(tp *typePlan, t, from, to, row int) error {
	b := &c.out
	end := row + to - from
	node := c.node[from:to]
	income, cash := b.Income[row:end], b.CashOnHand[row:end]
	consumption, assets := b.Consumption[row:end], b.Assets[row:end]
	if tp.h.Working(t) {
		c.work(tp, t, from, to, row)
	} else {
		c.retire(tp, node, row, end)
	}
	collect(cash, c.assets[from:to], income, 1+tp.h.Return)
	var propensity []float64
	if c.want&Propensity != 0 {
		propensity = b.Propensity[row:end]
	}
	tp.rule[t].Evaluate(node, cash, consumption, propensity)
	highest, i := settle(node, cash, consumption, assets, tp.bound[t], tp.floor)
	if i >= 0 {
		return c.stateError(tp, t, from+i, cash[i], consumption[i])
	}
	if c.highestCash = math.Max(c.highestCash, highest); highest > tp.top[t] {
		c.countAbove(tp, t, node, cash)
	}
	copy(c.assets[from:to], assets)
	c.describe(tp, t, from, to, row)
	if c.want&Twins != 0 {
		if i := c.liveTwins(tp, t, c.twin[from:to], row, end); i >= 0 {
			err := c.stateError(tp, t, from+i, b.TwinAssets[row+i]+b.TwinConsumption[row+i], b.TwinConsumption[row+i])
			err.Twin = true
			return err
		}
	}
	drawFates(c.streams[from:to], c.x1[:to-from])
	c.fates(tp, t, from, node, row, end)
	return nil
}

// collect sets cash-on-hand from last year's assets and this year's income. The
// conversion keeps the product from being fused with the sum.
func collect(cash, assets, income []float64, R float64) {
	assets, income = assets[:len(cash)], income[:len(cash)]
	for i, a := range assets {
		cash[i] = float64(R*a) + income[i]
	}
}

// describe fills those optional columns that restate a household's state.
func (c *crew) describe(tp *typePlan, t, from, to, row int) {
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
		atLimit(b.AtLimit[row:end], node, b.Assets[row:end], tp.bound[t])
	}
}

// stateError is about the i-th of the living.
func (c *crew) stateError(tp *typePlan, t, i int, cash, consumption float64) *StateError {
	return &StateError{Group: c.pl.p.Groups[tp.group].Name, Age: tp.h.FirstAge + t, Household: c.out.First + int64(c.slot[i]),
		Cash: cash, Consumption: consumption}
}

// work sets the income of a working year, and its parts where they are wanted.
func (c *crew) work(tp *typePlan, t, from, to, row int) {
	b := &c.out
	end := row + to - from
	y := b.Income[row:end]
	if tp.h.Earnings.Transitory.SD > 0 {
		drawShocks(c.streams[from:to], c.x0[:len(y)])
	}
	if tp.jobLoss > 0 {
		drawJobs(c.streams[from:to], c.x2[:len(y)])
	}
	c.earn(tp, t, c.node[from:to], y)
	if c.want&Shocks != 0 {
		c.shocks(tp, b.Transitory[row:end], b.Employed[row:end])
	}
	if c.want&Sources != 0 {
		copy(b.Earnings[row:end], y)
		clear(b.Pension[row:end])
		clear(b.Taxes[row:end])
	}
}

// shocks says what shocks the year's draws are.
func (c *crew) shocks(tp *typePlan, epsilon []float64, employed []bool) {
	if tp.h.Earnings.Transitory.SD == 0 {
		clear(epsilon)
	} else {
		for i, x := range c.x0[:len(epsilon)] {
			epsilon[i] = tp.epsilon.at(x)
		}
	}
	for i := range employed {
		employed[i] = true
	}
	if tp.jobLoss > 0 {
		for i, x := range c.x2[:len(employed)] {
			if x>>32 < tp.jobLoss {
				employed[i], epsilon[i] = false, 0
			}
		}
	}
}

// earn sets earnings, or the benefit in a year of job loss.
func (c *crew) earn(tp *typePlan, t int, node []uint8, y []float64) {
	e := tp.h.Earnings
	var base, benefit [256]float64 // indexed by a byte: no bound is checked
	copy(base[:], e.Base[t])
	copy(benefit[:], e.Benefit[t])
	node = node[:len(y)]
	switch {
	case e.Transitory.SD == 0:
		for i, j := range node {
			y[i] = base[j]
		}
	case e.Form == income.Log:
		for i, x := range c.x0[:len(y)] {
			y[i] = base[node[i]] * tp.factor.at(x)
		}
	default:
		for i, x := range c.x0[:len(y)] {
			y[i] = base[node[i]] + tp.factor.at(x)
		}
	}
	if tp.jobLoss > 0 {
		for i, x := range c.x2[:len(y)] {
			if x>>32 < tp.jobLoss {
				y[i] = benefit[node[i]]
			}
		}
	}
}

// retire sets the income of a retired year.
func (c *crew) retire(tp *typePlan, node []uint8, row, end int) {
	b := &c.out
	y := b.Income[row:end]
	for i, j := range node {
		y[i] = tp.pension[j]
	}
	if c.want&Shocks != 0 {
		clear(b.Transitory[row:end])
		clear(b.Employed[row:end])
	}
	if c.want&Sources != 0 {
		clear(b.Earnings[row:end])
		copy(b.Pension[row:end], y)
		clear(b.Taxes[row:end])
	}
}

// settle sets assets = cash − consumption, not below the bound (rounding alone
// could bring them there). It returns the highest cash and the index of a household
// whose consumption its utility does not allow, or −1.
func settle(node []uint8, cash, consumption, assets, bounds []float64, floor float64) (highest float64, at int) {
	node, consumption, assets = node[:len(cash)], consumption[:len(cash)], assets[:len(cash)]
	var bound [256]float64
	copy(bound[:], bounds)
	highest = math.Inf(-1)
	low, sum := false, 0.0
	for i, m := range cash {
		c := consumption[i]
		a := m - c
		if least := bound[node[i]]; a < least {
			a = least
			c = m - a
			consumption[i] = c
		}
		assets[i] = a
		sum += c // what is not finite anywhere is not finite in the sum
		if c <= floor {
			low = true
		}
		if m > highest {
			highest = m
		}
	}
	if !low && math.Abs(sum) <= math.MaxFloat64 {
		return highest, -1
	}
	return highest, unsound(consumption, floor)
}

// unsound returns the index of a consumption that is not a number above the floor,
// or −1.
func unsound(consumption []float64, floor float64) int {
	for i, c := range consumption {
		if !(c > floor && c <= math.MaxFloat64) {
			return i
		}
	}
	return -1
}

// countAbove counts the states above the top of the rule's grid.
func (c *crew) countAbove(tp *typePlan, t int, node []uint8, cash []float64) {
	for i, m := range cash {
		if m > tp.rule[t].Top(int(node[i])) {
			c.counts[tp.group].AboveTop++
		}
	}
}

// atLimit says who keeps no more than the lowest assets allowed.
func atLimit(dst []bool, node []uint8, assets, bounds []float64) {
	for i, a := range assets {
		low := bounds[node[i]]
		dst[i] = a <= low+1e-9*(1+math.Abs(low))
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
	R := 1 + tp.h.Return
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

// fates says who dies at the end of year t, notes them and moves everybody's
// node on.
func (c *crew) fates(tp *typePlan, t, from int, node []uint8, row, end int) {
	draws := c.x1[:end-row]
	survive := tp.survive[t]
	dead := c.dead
	for i, x := range draws {
		if x>>32 >= survive {
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
	if tp.h.Moves(t) {
		tp.moves.move(node, draws)
	}
}
