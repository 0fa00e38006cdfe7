package calibration

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/optimize"

	"cistern/sim/sweep"
)

// Parameter is what a calibration is free to choose.
type Parameter struct {
	Key       string  // scenario key
	Low, High float64 // bounds, Low < High, in the unit of the key
	Start     float64 // a first guess within them; NaN: none
	Log       bool    // search by ratios: Low must be above 0
}

// Method is how a local search goes down.
type Method int

// The methods of local search.
const (
	NelderMead Method = iota // simplex (Nelder and Mead 1965, Computer Journal 7, 308–313)
	CMAES                    // finds the neighbourhood of a minimum, not its last digits: evolution strategy (Krause, Arbonès and Igel 2016, NeurIPS 29)
)

// Search looks for the lowest objective within bounds: first at points of a
// low-discrepancy sequence, then by local searches whose starts move from the best
// of these towards the best point found so far (Arnoud, Guvenen and Kleineberg
// 2019, NBER Working Paper 25682). Local search i of n starts at
//
//	(1 − θ_i)·s_i + θ_i·best,  θ_i = min(max(0.1, √(i/n)), 0.995),
//
// s_i the i-th best point of the sequence, i from 0. Everything happens in the
// unit cube, parameters with Log in logs; a step beyond a bound is folded back.
type Search struct {
	Parameters []Parameter
	Points     int     // of the sequence, at least 1
	Locals     int     // local searches, from 0 to Points
	Method     Method  // of the local searches
	Step       float64 // first step of a local search, share of the range, in (0, 0.5]
	Tolerance  float64 // a local search ends when the objective has fallen by less over ten steps a parameter, absolute
	Most       int     // evaluations of one local search, at least 1
	Seed       uint64  // of the sequence and of CMAES
}

// Evaluation is the objective at a point.
type Evaluation struct {
	Point []float64 // [parameter] in the units of the keys
	Value float64   // +Inf where the model has no solution
}

// Evaluator returns the objective at points, in their order. It may work on them
// side by side; results must not depend on how many come at once.
type Evaluator func(ctx context.Context, points [][]float64) ([]float64, error)

// Found is the end of a search.
type Found struct {
	Best        Evaluation
	Evaluations int       // different points
	Ends        []float64 // [local search] lowest objective of each
	AtBound     []bool    // [parameter] the best point lies within a thousandth of the range of a bound
}

// Validate reports every fault at once, each a *sweep.FieldError.
func (s Search) Validate() error {
	var errs []error
	bad := func(key, field string, value any, want string) {
		errs = append(errs, &sweep.FieldError{Key: key, Field: field, Value: value, Want: want})
	}
	for _, p := range s.Parameters {
		if p.Start < p.Low || p.Start > p.High {
			bad(p.Key, "start", p.Start, fmt.Sprintf("from %v to %v", p.Low, p.High))
		}
	}
	if s.Locals < 0 || s.Locals > s.Points {
		bad("", "locals", s.Locals, fmt.Sprintf("from 0 to the number of points, %d", s.Points))
	}
	if s.Method != NelderMead && s.Method != CMAES {
		bad("", "method", int(s.Method), "nelder_mead or cma_es")
	}
	if !(s.Step > 0 && s.Step <= 0.5) {
		bad("", "step", s.Step, "above 0 and at most 0.5")
	}
	if !(s.Tolerance >= 0) {
		bad("", "tolerance", s.Tolerance, "at least 0")
	}
	if s.Most < 1 {
		bad("", "most", s.Most, "at least 1")
	}
	return errors.Join(errors.Join(errs...), s.design().Validate())
}

// design is the sequence of the global stage.
func (s Search) design() sweep.Design {
	d := sweep.Design{Kind: sweep.Halton, Points: s.Points, Seed: s.Seed}
	for _, p := range s.Parameters {
		d.Axes = append(d.Axes, sweep.Axis{Key: p.Key, From: p.Low, To: p.High, Log: p.Log})
	}
	return d
}

// Minimise runs the search. known are evaluations of an earlier, interrupted run
// of the same search: they are not done again, and the end is the same. note, if
// not nil, is called after every new evaluation, one call at a time and in the same
// order whatever the evaluator does side by side; its error ends the search, as
// does one of the evaluator or the end of ctx.
func (s Search) Minimise(ctx context.Context, evaluate Evaluator, known []Evaluation, note func(Evaluation) error) (*Found, error) {
	if err := s.Validate(); err != nil {
		return nil, err
	}
	h := &hunt{Search: s, ctx: ctx, evaluate: evaluate, note: note, memory: map[string]float64{}}
	for _, e := range known {
		h.memory[identity(e.Point)] = e.Value
	}
	starts, err := h.global()
	if err != nil {
		return nil, err
	}
	out := &Found{}
	for i := range s.Locals {
		end, err := h.local(starts[i], i)
		if err != nil {
			return nil, err
		}
		out.Ends = append(out.Ends, end)
	}
	out.Best, out.Evaluations = h.best, len(h.seen)
	for j, p := range s.Parameters {
		u := p.unit(h.best.Point[j])
		out.AtBound = append(out.AtBound, u < 1e-3 || u > 1-1e-3)
	}
	return out, nil
}

// hunt is a search under way.
type hunt struct {
	Search
	ctx      context.Context
	evaluate Evaluator
	note     func(Evaluation) error
	memory   map[string]float64 // objective by point, of this run and the one before
	seen     map[string]bool    // points of this run
	best     Evaluation
}

