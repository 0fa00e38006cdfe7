package output

import (
	"math"
	"strings"

	"cistern/output/stats"
)

// Decomposition is mean wealth taken apart by what households hold it for.
type Decomposition struct {
	FirstAge int
	Groups   []string
	Removed  []string              // what is removed, in order
	Growth   float64               // of births, a year, as in SummaryOptions
	Cells    [][]DecompositionSums // [year from the first age][group]
	Premium  []float64             // [group] equivalent premium of income risk, a share of consumption; nil: not asked
	Shares   []float64             // [group] of households
}

// DecompositionSums are sums over the households of an age and group, by household
// id modulo 64.
type DecompositionSums struct {
	Alive  [groupsJackknife]float64
	Assets [][groupsJackknife]float64 // [step], money; step 0: nothing removed
}

// Table returns the decomposition as a tidy table: one row a group, age, step and
// figure, with the columns
//
//	group, age, removed, variable, statistic, estimate, standard_error, lower, upper, households
//
// Groups come in their order and then "all", ages ascending and then all ages
// together (no age), weighed as in the summary. Variables and statistics:
//
//   - assets: mean, when everything named in removed is removed ("nothing", then one
//     more after the other, joined by " + ");
//   - part: mean, the part of mean assets that is held because of removed, which is
//     taken away in its place of the order; share_of_mean_assets, the same over mean
//     assets with nothing removed;
//   - equivalent_premium: share_of_consumption, what a household would give up of the
//     consumption of a life without income risk to be rid of the risk, at the start of
//     life. It comes from the rules, not from the panel, and has no Monte Carlo error;
//     "all" is the mean over households.
//
// All differences are paired: the same households in the same years. lower and upper
// bound a 95 % interval, Student's t on the jackknife error.
func (d *Decomposition) Table() *Table {
	t := NewTable("decomposition")
	w := &decompositionWriter{
		group:     t.AddString("group", "", "group of households; \"all\" for all groups together"),
		age:       t.AddInt("age", "year", "age of the household; missing for all ages together, as they are at a moment"),
		removed:   t.AddString("removed", "", "causes to hold wealth that are removed: all up to this one for assets, this one for its part"),
		variable:  t.AddString("variable", "", "what is described"),
		statistic: t.AddString("statistic", "", "which figure of it; shares are fractions"),
		estimate:  t.AddFloat("estimate", "", "the figure: assets and parts of them in currency units at the end of the year"),
		se:        t.AddFloat("standard_error", "", "Monte Carlo standard error of the estimate, paired"),
		lower:     t.AddFloat("lower", "", "lower end of the 95 % confidence interval"),
		upper:     t.AddFloat("upper", "", "upper end of the 95 % confidence interval"),
		count:     t.AddInt("households", "household", "household-years behind the estimate"),
	}
	for _, g := range append(seq(len(d.Groups)), -1) {
		w.name = Everyone
		if g >= 0 {
			w.name = d.Groups[g]
		}
		for year := range d.Cells {
			w.rows(d, d.pool(year, year, g), d.FirstAge+year)
		}
		w.rows(d, d.pool(0, len(d.Cells)-1, g), -1)
		w.premium(d, g)
	}
	return t
}

// pool adds the cells of some years and a group, −1: all.
func (d *Decomposition) pool(first, last, group int) *DecompositionSums {
	s := &DecompositionSums{Assets: make([][groupsJackknife]float64, len(d.Removed)+1)}
	for year := first; year <= last; year++ {
		weight := 1.0
		if last > first {
			weight = math.Pow(1+d.Growth, -float64(year))
		}
		for g := range d.Cells[year] {
			if group >= 0 && g != group {
				continue
			}
			c := &d.Cells[year][g]
			for part := range groupsJackknife {
				s.Alive[part] += float64(weight * c.Alive[part])
				for k := range s.Assets {
					s.Assets[k][part] += float64(weight * c.Assets[k][part])
				}
			}
		}
	}
	return s
}

