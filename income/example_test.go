package income_test

import (
	"fmt"

	"cistern/income"
)

// Seven nodes keep the process's standard deviation and persistence exactly.
func ExampleRouwenhorst() {
	process := income.AR1{Autocorrelation: 0.95, InnovationSD: 0.15}
	chain, err := income.Rouwenhorst{Points: 7}.Discretise(process)
	if err != nil {
		fmt.Println(err)
		return
	}
	m := chain.Moments(chain.Stationary())
	fmt.Printf("process: sd %.4f, autocorrelation %.4f\n", process.StationarySD(), process.Autocorrelation)
	fmt.Printf("chain:   sd %.4f, autocorrelation %.4f\n", m.SD, m.Autocorrelation)
	// Output:
	// process: sd 0.4804, autocorrelation 0.9500
	// chain:   sd 0.4804, autocorrelation 0.9500
}

// A grid that is too coarse for its process says so.
func ExampleRemarks() {
	process := income.AR1{Autocorrelation: 0.98, InnovationSD: 0.1}
	chain, err := income.Tauchen{Points: 9, Span: 3}.Discretise(process)
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, remark := range income.Remarks(process, chain) {
		fmt.Println(remark)
	}
	// Output:
	// standard deviation 0.6273 on the chain, 0.5025 in the process: 24.8 % too high
	// autocorrelation 0.988978 on the chain, 0.98 in the process: a shock halves in 62.5 years instead of 34.3
	// innovations with standard deviation 0.09287 on the chain, 0.1 in the process: 7.1 % too low
	// method rouwenhorst has all three exact with as few as 9 points; otherwise use more points
}

// Mean earnings are the profile less what job loss takes, whatever the risk.
func ExampleProcess_Build() {
	chain, err := income.Rouwenhorst{Points: 5}.Discretise(income.AR1{Autocorrelation: 0.9, InnovationSD: 0.2})
	if err != nil {
		fmt.Println(err)
		return
	}
	earnings, err := income.Process{
		FirstAge:   25,
		Profile:    income.Constant(30000, 40),
		Chain:      chain,
		Initial:    chain.Stationary(),
		Transitory: income.Transitory{SD: 0.3, Nodes: 15},
		JobLoss:    income.JobLoss{Probability: 0.1, BenefitRate: 0.5},
	}.Build()
	if err != nil {
		fmt.Println(err)
		return
	}
	values, weights := earnings.Outcomes(0, 2)
	fmt.Printf("%d outcomes at the middle node, the last (benefit) %.0f with chance %.2f\n", len(values), values[15], weights[15])
	fmt.Printf("mean earnings at 25: %.2f\n", earnings.Mean(0))
	// Output:
	// 16 outcomes at the middle node, the last (benefit) 13514 with chance 0.10
	// mean earnings at 25: 28500.00
}

// Every fault is reported at once.
func ExampleAR1_Validate() {
	err := income.AR1{Autocorrelation: 1.2, InnovationSD: -0.1}.Validate()
	for _, fault := range income.Faults(err) {
		fmt.Println(fault)
	}
	// Output:
	// Autocorrelation: is 1.2, want strictly between -1 and 1
	// InnovationSD: is -0.1, want at least 0 and finite
}

func ExampleGompertz_Survival() {
	survival, err := income.Gompertz{ModalAge: 88, Dispersion: 9}.Survival(65, 67)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("%.4f\n", survival)
	// Output:
	// [0.9909 0.9899 0.0000]
}
