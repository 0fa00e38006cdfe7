package stress

import (
	"errors"
	"fmt"
	"math"

	"cistern/income"
	"cistern/policy"
)

// Expectation is what households expect in the years of an event.
type Expectation int

const (
	Usual    Expectation = iota // usual times from next year on: every year is a surprise
	Foreseen                    // the rest of the event, and usual times after it
)

// Rate is what becomes of a rate: it is multiplied by X, or X stands in its place.
type Rate struct {
	Replace bool
	X       float64
}

// Same leaves a rate as it is.
func Same() Rate { return Rate{X: 1} }

func (r Rate) of(x float64) float64 {
	if r.Replace {
		return r.X
	}
	return r.X * x
}

// Year is one year of an event. Begin from UsualYear.
type Year struct {
	JobLoss     Rate    // probability, a year
	BenefitRate Rate    // benefit as a share of what would be earned
	Level       float64 // earnings, and the benefit, change by this share; ≥ −1
	Return      float64 // r of this year, earned on what was kept the year before; NaN: as usual
	Prices      float64 // how far prices stand above what incomes follow, ≥ 0
}

// UsualYear returns a year in which nothing happens.
func UsualYear() Year {
	return Year{JobLoss: Same(), BenefitRate: Same(), Return: math.NaN()}
}

// Event is what happens, and to whom.
type Event struct {
	Years            []Year  // from the event's year on
	Persistent       float64 // shift δ of the persistent part of those who work in the event's year, in its unit
	WealthKeepsValue bool    // a rise of prices leaves what wealth buys as it was

	// Who is hit: households whose age in the event's year lies in FirstAge …
	// LastAge; later entrants count with the first age of life.
	FirstAge, LastAge int
	Groups            []bool // [group] who is hit; nil: all
	Expect            Expectation
}

// Validate reports every fault at once.
func (e *Event) Validate() error {
	var errs []error
	bad := func(format string, args ...any) { errs = append(errs, fmt.Errorf("stress: "+format, args...)) }
	for s, y := range e.Years {
		if !(y.Level >= -1) || math.IsInf(y.Level, 1) {
			bad("year %d: level is %v, want at least -1 and finite", s, y.Level)
		}
		if y.Return <= -1 || math.IsInf(y.Return, 1) {
			bad("year %d: return is %v, want above -1 and finite", s, y.Return)
		}
		if !(y.Prices >= 0) || math.IsInf(y.Prices, 1) {
			bad("year %d: prices are %v, want at least 0 and finite", s, y.Prices)
		}
		for _, r := range []Rate{y.JobLoss, y.BenefitRate} {
			if !(r.X >= 0) || math.IsInf(r.X, 1) {
				bad("year %d: a rate is changed by %v, want at least 0 and finite", s, r.X)
			}
		}
	}
	if math.IsNaN(e.Persistent) || math.IsInf(e.Persistent, 0) {
		bad("the shift of the persistent part is %v, want a finite number", e.Persistent)
	}
	if e.Expect != Usual && e.Expect != Foreseen {
		bad("expectation %d is none", e.Expect)
	}
	return errors.Join(errs...)
}

// hits reports whether households of a group that are in year onset of life in the
// event's year, negative for later entrants, are hit.
func (e *Event) hits(h *policy.Household, group, onset int) bool {
	age := h.FirstAge + max(onset, 0)
	return age >= e.FirstAge && age <= e.LastAge && (e.Groups == nil || e.Groups[group])
}

// shifts reports whether the persistent part of such households is shifted.
func (e *Event) shifts(h *policy.Household, onset int) bool {
	return e.Persistent != 0 && onset >= 0 && h.Working(onset)
}

// stretch returns the years of life, from … until−1, in which anything differs from
// usual.
func (e *Event) stretch(h *policy.Household, onset int) (from, until int) {
	from, until = max(onset, 0), onset+len(e.Years)
	if e.shifts(h, onset) {
		until = h.Years() // a pension founded on the shift lasts as long as life
	}
	return from, max(from, min(until, h.Years()))
}

// Household returns h as it lives through the event that comes in its year onset of
// life (negative: onset years before it enters). rho is the autocorrelation of its
// persistent part. Years before the event are as usual.
func (e *Event) Household(h policy.Household, rho float64, onset int) (policy.Household, error) {
	return e.apply(h, rho, onset, e.Years)
}

// shifted is Household with the shift of the persistent part alone.
func (e *Event) shifted(h policy.Household, rho float64, onset int) (policy.Household, error) {
	return e.apply(h, rho, onset, nil)
}

func (e *Event) apply(h policy.Household, rho float64, onset int, years []Year) (policy.Household, error) {
	from, until := e.stretch(&h, onset)
	works := min(until, h.WorkingYears())
	usual := h
	h.Returns, h.Pension.Worth = make([]float64, h.Years()), make([]float64, h.Years())
	for t := range h.Years() {
		h.Returns[t], h.Pension.Worth[t] = usual.ReturnIn(t), 1
	}
	changes := make([]income.Change, 0, max(0, works-from))
	for t := from; t < until; t++ {
		y, before := yearOf(years, t-onset), yearOf(years, t-onset-1)
		if !math.IsNaN(y.Return) {
			h.Returns[t] = y.Return
		}
		if y.Prices > before.Prices && !e.WealthKeepsValue {
			h.Returns[t] = (1+h.Returns[t])*(1+before.Prices)/(1+y.Prices) - 1
		}
		h.Pension.Worth[t] = 1 / (1 + y.Prices)
		if t >= works {
			continue
		}
		loss := usual.Earnings.JobLossIn(t)
		c := income.Change{Factor: (1 + y.Level) / (1 + y.Prices),
			JobLoss: income.JobLoss{Probability: y.JobLoss.of(loss.Probability), BenefitRate: y.BenefitRate.of(loss.BenefitRate)}}
		if e.shifts(&usual, onset) {
			c.Shift = e.Persistent * math.Pow(rho, float64(t-onset))
		}
		changes = append(changes, c)
	}
	changed, err := usual.Earnings.Change(min(from, usual.WorkingYears()), changes)
	if err != nil {
		return h, err
	}
	h.Earnings = changed
	return h, h.Validate()
}

// yearOf returns year s of an event, which is a usual one outside of it.
func yearOf(years []Year, s int) Year {
	if s < 0 || s >= len(years) {
		return UsualYear()
	}
	return years[s]
}
