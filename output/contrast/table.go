package contrast

import (
	"math"

	"cistern/output"
	"cistern/output/stats"
)

// The worlds of a figure.
const (
	Baseline   = "baseline"   // as usual
	Stress     = "stress"     // under the event
	Difference = "difference" // stress less baseline, household by household
)

// NoYear is the Year of a figure that is about all years together.
const NoYear = math.MinInt

// Key says what a figure is of.
type Key struct {
	Year                int // calendar year from the event's, or NoYear
	World, Group, Ages  string
	Variable, Statistic string
	Level               float64 // 0: none
}

// Figure is a figure with its error.
type Figure struct {
	Key
	stats.Estimate
	Households int64 // behind it
}

// Figures returns all figures, in the order of the table. It panics before the last
// EndPass.
func (c *Contrast) Figures() []Figure {
	w := &writer{c: c}
	for y := range c.results {
		w.key = Key{Year: c.o.FirstYear + y}
		for i := range c.targets {
			if w.target(i); c.results[y][i].rows > 0 {
				w.year(&c.results[y][i])
			}
		}
	}
	w.key = Key{Year: NoYear}
	for i := range c.targets {
		if w.target(i); c.results[-c.o.FirstYear][i].rows > 0 {
			w.recovery(i)
		}
	}
	return w.list
}

// writer lists figures.
type writer struct {
	c          *Contrast
	key        Key
	households int64
	list       []Figure
}

func (w *writer) target(i int) {
	t := w.c.targets[i]
	w.key.Group, w.key.Ages = output.Everyone, output.Everyone
	if t.group >= 0 {
		w.key.Group = w.c.o.Groups[t.group]
	}
	if t.band >= 0 {
		w.key.Ages = w.c.o.Bands[t.band].String()
	}
}

func (w *writer) put(world, variable, statistic string, level float64, e stats.Estimate) {
	k := w.key
	k.World, k.Variable, k.Statistic, k.Level = world, variable, statistic, level
	w.list = append(w.list, Figure{k, e, w.households})
}

// three puts a figure of both worlds and their difference.
func (w *writer) three(variable, statistic string, level float64, usual, event, gap stats.Estimate) {
	w.put(Baseline, variable, statistic, level, usual)
	w.put(Stress, variable, statistic, level, event)
	w.put(Difference, variable, statistic, level, gap)
}

// year puts the figures of one target in one year.
func (w *writer) year(f *figures) {
	w.households = f.rows
	o := &w.c.o
	means := func(variable, statistic string, first int) {
		w.three(variable, statistic, 0, f.means[first], f.means[first+1], f.means[first+2])
	}
	percentiles := func(n int) {
		for k, p := range o.Percentiles {
			w.three(compared[n].name, "percentile", p, f.quantiles[0][n][k], f.quantiles[1][n][k], f.gaps[n][k])
		}
	}
	means("income", "mean", incomeUsual)
	means("consumption", "mean", consumptionUsual)
	percentiles(1)
	means("assets", "mean", assetsUsual)
	percentiles(0)
	percentiles(2)
	for k, months := range o.RunwayMonths {
		w.three("runway_months", "share_below", months, f.below[0][k], f.below[1][k], f.means[belowFirst+k])
	}
	means("job_loss", "share", lossUsual)
	means("dry", "share", dryInUsual)
	means("dry", "share_so_far", dryFarUsual)
	w.put(Stress, "newly_dry", "share", 0, f.means[newlyDry])
	w.put(Stress, "newly_dry", "share_so_far", 0, f.means[newlyDryFar])
	w.put(Difference, "consumption_shortfall", "mean", 0, f.means[shortfall])
	w.put(Difference, "consumption_shortfall", "share_of_mean_consumption", 0, f.shares)
	w.put(Difference, "relative_shortfall", "mean", 0, f.means[relativeShortfall])
	for k, q := range o.Worst {
		w.put(Difference, "consumption_shortfall", "expected_shortfall", q, f.worst[0][k])
		w.put(Difference, "relative_shortfall", "expected_shortfall", q, f.worst[1][k])
	}
}

// recovery puts the figures about all years of a target.
func (w *writer) recovery(target int) {
	c := w.c
	w.households = c.results[-c.o.FirstYear][target].rows
	level := 100 * c.o.Within
	middle := 0
	for k, p := range c.percentiles {
		if p == 50 {
			middle = k
		}
	}
	for k, v := range []struct {
		name       string
		usual, gap int
		compared   int
	}{{"assets", assetsUsual, assetsGap, 0}, {"consumption", consumptionUsual, consumptionGap, 1}} {
		w.key.Year = NoYear
		w.put(Difference, v.name, "years_to_recover_mean", level, c.recoveryOf(func(f yearResults) (usual, gap stats.Estimate) {
			return f[target].means[v.usual], f[target].means[v.gap]
		}))
		w.put(Difference, v.name, "years_to_recover_median", level, c.recoveryOf(func(f yearResults) (usual, gap stats.Estimate) {
			return f[target].quantiles[0][v.compared][middle], f[target].gaps[v.compared][middle]
		}))
		fates := c.fates[k][target]
		w.put(Difference, v.name, "share_affected", level, fates.outsideShare())
		recovered := fates.recovered()
		w.put(Difference, v.name, "household_years_to_recover_median", level, median(recovered))
		for t, e := range recovered {
			if t > 0 {
				w.key.Year = t
				w.put(Difference, v.name, "household_share_recovered", level, e)
			}
		}
	}
	w.key.Year = NoYear
}

