package contrast

import "math"

// World is one of the two lives of every row.
type World struct {
	Income, Consumption []float64 // money a year
	Assets              []float64 // at the end of the year, money
	Lowest              []float64 // lowest assets that the borrowing limit allows, money; −Inf without limit
	JobLost             []bool
}

// Span says whose the rows From ≤ k < To are.
type Span struct {
	Year     int     // calendar year
	Group    int     // into Options.Groups
	Age      int     // in the event's year; of later entrants below every band
	Weight   float64 // how many households one stands for, relative to others; above 0
	Working  bool    // before the claim age
	From, To int
}

// Rows are the rows of a block of households, all years of each household from
// FirstYear to LastYear that it lives: ascending within a household. Blocks are
// committed in ascending order of First.
type Rows struct {
	First      int64
	Households int // ids First … First+Households−1
	Spans      []Span
	Household  []int64 // [row] id
	Usual      World
	Event      World
}

// variables of the studies, in order; below[k] follows them, one for each runway.
const (
	incomeUsual = iota
	incomeEvent
	incomeGap
	consumptionUsual
	consumptionEvent
	consumptionGap // event less usual: held, for the expected shortfall
	assetsUsual
	assetsEvent
	assetsGap
	runwayUsual
	runwayEvent
	lossUsual
	lossEvent
	lossGap
	dryInUsual
	dryInEvent
	dryGap
	dryFarUsual // in this or an earlier year since the event
	dryFarEvent
	dryFarGap
	newlyDry
	newlyDryFar
	shortfall   // money
	relativeGap // consumptionGap over usual consumption
	relativeShortfall
	belowFirst
)

var names = [belowFirst]string{"income", "income under the event", "income difference", "consumption", "consumption under the event", "consumption difference",
	"assets", "assets under the event", "assets difference", "runway", "runway under the event", "job loss", "job loss under the event", "job loss difference",
	"dry", "dry under the event", "dry difference", "dry so far", "dry so far under the event", "dry so far difference", "newly dry", "newly dry so far",
	"shortfall", "relative difference of consumption", "relative shortfall"}

// past is what a household has been through since the event's year.
type past struct {
	dryUsual, dryEvent, newly bool
	there                     bool // in the event's year
	group, band               int  // of those who were
	weight                    float64
	trails                    [trails]trail
}

// splitter cuts a block into calendar years and works out the variables of every
// row. One belongs to a worker.
type splitter struct {
	o     *Options
	band  map[int]int // by age in the event's year
	years []yearRows  // [year−FirstYear]; filled for the years wanted
	past  []past      // [place in the block]
}

// yearRows are a block's rows of one calendar year.
type yearRows struct {
	cells  []cellSpan
	unit   []int64
	weight []float64
	values [][]float64 // [variable]
}

type cellSpan struct{ group, band, from, to int }

func newSplitter(o *Options) *splitter {
	s := &splitter{o: o, band: map[int]int{}, years: make([]yearRows, o.LastYear-o.FirstYear+1)}
	for i, b := range o.Bands {
		for age := b.First; age <= b.Last; age++ {
			s.band[age] = i
		}
	}
	for y := range s.years {
		s.years[y].values = make([][]float64, int(belowFirst)+len(o.RunwayMonths))
	}
	return s
}

// split fills the years from … to−1, counted from the first, and everybody's past.
func (s *splitter) split(r *Rows, from, to int) {
	for y := from; y < to; y++ {
		s.years[y].clear()
	}
	if cap(s.past) < r.Households {
		s.past = make([]past, r.Households)
	}
	s.past = s.past[:r.Households]
	clear(s.past)
	for i := range r.Spans {
		s.span(r, &r.Spans[i], from, to)
	}
}

func (y *yearRows) clear() {
	y.cells, y.unit, y.weight = y.cells[:0], y.unit[:0], y.weight[:0]
	for v := range y.values {
		y.values[v] = y.values[v][:0]
	}
}

