package contrast

import (
	"math"

	"cistern/output/distribution"
	"cistern/output/stats"
)

// What a household can recover.
const (
	ofAssets = iota
	ofConsumption
	trails
)

// trail is how far a household's figure has been from what it usually is.
type trail struct {
	outside bool // ever
	last    int  // the last year in which it was outside
	seen    int  // the last year in which the household lived
}

// follow takes year sp.Year of a household, row k.
func (p *past) follow(r *Rows, k int, sp *Span, s *splitter) {
	if sp.Year == 0 {
		p.there, p.group, p.band, p.weight = true, sp.Group, s.bandOf(sp.Age), sp.Weight
	}
	c := r.Usual.Consumption[k]
	p.trails[ofAssets].add(sp.Year, r.Usual.Assets[k], r.Event.Assets[k], s.o.Within*math.Max(math.Abs(r.Usual.Assets[k]), math.Abs(c)))
	p.trails[ofConsumption].add(sp.Year, c, r.Event.Consumption[k], s.o.Within*math.Abs(c))
}

func (t *trail) add(year int, usual, event, tolerance float64) {
	t.seen = year
	if math.Abs(event-usual) > tolerance {
		t.outside, t.last = true, year
	}
}

// fates counts, for the households of one target by jackknife group, how their
// trails end. Times are years since the event's.
type fates struct {
	all, outside [distribution.Groups]float64   // weight of those there in the event's year, and of those ever outside
	back         [][distribution.Groups]float64 // [time] back for good from this year on
	lost         [][distribution.Groups]float64 // [time] outside in the last year seen
}

func newFates(years int) *fates {
	return &fates{back: make([][distribution.Groups]float64, years+1), lost: make([][distribution.Groups]float64, years+1)}
}

func (f *fates) add(unit int64, weight float64, t *trail) {
	g := unit & (distribution.Groups - 1)
	f.all[g] += weight
	if !t.outside {
		return
	}
	f.outside[g] += weight
	if t.last < t.seen {
		f.back[t.last+1][g] += weight
	} else {
		f.lost[t.last][g] += weight
	}
}

func (f *fates) fold(o *fates) {
	for g := range f.all {
		f.all[g] += o.all[g]
		f.outside[g] += o.outside[g]
		for t := range f.back {
			f.back[t][g] += o.back[t][g]
			f.lost[t][g] += o.lost[t][g]
		}
	}
}

// sum returns the total of a count, less that of a group (−1: none).
func sum(x *[distribution.Groups]float64, without int) float64 {
	total := 0.0
	for g, v := range x {
		if g != without {
			total += v
		}
	}
	return total
}

// outsideShare returns the share of households that were outside at all.
func (f *fates) outsideShare() stats.Estimate {
	return estimate(&f.all, func(without int) float64 { return sum(&f.outside, without) / sum(&f.all, without) })
}

// still returns the Kaplan–Meier estimate of the share that is outside beyond each
// time, [time], without a group (−1: none). Who was outside in the last year seen is
// at risk up to it.
func (f *fates) still(without int) []float64 {
	risk := sum(&f.outside, without)
	s := make([]float64, len(f.back))
	left := 1.0
	for t := range f.back {
		if back := sum(&f.back[t], without); risk > 0 && back > 0 {
			left *= math.Max(0, 1-back/risk)
		}
		s[t] = left
		risk -= sum(&f.back[t], without) + sum(&f.lost[t], without)
	}
	return s
}

// recovered returns the share that is back by each time, [time], among those that
// were outside; NaN where nobody was.
func (f *fates) recovered() []stats.Estimate {
	full := f.still(-1)
	var left [distribution.Groups][]float64
	for g := range left {
		left[g] = f.still(g)
	}
	list := make([]stats.Estimate, len(full))
	for t := range list {
		list[t] = nothing
		if sum(&f.outside, -1) > 0 {
			list[t] = estimate(&f.outside, func(without int) float64 {
				if without < 0 {
					return 1 - full[t]
				}
				return 1 - left[without][t]
			})
		}
	}
	return list
}

// median returns the first time by which half are back, with the first times by
// which the ends of the interval are. What is not reached is NaN.
func median(recovered []stats.Estimate) stats.Estimate {
	first := func(of func(e stats.Estimate) float64) float64 {
		for t, e := range recovered {
			if of(e) >= 0.5 {
				return float64(t)
			}
		}
		return math.NaN()
	}
	return stats.Estimate{Value: first(func(e stats.Estimate) float64 { return e.Value }), StandardError: math.NaN(),
		Lower: first(func(e stats.Estimate) float64 { return e.Upper }), Upper: first(func(e stats.Estimate) float64 { return e.Lower })}
}

// back returns the first year from which on to the last a figure stays within a
// fraction of what it usually is, by year from the event's: usual what it usually
// is, gap the difference with its interval. What is not reached is NaN.
func back(usual, gap []stats.Estimate, within float64) stats.Estimate {
	from := func(distance func(e stats.Estimate) float64) float64 {
		year := len(gap)
		for year > 0 && distance(gap[year-1]) <= within*math.Abs(usual[year-1].Value) {
			year--
		}
		if year == len(gap) {
			return math.NaN()
		}
		return float64(year)
	}
	return stats.Estimate{Value: from(func(e stats.Estimate) float64 { return math.Abs(e.Value) }), StandardError: math.NaN(),
		Lower: from(func(e stats.Estimate) float64 { // the end of the interval that is nearer to nothing
			if e.Lower <= 0 && e.Upper >= 0 {
				return 0
			}
			return math.Min(math.Abs(e.Lower), math.Abs(e.Upper))
		}),
		Upper: from(func(e stats.Estimate) float64 { return math.Max(math.Abs(e.Lower), math.Abs(e.Upper)) })}
}

var nothing = stats.Estimate{Value: math.NaN(), StandardError: math.NaN(), Lower: math.NaN(), Upper: math.NaN()}

// estimate returns a figure with its delete-a-group jackknife error; sizes are the
// weights of the groups.
func estimate(sizes *[distribution.Groups]float64, of func(without int) float64) stats.Estimate {
	full := of(-1)
	without := make([]float64, len(sizes))
	for g := range sizes {
		if sizes[g] > 0 {
			without[g] = of(g)
		}
	}
	se, n := stats.Jackknife(full, without, sizes[:])
	return stats.JackknifeInterval(full, se, n, confidence)
}
