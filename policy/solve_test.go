package policy

import (
	"context"
	"math"
	"testing"

	"cistern/income"
)

// process describes the income of a test household.
type process struct {
	years      int // working years
	profile    func(t int) float64
	form       income.Form
	chain      *income.Chain
	initial    []float64
	transitory income.Transitory
	jobLoss    income.JobLoss
}

func (p process) build(t *testing.T, firstAge int) *income.Earnings {
	t.Helper()
	if p.chain == nil {
		p.chain = income.Degenerate()
	}
	if p.initial == nil {
		p.initial = p.chain.Stationary()
	}
	if p.transitory.Nodes == 0 {
		p.transitory.Nodes = 1
	}
	profile := make([]float64, p.years)
	for i := range profile {
		profile[i] = p.profile(i)
	}
	e, err := income.Process{FirstAge: firstAge, Profile: profile, Form: p.form, Chain: p.chain, Initial: p.initial,
		Transitory: p.transitory, JobLoss: p.jobLoss}.Build()
	if err != nil {
		t.Fatal(err)
	}
	return e
}

func constant(y float64) func(int) float64 { return func(int) float64 { return y } }

func rouwenhorst(t *testing.T, points int, rho, sd float64) *income.Chain {
	t.Helper()
	c, err := income.Rouwenhorst{Points: points}.Discretise(income.AR1{Autocorrelation: rho, InnovationSD: sd})
	if err != nil {
		t.Fatal(err)
	}
	return c
}

func solve(t *testing.T, h Household, o Options) *Rule {
	t.Helper()
	r, err := Solve(context.Background(), h, o)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func family(t *testing.T) func(u Utility, err error) Utility {
	return func(u Utility, err error) Utility {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		return u
	}
}

// alive returns a survival curve of T years without mortality.
func alive(years int) []float64 { return income.Certain(25, 25+years-1) }

// relative returns |got/want − 1|.
func relative(got, want float64) float64 { return math.Abs(got/want - 1) }
