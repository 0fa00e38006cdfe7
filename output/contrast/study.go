package contrast

import (
	"fmt"

	"cistern/output/distribution"
	"cistern/output/stats"
)

// figures are those of one target in one year.
type figures struct {
	rows      int64
	means     []stats.Estimate                   // [variable]
	below     [2][]stats.Estimate                // [world][runway]
	shares    stats.Estimate                     // mean shortfall over mean usual consumption
	worst     [2][]stats.Estimate                // [money, relative][share]
	quantiles [2][len(compared)][]stats.Estimate // [world][variable][percentile]
	gaps      [len(compared)][]stats.Estimate
}

// studyOptions is what a year's study is about.
func (c *Contrast) studyOptions() distribution.Options {
	o := distribution.Options{Cells: len(c.o.Groups) * (len(c.o.Bands) + 1), Percentiles: c.percentiles, Shortfalls: c.o.Worst, Rows: max(1, c.o.RowsAYear),
		Weighted: c.o.Weighted, Workers: c.o.Workers, Budget: c.o.budget() / int64(c.to-c.from)}
	wants := map[int]distribution.Set{}
	for _, v := range compared {
		wants[v.usual], wants[v.event] = distribution.Percentiles, distribution.Percentiles
	}
	wants[consumptionGap], wants[relativeGap] = distribution.Shortfall, distribution.Shortfall
	for v := range belowFirst + len(c.o.RunwayMonths) {
		x := distribution.Variable{Name: c.nameOf(v), Held: wants[v] != 0}
		switch v {
		case runwayUsual, runwayEvent:
			for _, months := range c.o.RunwayMonths {
				x.Shares = append(x.Shares, distribution.Threshold{Value: months, Strict: true})
			}
			x.Optional = true
		case lossUsual, lossEvent, lossGap, relativeGap, relativeShortfall:
			x.Optional = true
		}
		x.Optional = x.Optional || v >= belowFirst
		o.Variables = append(o.Variables, x)
	}
	for _, t := range c.targets {
		d := distribution.Target{Wants: make([]distribution.Set, len(o.Variables)), Independent: !c.o.Weighted}
		for v, w := range wants {
			d.Wants[v] = w
		}
		for g := range c.o.Groups {
			for b := range len(c.o.Bands) + 1 {
				if t.has(g, b) {
					d.Cells = append(d.Cells, distribution.Cell{Index: c.cell(g, b), Weight: 1})
				}
			}
		}
		o.Targets = append(o.Targets, d)
	}
	return o
}

func (c *Contrast) nameOf(v int) string {
	if v < belowFirst {
		return names[v]
	}
	return fmt.Sprintf("runway below %g months", c.o.RunwayMonths[v-belowFirst])
}

// figures takes the figures of a finished study.
func (c *Contrast) figures(s *distribution.Study) yearResults {
	list := make(yearResults, len(c.targets))
	for i := range c.targets {
		r := s.Target(i)
		f := &list[i]
		f.rows = r.Rows()
		for v := range belowFirst + len(c.o.RunwayMonths) {
			switch v {
			case lossUsual, lossEvent, dryInUsual, dryInEvent, dryFarUsual, dryFarEvent, newlyDry, newlyDryFar:
				f.means = append(f.means, r.Proportion(v))
			default:
				f.means = append(f.means, r.Mean(v))
			}
		}
		f.shares = r.Ratio(shortfall, consumptionUsual)
		for w, v := range []int{runwayUsual, runwayEvent} {
			for k := range c.o.RunwayMonths {
				f.below[w] = append(f.below[w], r.Share(v, k))
			}
		}
		for w, v := range []int{consumptionGap, relativeGap} {
			for k := range c.o.Worst {
				f.worst[w] = append(f.worst[w], negative(r.Shortfall(v, k)))
			}
		}
		for n, v := range compared {
			for k := range c.percentiles {
				f.quantiles[0][n] = append(f.quantiles[0][n], r.Percentile(v.usual, k))
				f.quantiles[1][n] = append(f.quantiles[1][n], r.Percentile(v.event, k))
			}
		}
	}
	return list
}

// negative returns −e.
func negative(e stats.Estimate) stats.Estimate {
	return stats.Estimate{Value: 0 - e.Value, StandardError: e.StandardError, Lower: 0 - e.Upper, Upper: 0 - e.Lower}
}