// Table returns the tidy table of a finished contrast: one row a year, world, group,
// band of ages and figure, with the columns
//
//	year, world, group, ages, variable, statistic, level, estimate, standard_error, lower, upper, households
//
// world is baseline, stress or difference (stress less baseline, household by
// household). ages is a band of ages in the event's year; "all" takes in later
// entrants too. Variables and statistics:
//
//   - income, consumption, assets: mean; consumption, assets, runway_months:
//     percentile (level in per cent);
//   - runway_months: share_below, the share of households with a runway of less than
//     level months;
//   - job_loss: share, among those before the claim age;
//   - dry: share, share_so_far (in this or an earlier year since the event's);
//     newly_dry: the same of those who would not be dry as usual that year;
//   - consumption_shortfall: mean, share_of_mean_consumption, expected_shortfall (the
//     mean among the worst level per cent); relative_shortfall: the same of the
//     shortfall as a share of the household's own usual consumption;
//   - assets, consumption, without year: years_to_recover_mean and
//     years_to_recover_median, the first year from which on mean or median stay
//     within level per cent; share_affected, the share of the households of the
//     event's year that were ever outside; household_years_to_recover_median, the
//     first year by which half of these are back; household_share_recovered, by year.
//
// lower and upper bound a 95 % interval: order statistics for percentiles,
// Clopper–Pearson for shares of one world, Student's t on the jackknife error for
// means and differences, the normal law for differences of percentiles. A recovery
// that does not happen within the window is missing. See the package comment.
func (c *Contrast) Table() *output.Table {
	t := output.NewTable("stress")
	year := t.AddInt("year", "year", "calendar year counted from the event's; missing where all years are meant")
	world := t.AddString("world", "", "baseline, stress, or the difference stress less baseline, household by household")
	group := t.AddString("group", "", "group of households; \"all\" for all groups together")
	ages := t.AddString("ages", "year", "ages in the event's year; \"all\" takes in later entrants too")
	variable := t.AddString("variable", "", "what is described; money in currency units a year, assets in currency units at the end of the year")
	statistic := t.AddString("statistic", "", "which figure of the variable's distribution")
	level := t.AddFloat("level", "", "per cent of households for percentiles and expected shortfalls, months for share_below, per cent within which a figure is back for recoveries")
	estimate := t.AddFloat("estimate", "", "the figure, in the unit of the variable; shares are fractions, recoveries years")
	se := t.AddFloat("standard_error", "", "Monte Carlo standard error of the estimate, paired for differences")
	lower := t.AddFloat("lower", "", "lower end of the 95 % confidence interval")
	upper := t.AddFloat("upper", "", "upper end of the 95 % confidence interval")
	count := t.AddInt("households", "household", "number of households behind the estimate")
	for _, f := range c.Figures() {
		if f.Year == NoYear {
			year.AppendMissing()
		} else {
			year.AppendInt(int64(f.Year))
		}
		world.AppendString(f.World)
		group.AppendString(f.Group)
		ages.AppendString(f.Ages)
		variable.AppendString(f.Variable)
		statistic.AppendString(f.Statistic)
		if f.Level == 0 {
			level.AppendMissing()
		} else {
			level.AppendFloat(f.Level)
		}
		known(estimate, f.Value)
		known(se, f.StandardError)
		known(lower, f.Lower)
		known(upper, f.Upper)
		count.AppendInt(f.Households)
	}
	t.Notes = append(t.Notes, "Differences are paired: both worlds have the same households, shocks and deaths.")
	return t
}

// known adds a value, or its absence where it is not finite.
func known(c *output.Column, v float64) {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		c.AppendMissing()
	} else {
		c.AppendFloat(v)
	}
}

// ReadTable returns the figures of a table that Table made, in its order.
func ReadTable(t *output.Table) []Figure {
	float := func(name string, i int, absent float64) float64 {
		if c := t.Column(name); !c.IsMissing(i) {
			return c.Floats[i]
		}
		return absent
	}
	text := func(name string, i int) string { return t.Column(name).Strings[i] }
	var list []Figure
	for i := range t.Len() {
		f := Figure{Key: Key{Year: NoYear, World: text("world", i), Group: text("group", i), Ages: text("ages", i), Variable: text("variable", i), Statistic: text("statistic", i),
			Level: float("level", i, 0)}, Households: t.Column("households").Ints[i]}
		if year := t.Column("year"); !year.IsMissing(i) {
			f.Year = int(year.Ints[i])
		}
		nan := math.NaN()
		f.Estimate = stats.Estimate{Value: float("estimate", i, nan), StandardError: float("standard_error", i, nan), Lower: float("lower", i, nan), Upper: float("upper", i, nan)}
		list = append(list, f)
	}
	return list
}