// estimate returns a figure made of the mean after each step.
func (s *DecompositionSums) estimate(of func(mean func(step int) float64) float64) stats.Estimate {
	var alive float64
	total := make([]float64, len(s.Assets))
	for part := range groupsJackknife {
		alive += s.Alive[part]
		for k := range total {
			total[k] += s.Assets[k][part]
		}
	}
	var without [groupsJackknife]float64
	for part := range without {
		without[part] = of(func(k int) float64 { return (total[k] - s.Assets[k][part]) / (alive - s.Alive[part]) })
	}
	full := of(func(k int) float64 { return total[k] / alive })
	se, n := stats.Jackknife(full, without[:], s.Alive[:])
	return stats.JackknifeInterval(full, se, n, confidence)
}

type decompositionWriter struct {
	group, age, removed, variable, statistic, estimate, se, lower, upper, count *Column

	name string
}

// rows appends what a group holds at an age, −1: all ages.
func (w *decompositionWriter) rows(d *Decomposition, s *DecompositionSums, age int) {
	var alive float64
	for _, n := range s.Alive {
		alive += n
	}
	if alive == 0 {
		return
	}
	households := int64(math.Round(alive))
	for k := range s.Assets {
		removed := "nothing"
		if k > 0 {
			removed = strings.Join(d.Removed[:k], " + ")
		}
		w.row(age, removed, "assets", "mean", s.estimate(func(mean func(int) float64) float64 { return mean(k) }), households)
	}
	for k, removed := range d.Removed {
		w.row(age, removed, "part", "mean", s.part(k), households)
		w.row(age, removed, "part", "share_of_mean_assets", s.estimate(func(mean func(int) float64) float64 {
			if !(mean(0) > 0) {
				return math.NaN()
			}
			return (mean(k) - mean(k+1)) / mean(0)
		}), households)
	}
}

// part returns the part of mean assets held because of the k-th cause removed.
func (s *DecompositionSums) part(k int) stats.Estimate {
	return s.estimate(func(mean func(int) float64) float64 { return mean(k) - mean(k+1) })
}

// Whole returns, for all households of all ages, mean assets with nothing removed, the
// part of each cause in the order of Removed, and what is left, in money.
func (d *Decomposition) Whole() (all stats.Estimate, parts []stats.Estimate, left stats.Estimate) {
	s := d.pool(0, len(d.Cells)-1, -1)
	mean := func(step int) stats.Estimate {
		return s.estimate(func(mean func(int) float64) float64 { return mean(step) })
	}
	for k := range d.Removed {
		parts = append(parts, s.part(k))
	}
	return mean(0), parts, mean(len(d.Removed))
}

func (w *decompositionWriter) premium(d *Decomposition, group int) {
	if d.Premium == nil {
		return
	}
	nan := math.NaN()
	e := stats.Estimate{StandardError: nan, Lower: nan, Upper: nan}
	for g, p := range d.Premium {
		if group < 0 {
			e.Value += d.Shares[g] * p
		} else if g == group {
			e.Value = p
		}
	}
	var alive float64
	for _, n := range d.pool(0, 0, group).Alive {
		alive += n
	}
	w.row(-1, "income_risk", "equivalent_premium", "share_of_consumption", e, int64(math.Round(alive)))
}

func (w *decompositionWriter) row(age int, removed, variable, statistic string, e stats.Estimate, households int64) {
	w.group.AppendString(w.name)
	if age < 0 {
		w.age.AppendMissing()
	} else {
		w.age.AppendInt(int64(age))
	}
	w.removed.AppendString(removed)
	w.variable.AppendString(variable)
	w.statistic.AppendString(statistic)
	appendKnown(w.estimate, e.Value)
	appendKnown(w.se, e.StandardError)
	appendKnown(w.lower, e.Lower)
	appendKnown(w.upper, e.Upper)
	w.count.AppendInt(households)
}
