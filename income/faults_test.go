package income_test

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"cistern/income"
)

// checkFaults compares the fields at fault, in order.
func checkFaults(t *testing.T, err error, want ...string) {
	t.Helper()
	var got []string
	for _, f := range income.Faults(err) {
		got = append(got, f.Field)
		if f.Want == "" || !strings.Contains(f.Error(), f.Field) || !strings.Contains(f.Error(), f.Want) {
			t.Errorf("%q does not say what is wanted", f.Error())
		}
	}
	if !slices.Equal(got, want) {
		t.Errorf("faults %q, want %q (%v)", got, want, err)
	}
	if (err == nil) != (len(want) == 0) {
		t.Errorf("error %v with %d faults", err, len(want))
	}
}

func TestAR1Validate(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	below := math.Nextafter(1, 0)
	tests := []struct {
		rho, sd float64
		want    []string
	}{
		{0.9, 0.1, nil}, {-0.9, 0.1, nil}, {0, 0, nil}, {below, 0.1, nil}, {-below, 0.1, nil},
		{1, 0.1, []string{"Autocorrelation"}},
		{-1, 0.1, []string{"Autocorrelation"}},
		{nan, 0.1, []string{"Autocorrelation"}},
		{inf, 0.1, []string{"Autocorrelation"}},
		{0.9, -1e-300, []string{"InnovationSD"}},
		{0.9, nan, []string{"InnovationSD"}},
		{0.9, inf, []string{"InnovationSD"}},
		{below, 1e308, []string{"InnovationSD"}}, // stationary sd overflows
		{1.2, -1, []string{"Autocorrelation", "InnovationSD"}},
	}
	for _, tt := range tests {
		t.Run(fmt.Sprintf("rho=%g,sd=%g", tt.rho, tt.sd), func(t *testing.T) {
			checkFaults(t, income.AR1{Autocorrelation: tt.rho, InnovationSD: tt.sd}.Validate(), tt.want...)
		})
	}
}

func TestDiscretisersReportEveryFault(t *testing.T) {
	good, bad := income.AR1{Autocorrelation: 0.9, InnovationSD: 0.1}, income.AR1{Autocorrelation: 2, InnovationSD: -1}
	tests := []struct {
		d    income.Discretiser
		p    income.AR1
		want []string
	}{
		{income.Rouwenhorst{Points: 1}, good, []string{"Points"}},
		{income.Rouwenhorst{Points: 1001}, good, []string{"Points"}},
		{income.Rouwenhorst{Points: 0}, bad, []string{"Autocorrelation", "InnovationSD", "Points"}},
		{income.Tauchen{Points: -3, Span: math.NaN()}, bad, []string{"Autocorrelation", "InnovationSD", "Points", "Span"}},
		{income.Tauchen{Points: 5}, good, []string{"Span"}},
		{income.Tauchen{Points: 5, Span: math.Inf(1)}, good, []string{"Span"}},
		{income.Tauchen{Points: 5, Span: 3}, good, nil},
	}
	for _, tt := range tests {
		c, err := tt.d.Discretise(tt.p)
		checkFaults(t, err, tt.want...)
		if (c == nil) != (len(tt.want) > 0) {
			t.Errorf("%+v: chain %v with error %v", tt.d, c, err)
		}
	}
}

func TestChainValidate(t *testing.T) {
	nan := math.NaN()
	tests := []struct {
		name  string
		chain income.Chain
		want  []string
	}{
		{"degenerate", *income.Degenerate(), nil},
		{"empty", income.Chain{}, []string{"Nodes"}},
		{"descending", income.Chain{Nodes: []float64{1, 0}, Transition: []float64{1, 0, 0, 1}}, []string{"Nodes[1]"}},
		{"equal nodes", income.Chain{Nodes: []float64{1, 1}, Transition: []float64{1, 0, 0, 1}}, []string{"Nodes[1]"}},
		{"no numbers", income.Chain{Nodes: []float64{nan, math.Inf(1)}, Transition: []float64{1, 0, 0, 1}}, []string{"Nodes[0]", "Nodes[1]"}},
		{"wrong size", income.Chain{Nodes: []float64{0, 1}, Transition: []float64{1, 0, 0}}, []string{"Transition"}},
		{"rows", income.Chain{Nodes: []float64{0, 1}, Transition: []float64{1, 1e-11, 0.5, 0.4}}, []string{"Transition row 0", "Transition row 1"}},
		{"rounding", income.Chain{Nodes: []float64{0, 1}, Transition: []float64{1, 1e-13, 0.5, 0.5}}, nil},
		{"negative chance", income.Chain{Nodes: []float64{0, 1}, Transition: []float64{1.5, -0.5, nan, 1}}, []string{"Transition row 0", "Transition row 1"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) { checkFaults(t, tt.chain.Validate(), tt.want...) })
	}
}