// bandOf returns the band of an age in the event's year, one past the last for
// those in none.
func (s *splitter) bandOf(age int) int {
	if b, ok := s.band[age]; ok {
		return b
	}
	return len(s.o.Bands)
}

func (s *splitter) span(r *Rows, sp *Span, from, to int) {
	at := sp.Year - s.o.FirstYear
	wanted := at >= from && at < to
	y := &s.years[at]
	start := len(y.unit)
	for k := sp.From; k < sp.To; k++ {
		p := &s.past[r.Household[k]-r.First]
		dryUsual, dryEvent := s.dry(&r.Usual, k), s.dry(&r.Event, k)
		if sp.Year >= 0 {
			p.dryUsual, p.dryEvent = p.dryUsual || dryUsual, p.dryEvent || dryEvent
			p.newly = p.newly || dryEvent && !dryUsual
			p.follow(r, k, sp, s)
		}
		if wanted {
			s.row(y, r, k, sp, dryUsual, dryEvent, p)
		}
	}
	if !wanted || start == len(y.unit) {
		return
	}
	c := cellSpan{sp.Group, s.bandOf(sp.Age), start, len(y.unit)}
	if n := len(y.cells); n > 0 && y.cells[n-1].group == c.group && y.cells[n-1].band == c.band {
		y.cells[n-1].to = c.to
		return
	}
	y.cells = append(y.cells, c)
}

// dry reports whether what a household could still spend lasts for less than
// DryMonths.
func (s *splitter) dry(w *World, k int) bool {
	low := w.Lowest[k]
	if math.IsInf(low, -1) {
		low = 0
	}
	return 12*(w.Assets[k]-low) < s.o.DryMonths*w.Consumption[k]
}

// row works out the variables of row k.
func (s *splitter) row(y *yearRows, r *Rows, k int, sp *Span, dryUsual, dryEvent bool, p *past) {
	y.unit, y.weight = append(y.unit, r.Household[k]), append(y.weight, sp.Weight)
	put := func(v int, x float64) { y.values[v] = append(y.values[v], x) }
	pair := func(v int, usual, event float64) {
		put(v, usual)
		put(v+1, event)
		put(v+2, event-usual)
	}
	u, e := &r.Usual, &r.Event
	c, d := u.Consumption[k], e.Consumption[k]
	pair(incomeUsual, u.Income[k], e.Income[k])
	pair(consumptionUsual, c, d)
	pair(assetsUsual, u.Assets[k], e.Assets[k])
	runway, stressed := runwayOf(u, k), runwayOf(e, k)
	put(runwayUsual, runway)
	put(runwayEvent, stressed)
	if sp.Working {
		pair(lossUsual, one(u.JobLost[k]), one(e.JobLost[k]))
	} else {
		pair(lossUsual, math.NaN(), math.NaN())
	}
	pair(dryInUsual, one(dryUsual), one(dryEvent))
	pair(dryFarUsual, one(p.dryUsual), one(p.dryEvent))
	put(newlyDry, one(dryEvent && !dryUsual))
	put(newlyDryFar, one(p.newly))
	put(shortfall, math.Max(0, c-d))
	relative := math.NaN()
	if c > 0 {
		relative = (d - c) / c
	}
	put(relativeGap, relative)
	put(relativeShortfall, math.Max(0, -relative))
	for i, months := range s.o.RunwayMonths {
		less := one(stressed < months) - one(runway < months)
		if runway != runway || stressed != stressed {
			less = math.NaN()
		}
		put(belowFirst+i, less)
	}
}

// runwayOf returns the runway in months, NaN where there is none.
func runwayOf(w *World, k int) float64 {
	months := 12 * w.Assets[k] / w.Consumption[k]
	if !(w.Consumption[k] > 0) || math.IsInf(months, 0) {
		return math.NaN()
	}
	return months
}

func one(b bool) float64 {
	if b {
		return 1
	}
	return 0
}
