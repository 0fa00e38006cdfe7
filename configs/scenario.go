package configs

import (
	"cistern/policy"
	"cistern/sim"
)

// Scenario is a population as described, checked and resolved.
type Scenario struct {
	Name       string // of the file without its ending, or of a built-in scenario
	Title      string
	Currency   string // unit of money, a label
	Seed       uint64
	Households int64
	Growth     float64 // of births, a year: weighs the ages of the whole population
	FirstAge   int
	LastAge    int
	Groups     []Group
	Solver     policy.Options
	Panel      Panel
	Summary    Summary
	Inputs     []Input // the files that the scenario names

	Experiments Experiments

	resolved *tree
}

// Group is one part of the population.
type Group struct {
	Name      string
	Share     float64          // of households
	Household policy.Household // with the mean discount factor
	Discounts []float64        // discount factors, equally likely
	Start     sim.Start
	Process   Process
}

// Process is how a group's persistent income was discretised.
type Process struct {
	Autocorrelation float64
	InnovationSD    float64
	Method          string // rouwenhorst or tauchen
	Points          int
	InitialSD       float64 // NaN: the stationary distribution
}

// Panel says what is written of the panel.
type Panel struct {
	Write     bool
	Precision string // double or single
	Block     int    // households a part file
}

// Summary says what the summary holds.
type Summary struct {
	Percentiles []float64 // in percent
	By          []string  // age, group
	Lorenz      []float64 // poorest shares, in percent
	TopShares   []float64 // richest shares, in percent
	Shortfall   []float64 // worst shares, in percent
	Tail        float64   // share of the upper tail whose index is estimated, in percent
	Mobility    []Mobility

	RunwayMonths     []float64 // months
	ConsumptionFalls []float64 // in percent
}

// Input is a file that a scenario names.
type Input struct {
	Name string // as the resolved scenario names it
	Data []byte
}
