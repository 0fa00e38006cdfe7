package policy

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"cistern/income"
)

// shaken returns h with other earnings, returns and pensions from year first on,
// for the given number of years.
func shaken(t *testing.T, h Household, first, years int) Household {
	t.Helper()
	h.Returns, h.Pension.Worth = make([]float64, h.Years()), make([]float64, h.Years())
	for y := range h.Years() {
		h.Returns[y], h.Pension.Worth[y] = h.Return, 1
		if y >= first && y < first+years {
			h.Returns[y], h.Pension.Worth[y] = h.Return-0.04*float64(1+(y-first)%3), 0.9
		}
	}
	var changes []income.Change
	for y := first; y < min(first+years, h.WorkingYears()); y++ {
		changes = append(changes, income.Change{JobLoss: income.JobLoss{Probability: 0.2, BenefitRate: 0.4}, Factor: 0.95, Shift: -0.1})
	}
	e, err := h.Earnings.Change(min(first, h.WorkingYears()), changes)
	if err != nil {
		t.Fatal(err)
	}
	h.Earnings = e
	return h
}

func sameCurves(t *testing.T, what string, got, want *Rule, from, to int) {
	t.Helper()
	for y := from; y < to; y++ {
		for j := range want.Curves[y] {
			if fmt.Sprint(got.Curves[y][j]) != fmt.Sprint(want.Curves[y][j]) {
				t.Fatalf("%s: year %d, node %d differs", what, y, j)
			}
		}
	}
}

// Going on from a rule that was solved gives the same bits as solving all at once,
// wherever the solution is taken up, for every kind of rule.
func TestContinueMeetsSolve(t *testing.T) {
	for name, h := range map[string]Household{
		"crra": riskyHousehold(t), "cara": exponentialHousehold(t, income.Log, rouwenhorst(t, 3, 0.9, 0.1)),
		"bequest": func() Household {
			h := shortLife(t, CRRA{2})
			h.Bequest = Bequest{Weight: 1, Shift: 0.2}
			return h
		}(),
	} {
		for _, method := range []Interpolation{Cubic, Linear} {
			o := DefaultOptions()
			o.Interpolation, o.AssetPoints = method, 60
			T := h.Years()
			shaky := shaken(t, h, 1, T-1)
			whole := solve(t, shaky, o)
			for _, from := range []int{T, T - 1, h.WorkingYears(), h.WorkingYears() - 1, 2} {
				rule, err := Continue(t.Context(), shaky, o, whole, from, 1)
				if err != nil {
					t.Fatal(err)
				}
				sameCurves(t, fmt.Sprintf("%s, %v, from year %d", name, method, from), rule, whole, 1, T)
				if rule.Curves[0] != nil {
					t.Error("a year before the first was solved")
				}
			}
		}
	}
}

// With exponential utility and no limit a rule that goes on from the usual one
// meets the closed form of the changed problem, whatever changes from year to
// year (derived: the intercept recursion of CARAChain, which takes incomes and
// returns by year).
func TestContinueMeetsClosedForm(t *testing.T) {
	for _, form := range []income.Form{income.Log, income.Level} {
		usual := exponentialHousehold(t, form, rouwenhorst(t, 5, 0.95, 0.15))
		usual.Pension.FinalEarningsRate = 0 // or the shift of the last working year would outlast the change
		scale := math.Abs(usual.MeanIncome(10))
		rule := solve(t, usual, DefaultOptions())
		for _, first := range []int{3, 33, 50} {
			const years = 4
			h := shaken(t, usual, first, years)
			got, err := Continue(t.Context(), h, DefaultOptions(), rule, first+years, first-1)
			if err != nil {
				t.Fatal(err)
			}
			exact := CARAChain(h.Utility.(CARA), h.Prospects())
			for y := first - 1; y < h.Years(); y++ {
				for j := range h.Nodes() {
					for _, m := range []float64{-5 * scale, 0, scale, 20 * scale} {
						want := exact.Consumption(y, j, m)
						if e := math.Abs(got.Consumption(y, j, m)-want) / (scale + math.Abs(want)); !(e < 1e-9) {
							t.Fatalf("form %v, change in year %d: year %d node %d c(%g) = %.12g, want %.12g", form, first, y, j, m, got.Consumption(y, j, m), want)
						}
					}
				}
			}
		}
	}
}

// The Euler equation of the changed problem holds in the changed years as well as
// that of the usual one does in the usual ones: mean errors are at most three times
// the largest mean of those years (order of magnitude).
func TestContinueEulerErrors(t *testing.T) {
	usual := riskyHousehold(t)
	rule := solve(t, usual, DefaultOptions())
	first := usual.WorkingYears() - 4
	h := shaken(t, usual, first, 3)
	changed, err := Continue(t.Context(), h, DefaultOptions(), rule, first+3, first-1)
	if err != nil {
		t.Fatal(err)
	}
	for _, fine := range []bool{false, true} {
		normal, stressed := 0.0, 0.0
		a, b := NewJudge(rule, fine), NewJudge(changed, fine)
		for y := first - 1; y < first+3; y++ {
			high := 20 * usual.MeanIncome(0)
			normal = math.Max(normal, a.Judge(y, rule.BetweenNodes(y, high)).Mean)
			errors := b.Judge(y, changed.BetweenNodes(y, high))
			stressed = math.Max(stressed, errors.Mean)
			if errors.States < 100 || errors.Limit > 1e-6 {
				t.Errorf("fine %v, year %d: %+v", fine, y, errors)
			}
		}
		if stressed > 3*normal {
			t.Errorf("fine %v: mean errors up to %.1e, usually %.1e", fine, stressed, normal)
		}
	}
}

// The certain twin has the changed household's mean income in every year.
func TestTwinOfChangedHousehold(t *testing.T) {
	usual := riskyHousehold(t)
	h := shaken(t, usual, usual.WorkingYears()-2, 5)
	twin, err := h.Twin()
	if err != nil {
		t.Fatal(err)
	}
	for y := range h.Years() {
		if relative(twin.MeanIncome(y), h.MeanIncome(y)) > 1e-12 || twin.ReturnIn(y) != h.ReturnIn(y) {
			t.Errorf("year %d: the twin has %.9g and %g, want %.9g and %g", y, twin.MeanIncome(y), twin.ReturnIn(y), h.MeanIncome(y), h.ReturnIn(y))
		}
	}
}

func TestYearlyValuesAreChecked(t *testing.T) {
	h := riskyHousehold(t)
	h.Returns, h.Pension.Worth = []float64{0.1}, make([]float64, h.Years())
	h.Pension.Worth[3] = -1
	err := h.Validate()
	for _, want := range []string{"Returns: is 1 returns, want", "Pension.Worth[3]: is -1, want at least 0"} {
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("error %v has no %q", err, want)
		}
	}
	h = shaken(t, riskyHousehold(t), 2, 3)
	h.Returns[4] = -1
	if _, err := Continue(t.Context(), h, DefaultOptions(), nil, h.Years(), 0); err == nil || !strings.Contains(err.Error(), "Returns[4]") {
		t.Errorf("a return of -1 gives %v", err)
	}
}
