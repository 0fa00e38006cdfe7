package income_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"cistern/income"
)

// as changes years 10 and 11 of e.
func as(t *testing.T, e *income.Earnings, c income.Change) *income.Earnings {
	t.Helper()
	d, err := e.Change(10, []income.Change{c, c})
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// A change that changes nothing gives the same tables to the bit.
func TestChangeOfNothing(t *testing.T) {
	for _, form := range []income.Form{income.Log, income.Level} {
		e := worker(t, func(p *income.Process) { p.Form = form })
		d := as(t, e, income.Change{JobLoss: e.JobLoss, Factor: 1})
		for year := range e.Years() {
			for j := range e.Chain.Nodes {
				want, w := e.Outcomes(year, j)
				got, v := d.Outcomes(year, j)
				if fmt.Sprint(got, v, d.Base[year], d.Benefit[year], d.Mean(year), d.At(year, j, 0.3)) !=
					fmt.Sprint(want, w, e.Base[year], e.Benefit[year], e.Mean(year), e.At(year, j, 0.3)) || d.Final(j) != e.Final(j) {
					t.Fatalf("form %v, year %d, node %d differs", form, year, j)
				}
			}
		}
	}
}

// Derived from the definition of Change: in form log the profile of a changed
// year is multiplied by Factor·exp(Shift), in form level P + z + Shift by Factor;
// the other years stay as they are, to the bit.
func TestChangedYears(t *testing.T) {
	c := income.Change{JobLoss: income.JobLoss{Probability: 0.2, BenefitRate: 0.3}, Factor: 0.9, Shift: -0.15}
	for _, form := range []income.Form{income.Log, income.Level} {
		e := worker(t, func(p *income.Process) { p.Form = form })
		d := as(t, e, c)
		for year := range e.Years() {
			values, weights := d.Outcomes(year, 2)
			before, _ := e.Outcomes(year, 2)
			if year != 10 && year != 11 {
				if fmt.Sprint(values, d.JobLossIn(year), d.TransitorySD(year)) != fmt.Sprint(before, e.JobLoss, e.Transitory.SD) {
					t.Fatalf("year %d is not changed but differs", year)
				}
				continue
			}
			scale, raise := 0.9*math.Exp(-0.15), 0.0
			benefit := 0.3 * e.Base[year][2] * scale
			if form == income.Level {
				scale, raise = 0.9, 0.9*-0.15
				benefit = 0.3 * 0.9 * e.Profile[year]
			}
			last := len(values) - 1
			for k := range last {
				near(t, "earnings, relative", values[k]/(scale*before[k]+raise), 1, 1e-14)
				near(t, "weight", weights[k], 0.8*e.Weight[k], 1e-16)
			}
			near(t, "benefit, relative", values[last]/benefit, 1, 1e-14)
			near(t, "weight of the benefit", weights[last], 0.2, 0)
			near(t, "mean on the nodes, relative", d.Mean(year)/nodesMean(d, year), 1, 1e-12)
			near(t, "earnings at a shock, relative", d.At(year, 2, 0.1)/(scale*e.At(year, 2, 0.1)+raise), 1, 1e-14)
			if low := d.Infimum(year); form == income.Log && low != 0 || form == income.Level && !math.IsInf(low, -1) {
				t.Errorf("lowest earnings are %v", low)
			}
		}
		if d.Final(2) != e.Final(2) || e.Final(2) != e.Base[39][2] {
			t.Error("what the persistent part supports in the end has moved")
		}
	}
}

// What a changed last working year supports has its shift but not its factor
// (definition of Final), and changes can be changed again.
func TestFinalAfterChange(t *testing.T) {
	e := worker(t, nil)
	for range 2 {
		d, err := e.Change(39, []income.Change{{JobLoss: e.JobLoss, Factor: 0.5, Shift: 0.1}})
		if err != nil {
			t.Fatal(err)
		}
		near(t, "final earnings, relative", d.Final(4)/(e.Base[39][4]*math.Exp(0.1)), 1, 1e-14)
		near(t, "earnings, relative", d.Base[39][4]/(e.Base[39][4]*math.Exp(0.1)*0.5), 1, 1e-14)
		e = as(t, e, income.Change{Factor: 1})
	}
}

func TestChangeFaults(t *testing.T) {
	e := worker(t, nil)
	_, err := e.Change(3, []income.Change{{JobLoss: income.JobLoss{Probability: 1.2, BenefitRate: -1}, Factor: math.NaN(), Shift: math.Inf(1)}})
	if err == nil {
		t.Fatal("an impossible change is taken")
	}
	for _, want := range []string{"JobLoss.Probability at age 28: is 1.2, want from 0 to 1", "BenefitRate", "Factor", "Shift"} {
		if !strings.Contains(err.Error(), want) {
			t.Errorf("%v has no %q", err, want)
		}
	}
	if _, err := e.Change(3, []income.Change{{Factor: 1e300, Shift: 700}}); err == nil {
		t.Error("earnings that overflow are taken")
	}
	defer func() {
		if recover() == nil {
			t.Error("a change after the last year is taken")
		}
	}()
	_, _ = e.Change(39, make([]income.Change, 2))
}