// identity of a point: its exact numbers.
func identity(point []float64) string {
	b := make([]byte, 0, 8*len(point))
	for _, x := range point {
		bits := math.Float64bits(x)
		for s := 0; s < 64; s += 8 {
			b = append(b, byte(bits>>s))
		}
	}
	return string(b)
}

// at returns the objective at points, evaluating those not known.
func (h *hunt) at(points [][]float64) ([]float64, error) {
	var fresh [][]float64
	asked := map[string]bool{}
	for _, p := range points {
		id := identity(p)
		if _, known := h.memory[id]; !known && !asked[id] {
			asked[id] = true
			fresh = append(fresh, p)
		}
	}
	if len(fresh) > 0 {
		if h.ctx.Err() != nil {
			return nil, fmt.Errorf("calibration: stopped after %d evaluations: %w", len(h.seen), context.Cause(h.ctx))
		}
		values, err := h.evaluate(h.ctx, fresh)
		if err != nil {
			return nil, err
		}
		for i, p := range fresh {
			if math.IsNaN(values[i]) || math.IsInf(values[i], -1) {
				return nil, fmt.Errorf("calibration: the objective is %v at %v", values[i], p)
			}
			h.memory[identity(p)] = values[i]
			if h.note != nil {
				if err := h.note(Evaluation{slices.Clone(p), values[i]}); err != nil {
					return nil, err
				}
			}
		}
	}
	out := make([]float64, len(points))
	for i, p := range points {
		id := identity(p)
		out[i] = h.memory[id]
		if h.seen == nil {
			h.seen = map[string]bool{}
		}
		h.seen[id] = true
		if h.best.Point == nil || out[i] < h.best.Value {
			h.best = Evaluation{slices.Clone(p), out[i]}
		}
	}
	return out, nil
}

// global evaluates the first guess and the sequence; it returns the starts in the
// unit cube, the best first.
func (h *hunt) global() ([][]float64, error) {
	cube, err := h.design().Cube()
	if err != nil {
		return nil, err
	}
	if guess := h.guess(); guess != nil {
		cube = append([][]float64{guess}, cube[:h.Points-1]...)
	}
	values, err := h.at(h.points(cube))
	if err != nil {
		return nil, err
	}
	order := make([]int, len(cube))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int {
		switch {
		case values[a] < values[b]:
			return -1
		case values[a] > values[b]:
			return 1
		}
		return 0
	})
	starts := make([][]float64, len(order))
	for i, o := range order {
		starts[i] = cube[o]
	}
	return starts, nil
}

// guess is the first guess in the unit cube; nil unless every parameter has one.
func (s Search) guess() []float64 {
	var u []float64
	for _, p := range s.Parameters {
		if math.IsNaN(p.Start) {
			return nil
		}
		u = append(u, p.unit(p.Start))
	}
	return u
}

// points maps the unit cube to the parameters.
func (s Search) points(cube [][]float64) [][]float64 {
	out := make([][]float64, len(cube))
	for i, u := range cube {
		out[i] = make([]float64, len(u))
		for j, p := range s.Parameters {
			out[i][j] = p.value(u[j])
		}
	}
	return out
}

// value returns the parameter at u, folded into [0, 1].
func (p Parameter) value(u float64) float64 {
	u = math.Abs(math.Mod(u, 2))
	if u > 1 {
		u = 2 - u
	}
	switch {
	case u == 0:
		return p.Low
	case u == 1:
		return p.High
	case p.Log:
		return p.Low * math.Exp(u*math.Log(p.High/p.Low))
	}
	return p.Low + float64(u*(p.High-p.Low))
}

// unit is the inverse of value.
func (p Parameter) unit(x float64) float64 {
	if p.Log {
		return math.Log(x/p.Low) / math.Log(p.High/p.Low)
	}
	return (x - p.Low) / (p.High - p.Low)
}

// local runs local search i and returns its lowest objective.
func (h *hunt) local(start []float64, i int) (float64, error) {
	theta := min(max(0.1, math.Sqrt(float64(i)/float64(h.Locals))), 0.995)
	x := make([]float64, len(start))
	for j, p := range h.Parameters {
		x[j] = float64((1-theta)*start[j]) + float64(theta*p.unit(h.best.Point[j]))
	}
	var fault error
	lowest := math.Inf(1)
	problem := optimize.Problem{
		Func: func(u []float64) float64 {
			if fault != nil {
				return math.Inf(1)
			}
			values, err := h.at(h.points([][]float64{u}))
			if err != nil {
				fault = err
				return math.Inf(1)
			}
			lowest = min(lowest, values[0])
			return values[0]
		},
		Status: func() (optimize.Status, error) {
			if fault != nil {
				return optimize.Failure, fault
			}
			return optimize.NotTerminated, nil
		},
	}
	settings := &optimize.Settings{FuncEvaluations: h.Most, Concurrent: 1,
		Converger: &optimize.FunctionConverge{Absolute: h.Tolerance, Iterations: 10 * len(x)}}
	_, err := optimize.Minimize(problem, x, settings, h.method(i))
	if fault != nil {
		return 0, fault
	}
	if err != nil {
		return 0, fmt.Errorf("calibration: local search %d: %w", i, err)
	}
	return lowest, nil
}

func (h *hunt) method(i int) optimize.Method {
	if h.Method == CMAES {
		return &optimize.CmaEsChol{InitStepSize: h.Step, Src: sweep.Source(h.Seed + uint64(i) + 1)}
	}
	return &optimize.NelderMead{SimplexSize: h.Step}
}
