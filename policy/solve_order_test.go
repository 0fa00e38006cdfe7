package policy

import (
	"math"
	"testing"

	"cistern/income"
)

// riskyHousehold is a small problem with every feature that bends the rule:
// persistent and transitory risk, job loss, a limit, mortality, a pension.
func riskyHousehold(t *testing.T) Household {
	t.Helper()
	e := process{years: 25, profile: func(i int) float64 { return 1 + 0.03*float64(i) - 0.0008*float64(i*i) },
		chain:      rouwenhorst(t, 5, 0.95, 0.15),
		transitory: income.Transitory{SD: 0.2, Nodes: 15, Rule: income.Trapezoid},
		jobLoss:    income.JobLoss{Probability: 0.04, BenefitRate: 0.5}}.build(t, 40)
	survival, err := income.Gompertz{ModalAge: 88, Dispersion: 10}.Survival(40, 95)
	if err != nil {
		t.Fatal(err)
	}
	return Household{FirstAge: 40, Survival: survival, Utility: family(t)(NewCRRA(2)), DiscountFactor: 0.96,
		Return: 0.03, Earnings: e, Pension: Pension{ClaimAge: 65, FinalEarningsRate: 0.4, Flat: 0.1}}
}

// meanPolicyError returns the mean relative difference of consumption between two
// rules on a dense set of states.
func meanPolicyError(a, b *Rule) float64 {
	sum, n := 0.0, 0
	for t := range a.Curves {
		for j := range a.Curves[t] {
			for i := range 400 {
				m := 0.05 * math.Exp(float64(i)*math.Log(40/0.05)/400)
				sum += relative(a.Consumption(t, j, m), b.Consumption(t, j, m))
				n++
			}
		}
	}
	return sum / float64(n)
}

// smoothHousehold is riskyHousehold without anything that bends its rule sharply:
// it may borrow what its lowest income, nothing at all while working, can repay,
// and never reaches that limit.
func smoothHousehold(t *testing.T) Household {
	h := riskyHousehold(t)
	p := h.Earnings.Process
	p.JobLoss.BenefitRate = 0
	e, err := p.Build()
	if err != nil {
		t.Fatal(err)
	}
	h.Earnings, h.Limit, h.Pension = e, Limit{Kind: LimitNatural}, Pension{ClaimAge: 65, Flat: 0.5}
	return h
}

// Halving the distance between nodes divides the error of linear interpolation by
// 2², of cubic Hermite interpolation with exact slopes by 2⁴ where the rule is
// smooth (de Boor 1978, A Practical Guide to Splines, chapters III and IV; from
// memory). At kinks too weak to get a node the cubic keeps a small error of lower
// order, hence the looser demand on the household with a limit.
func TestGridRefinementOrder(t *testing.T) {
	for _, tt := range []struct {
		name      string
		household func(*testing.T) Household
		method    Interpolation
		from      int
		order     float64
		finest    float64 // largest mean error on the finest grid
	}{
		{"linear, limit", riskyHousehold, Linear, 100, 2, 1e-4},
		{"linear, smooth", smoothHousehold, Linear, 100, 2, 1e-4},
		{"cubic, smooth", smoothHousehold, Cubic, 50, 4, 1e-9},
		{"cubic, limit", riskyHousehold, Cubic, 25, 2, 1e-6},
	} {
		t.Run(tt.name, func(t *testing.T) {
			h := tt.household(t)
			o := DefaultOptions()
			o.AssetPoints, o.KinkThreshold = 2400, 1e-4
			exact := solve(t, h, o)
			var errs []float64
			for _, n := range []int{tt.from, 2 * tt.from, 4 * tt.from} {
				o := DefaultOptions()
				o.AssetPoints, o.Interpolation = n, tt.method
				errs = append(errs, meanPolicyError(solve(t, h, o), exact))
			}
			order := math.Log2(errs[0]/errs[2]) / 2
			t.Logf("mean errors %.2e, observed order %.2f", errs, order)
			if order < tt.order-0.25 {
				t.Errorf("order %.2f, want about %g (errors %.2e)", order, tt.order, errs)
			}
			if errs[2] > tt.finest {
				t.Errorf("mean error %.2e on the finest grid, want at most %.0e", errs[2], tt.finest)
			}
		})
	}
}
