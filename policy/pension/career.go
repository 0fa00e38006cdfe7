package pension

import (
	"fmt"
	"math"
)

// A Career is a certain working life: earnings are a multiple of average earnings
// in every year from the entry to the claim, but for years out of work, in which
// there are none and nothing is credited.
type Career struct {
	Name     string
	Earnings float64 // multiple of average earnings, positive
	Entry    int     // age at which work begins
	Breaks   []Span  // years out of work
}

// A Span is the ages From … To, both included.
type Span struct{ From, To int }

// StandardCareers returns workers at half, one and two times average earnings who
// begin at the given age, each with a full career and with one broken by five years
// out of work from the age of 35 on.
func StandardCareers(entry int) []Career {
	var all []Career
	for _, broken := range []bool{false, true} {
		for _, e := range []struct {
			name     string
			earnings float64
		}{{"half average earnings", 0.5}, {"average earnings", 1}, {"twice average earnings", 2}} {
			c := Career{Name: e.name + ", full career", Earnings: e.earnings, Entry: entry}
			if broken {
				c.Name, c.Breaks = e.name+", broken career", []Span{{35, 39}}
			}
			all = append(all, c)
		}
	}
	return all
}

// works reports whether the career has earnings at an age before the claim.
func (c *Career) works(age int) bool {
	for _, b := range c.Breaks {
		if age >= b.From && age <= b.To {
			return false
		}
	}
	return age >= c.Entry
}

func (c *Career) validate(f *faults, firstAge, claimAge int) {
	if !(c.Earnings > 0) || !finite.ok(c.Earnings) {
		f.add("Career.Earnings", c.Earnings, "positive and finite")
	}
	if c.Entry < firstAge || c.Entry >= claimAge {
		f.add("Career.Entry", c.Entry, fmt.Sprintf("from the first age, %d, to the age before the claim, %d", firstAge, claimAge-1))
	}
	for i, b := range c.Breaks {
		if b.From > b.To {
			f.add(fmt.Sprintf("Career.Breaks[%d]", i), fmt.Sprintf("%d to %d", b.From, b.To), "ages in ascending order")
		}
	}
}

// Adequacy says what a career's pension is worth, by the definitions of the OECD
// (Pensions at a Glance 2023, chapter 4): pre-retirement earnings are the lifetime
// average, revalued with average earnings to the year of claim; pensions are those
// of the first year, minimum and assistance for a household without assets or other
// income included; net is after income tax and the household's contributions; wealth
// is the present value at the claim age of pensions for life over gross yearly
// pre-retirement earnings. Pre-retirement earnings are taxed by the rules of the
// year of claim.
type Adequacy struct {
	Career           Career
	ClaimAge         int
	YearsWorked      int
	Entitlement      Entitlement // after the last working year
	GrossEarnings    float64     // pre-retirement, money a year
	NetEarnings      float64
	GrossPension     float64 // money a year, with top-up and assistance
	NetPension       float64
	TopUp            float64 // part of both: to the minimum pension
	Assistance       float64 // part of both
	GrossReplacement float64 // gross pension over gross earnings
	NetReplacement   float64 // net pension over net earnings
	GrossWealth      float64 // years of gross earnings
	NetWealth        float64 // years of gross earnings
	InternalReturn   float64 // real, a year, of all contributions in gross pensions; NaN where there is none
}

// Adequacy reckons a career that claims in the given year, pension wealth at a real
// discount rate a year (the OECD takes 2 %). An impossible career or rate is
// reported as *FieldError values.
func (l *Law) Adequacy(c Career, claim int, rate float64) (Adequacy, error) {
	l.checkClaim(claim)
	var f faults
	if c.validate(&f, l.cohort.FirstAge, l.cohort.FirstAge+claim); !finiteRate.ok(rate) {
		f.add("rate", rate, finiteRate.want)
	}
	if f != nil {
		return Adequacy{}, f.err()
	}
	a := Adequacy{Career: c, ClaimAge: l.cohort.FirstAge + claim}
	final, flow, err := l.live(&a, claim)
	if err != nil {
		return a, err
	}
	wage := l.years[claim].wage
	a.GrossEarnings = c.Earnings * wage // the average of a constant multiple of W, revalued with W
	a.NetEarnings = l.Net(claim, Receipts{Earnings: a.GrossEarnings, Employed: true})
	T := len(l.years)
	gross, net := make([]float64, T-claim), make([]float64, T-claim)
	alive := 1.0
	for t := range T {
		if t >= claim {
			x := l.Account(t, Receipts{Pension: l.Pension(claim, t, a.Entitlement, final), Claimed: true}, 0)
			gross[t-claim], net[t-claim] = x.Pension+x.TopUp+x.Assistance, x.Net+x.Assistance
			flow[t] = gross[t-claim]
			if t == claim {
				a.TopUp, a.Assistance = x.TopUp, x.Assistance
			}
		}
		flow[t] *= alive
		alive *= l.cohort.Survival[t]
	}
	a.GrossPension, a.NetPension = gross[0], net[0]
	a.GrossReplacement, a.NetReplacement = gross[0]/a.GrossEarnings, net[0]/a.NetEarnings
	a.GrossWealth = PresentValue(l.cohort.Survival[claim:], gross, rate) / a.GrossEarnings
	a.NetWealth = PresentValue(l.cohort.Survival[claim:], net, rate) / a.GrossEarnings
	if a.InternalReturn, err = InternalReturn(flow); err != nil {
		a.InternalReturn = math.NaN() // nothing paid in, or nothing paid out
	}
	return a, nil
}

// live works the career off: it sets entitlement and years worked, and returns the
// last working year's earnings and minus the contributions by year, [T].
func (l *Law) live(a *Adequacy, claim int) (final float64, flow []float64, err error) {
	flow = make([]float64, len(l.years))
	for t := range claim {
		y := 0.0
		works := a.Career.works(l.cohort.FirstAge + t)
		if works {
			y = a.Career.Earnings * l.years[t].wage
			final = y
			a.YearsWorked++
			x := l.Account(t, Receipts{Earnings: y, Employed: true}, 0)
			flow[t] = -x.Employee - x.Employer
		}
		a.Entitlement = l.Next(t, a.Entitlement, y, works)
	}
	if a.YearsWorked == 0 {
		return 0, nil, &FieldError{Field: "Career.Breaks", Value: "the whole career", Want: "at least a year of work"}
	}
	return final, flow, nil
}