func TestBuildReportsEveryFault(t *testing.T) {
	nan := math.NaN()
	one := income.Transitory{Nodes: 1}
	ok := func() income.Process {
		return income.Process{Profile: []float64{1, 2}, Chain: income.Degenerate(), Initial: []float64{1}, Transitory: one}
	}
	tests := []struct {
		name   string
		change func(*income.Process)
		want   []string
	}{
		{"nothing", func(p *income.Process) {}, nil},
		{"zero value", func(p *income.Process) { *p = income.Process{} }, []string{"Profile", "Chain", "Transitory.Nodes"}},
		{"log needs positive earnings", func(p *income.Process) { p.Profile = []float64{0, -1, 1} }, []string{"Profile[0]", "Profile[1]"}},
		{"level does not", func(p *income.Process) { p.Profile, p.Form = []float64{0, -1, 1}, income.Level }, nil},
		{"no numbers", func(p *income.Process) { p.Profile = []float64{nan, math.Inf(1)} }, []string{"Profile[0]", "Profile[1]"}},
		{"unknown form and meaning", func(p *income.Process) { p.Form, p.ProfileIs = 7, -1 }, []string{"Form", "ProfileIs"}},
		{"bad chain", func(p *income.Process) { p.Chain = &income.Chain{} }, []string{"Nodes"}},
		{"start of another size", func(p *income.Process) { p.Initial = []float64{0.5, 0.5} }, []string{"Initial"}},
		{"start beyond 1", func(p *income.Process) { p.Initial = []float64{1.1} }, []string{"Initial"}},
		{"start no number", func(p *income.Process) { p.Initial = []float64{nan} }, []string{"Initial"}},
		{"job loss", func(p *income.Process) { p.JobLoss = income.JobLoss{Probability: 1.1, BenefitRate: -1} }, []string{"JobLoss.Probability", "JobLoss.BenefitRate"}},
		{"job loss no number", func(p *income.Process) { p.JobLoss = income.JobLoss{Probability: nan, BenefitRate: nan} }, []string{"JobLoss.Probability", "JobLoss.BenefitRate"}},
		{"certain job loss", func(p *income.Process) { p.JobLoss.Probability = 1 }, nil},
		{"shock", func(p *income.Process) { p.Transitory = income.Transitory{SD: -1, Nodes: 1001, Rule: 9} }, []string{"Transitory.SD", "Transitory.Nodes", "Transitory.Rule"}},
		{"shock no number", func(p *income.Process) { p.Transitory.SD = nan }, []string{"Transitory.SD"}},
		{"overflow of the shock", func(p *income.Process) { p.Transitory = income.Transitory{SD: 1000, Nodes: 5} }, []string{"earnings at age 0 and z = 0"}},
		{"overflow of the profile", func(p *income.Process) {
			p.Profile[1], p.JobLoss = 1e308, income.JobLoss{Probability: 0.1, BenefitRate: 10}
		}, []string{"earnings at age 1 and z = 0"}},
		{"everything", func(p *income.Process) {
			*p = income.Process{Profile: []float64{-1}, Form: 5, JobLoss: income.JobLoss{Probability: 2}, Transitory: income.Transitory{SD: -1}}
		}, []string{"Form", "Chain", "JobLoss.Probability", "Transitory.SD", "Transitory.Nodes"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			p := ok()
			tt.change(&p)
			e, err := p.Build()
			checkFaults(t, err, tt.want...)
			if (e == nil) != (len(tt.want) > 0) {
				t.Errorf("earnings %v with error %v", e, err)
			}
		})
	}
}

func TestFaultsOfOtherErrors(t *testing.T) {
	if got := income.Faults(nil); got != nil {
		t.Errorf("no error has %v", got)
	}
	if got := income.Faults(errors.New("disk full")); got != nil {
		t.Errorf("another error has %v", got)
	}
	wrapped := fmt.Errorf("group dockers: %w", income.AR1{Autocorrelation: 2, InnovationSD: -1}.Validate())
	if got := income.Faults(wrapped); len(got) != 2 {
		t.Errorf("a wrapped error has %v, want both faults", got)
	}
}

// FuzzDiscretise: whatever the numbers, a chain that passes Validate and has a
// stationary law, or field errors.
func FuzzDiscretise(f *testing.F) {
	f.Add(0.9, 0.1, 9, 3.0, 0.2)
	f.Add(-0.999999, 1e-300, 2, 1e-9, 0.0)
	f.Add(0.9999999999999999, 1e300, 200, 1e9, 1e308)
	f.Add(math.NaN(), math.Inf(1), -1, -1.0, 1.0)
	f.Add(0.0, 5e-324, 3, 3.0, 5e-324)
	f.Fuzz(func(t *testing.T, rho, sd float64, points int, span, start float64) {
		points %= 60
		for _, d := range []income.Discretiser{income.Rouwenhorst{Points: points}, income.Tauchen{Points: points, Span: span}} {
			c, err := d.Discretise(income.AR1{Autocorrelation: rho, InnovationSD: sd})
			if err != nil {
				if len(income.Faults(err)) == 0 {
					t.Fatalf("%v is no field error", err)
				}
				continue
			}
			if err := c.Validate(); err != nil {
				t.Fatalf("%+v: %v", d, err)
			}
			if law := total(c.Stationary()); !(math.Abs(law-1) < 1e-12) {
				t.Fatalf("%+v: stationary law sums to %g", d, law)
			}
			if start >= 0 && !(math.Abs(total(c.Project(start))-1) < 1e-12) {
				t.Fatalf("%+v: start sums to %g", d, total(c.Project(start)))
			}
		}
	})
}
