package main

import (
	"context"
	"fmt"
	"io"
	"runtime"
	"slices"
	"time"

	"cistern/configs"
	"cistern/output"
	"cistern/output/mobility"
	"cistern/policy"
	"cistern/sim"
)

// run is one simulation of a scenario into a folder.
type run struct {
	g        *globals
	sc       *configs.Scenario
	folder   *output.Folder
	hash     string // of the scenario as resolved, with its inputs
	problems []configs.Problem
	rules    []*policy.Rule
	twins    []*policy.Rule

	reductions  []*reduction // of the panel: summary and mobility
	summary     *output.Summary
	mobility    []*mobility.Study
	transferred *output.Transfer // nil: no such experiment
	apart       string           // what wealth is held for; empty: no such experiment
	premium     string           // equivalent premium by group; empty: no such experiment
	sample      *sample
	result      sim.Result
	accuracy    *accuracy
	tables      struct{ summary, policy, accuracy, mobility, transfer, decomposition *output.Table } // as written
	timings     []output.Timing
	warnings    []string
}

// startRun opens the run folder.
func startRun(g *globals, sc *configs.Scenario, dir string) (*run, error) {
	r := &run{g: g, sc: sc, problems: sc.Problems(), hash: scenarioHash(sc)}
	folder, err := output.OpenFolder(dir, output.Identity{Scenario: r.hash, Version: version()}, g.replace)
	if err != nil {
		return nil, folderHint(err)
	}
	r.folder = folder
	if folder.Resumed() {
		g.say("going on with the unfinished run in %s", dir)
	}
	return r, nil
}

// scenarioHash identifies a scenario: what it resolves to and the files it names.
func scenarioHash(sc *configs.Scenario) string {
	b := sc.YAML()
	for _, in := range sc.Inputs {
		b = append(b, output.HashBytes(in.Data)...)
	}
	return output.HashBytes(b)
}

// do takes all steps; run.json is the last.
func (r *run) do(ctx context.Context) error {
	for _, step := range []struct {
		name string
		do   func(context.Context) error
	}{
		{"scenario", r.writeScenario},
		{"solve", r.solve},
		{"simulate", r.simulate},
		{"accuracy", r.judge},
		{"tables", r.writeTables},
		{"transfer", r.transfer},
		{"decomposition", r.decompose},
		{"report", r.report},
	} {
		if step.name == "transfer" && r.sc.Experiments.Transfer == nil || step.name == "decomposition" && r.sc.Experiments.Decomposition == nil {
			continue
		}
		start := time.Now()
		if err := step.do(ctx); err != nil {
			return err
		}
		r.timings = append(r.timings, output.Timing{Stage: step.name, Seconds: time.Since(start).Seconds()})
	}
	return r.finish()
}

// writeScenario writes the scenario as resolved and the tables it names.
func (r *run) writeScenario(context.Context) error {
	for _, in := range r.sc.Inputs {
		if err := r.write(in.Name, func(w io.Writer) error { _, err := w.Write(in.Data); return err }); err != nil {
			return err
		}
	}
	return r.write("scenario.yaml", func(w io.Writer) error { _, err := w.Write(r.sc.YAML()); return err })
}

// write puts a file into the run folder, whole or not at all.
func (r *run) write(name string, render func(io.Writer) error) error {
	path, err := r.folder.Path(name)
	if err != nil {
		return err
	}
	return output.WriteFile(path, render)
}

// solve finds the rules of all types and of their twins.
func (r *run) solve(ctx context.Context) error {
	households := make([]policy.Household, 0, 2*len(r.problems))
	for _, p := range r.problems {
		households = append(households, p.Household)
	}
	for _, p := range r.problems {
		twin, err := p.Household.Twin()
		if err != nil {
			return err
		}
		households = append(households, twin)
	}
	p := r.g.newProgress("solving", int64(len(households)))
	defer p.finish()
	rules, err := solveAll(ctx, households, r.sc.Solver, r.g.workers, p.add)
	if err != nil {
		return err
	}
	r.rules, r.twins = rules[:len(r.problems)], rules[len(r.problems):]
	return nil
}

// simulate runs the panel through writer and reductions, as many times as these ask
// for.
func (r *run) simulate(ctx context.Context) error {
	population := r.sc.Population(r.rules, r.twins)
	if err := r.newReductions(); err != nil {
		return err
	}
	r.sample = newSample(len(r.sc.Groups), population.Years())
	panel, from, err := r.openPanel()
	if err != nil {
		return err
	}
	for pass := 0; ; pass++ {
		columns := sim.Identity | sim.Propensity | sim.Twins | sim.Changes
		if pass == 0 {
			columns |= sim.States
			if panel != nil {
				columns = sim.All
			}
		}
		p := r.g.newProgress(passName(pass), r.sc.Households)
		result, err := sim.Simulate(ctx, population, sim.Options{Workers: r.g.workers, Columns: columns,
			OnProgress: func(done, _ int64) { p.set(done) }}, r.work(pass, panel, from))
		p.finish()
		if err != nil {
			if panel != nil && pass == 0 {
				err = joinAbort(err, panel)
			}
			return err
		}
		if pass == 0 {
			r.result = result
			if panel != nil {
				if err := panel.Close(); err != nil {
					return err
				}
				panel = nil
			}
		}
		runtime.GC() // a pass leaves its blocks and buffers behind: the next must not come on top of them
		more, err := r.endPass()
		if err != nil {
			return err
		}
		if !more {
			return nil
		}
	}
}

func passName(pass int) string {
	if pass == 0 {
		return "simulating"
	}
	return fmt.Sprintf("distribution, pass %d", pass+1)
}

// joinAbort removes the unfinished part of the panel after a failure.
func joinAbort(err error, panel *output.Panel) error {
	if e := panel.Abort(); e != nil {
		return fmt.Errorf("%w; and the unfinished part could not be removed: %v", err, e)
	}
	return err
}

// work handles one block of a pass.
func (r *run) work(pass int, panel *output.Panel, from int64) sim.Work {
	return func(worker int, b *sim.Block) (func() error, error) {
		spans := r.spans(b)
		add, err := r.reduce(worker, b, spans)
		if err != nil || pass > 0 {
			return add, err
		}
		var encoded func() error
		if panel != nil && b.First >= from {
			if encoded, err = panel.Encode(worker, panelRows(b, spans)); err != nil {
				return nil, err
			}
		}
		states := r.sample.candidates(b)
		return func() error {
			r.sample.add(states)
			if add != nil {
				if err := add(); err != nil {
					return err
				}
			}
			if encoded != nil {
				return encoded()
			}
			return nil
		}, nil
	}
}

// spans says which age and group a block's rows have.
func (r *run) spans(b *sim.Block) []output.Span {
	spans := make([]output.Span, len(b.Runs))
	for i, s := range b.Runs {
		spans[i] = output.Span{Age: int32(r.sc.FirstAge + s.T), Group: s.Group, From: s.From, To: s.To}
	}
	return spans
}

func panelRows(b *sim.Block, spans []output.Span) output.Rows {
	return output.Rows{First: b.First, Households: b.Households, N: b.N, Spans: spans, Position: b.Position, Household: b.Household,
		Persistent: b.Persistent, Transitory: b.Transitory, Employed: b.Employed, Earnings: b.Earnings, Pension: b.Pension, Taxes: b.Taxes,
		Income: b.Income, CashOnHand: b.CashOnHand, Consumption: b.Consumption, Assets: b.Assets, Died: b.Died}
}

// openPanel prepares the panel; from is the first household not yet in a whole
// part. Without a panel it returns nil.
func (r *run) openPanel() (panel *output.Panel, from int64, err error) {
	if !r.sc.Panel.Write {
		return nil, 0, nil
	}
	dir, err := r.folder.Path("panel/")
	if err != nil {
		return nil, 0, err
	}
	o := output.PanelOptions{To: r.sc.Households, Unit: sim.Unit, Block: r.sc.Panel.Block, Groups: r.groupNames(), Currency: r.sc.Currency,
		Provenance: r.provenance(), Workers: r.g.workers}
	if r.sc.Panel.Precision == "single" {
		o.Precision = output.Single
	}
	if r.folder.Resumed() {
		if o.From, err = o.Resume(dir); err != nil {
			return nil, 0, err
		}
	}
	panel, err = output.NewPanel(dir, o)
	return panel, o.From, err
}

// provenance says where a file comes from; it holds no times, so that equal runs
// give equal bytes.
func (r *run) provenance() map[string]string {
	return map[string]string{"scenario": r.sc.Title, "scenario_sha256": r.hash, "seed": fmt.Sprint(r.sc.Seed), "version": version(), "caution": caution}
}

func (r *run) groupNames() []string {
	var names []string
	for _, g := range r.sc.Groups {
		names = append(names, g.Name)
	}
	return names
}

func (r *run) newSummary() error {
	var by []output.Dimension
	if slices.Contains(r.sc.Summary.By, "age") {
		by = append(by, output.ByAge)
	}
	if slices.Contains(r.sc.Summary.By, "group") {
		by = append(by, output.ByGroup)
	}
	s, err := output.NewSummary(output.SummaryOptions{FirstAge: r.sc.FirstAge, LastAge: r.sc.LastAge, Groups: r.groupNames(),
		Households: r.sc.Households, Percentiles: r.sc.Summary.Percentiles, By: by,
		Lorenz: r.sc.Summary.Lorenz, TopShares: r.sc.Summary.TopShares, Shortfalls: r.sc.Summary.Shortfall, Tail: r.sc.Summary.Tail,
		Runway: r.sc.Summary.RunwayMonths, Falls: r.sc.Summary.ConsumptionFalls, Growth: r.sc.Growth,
		Bands: output.DefaultBands(r.sc.FirstAge, r.sc.LastAge), Workers: r.g.workers})
	r.summary = s
	return err
}

// finish writes run.json, which makes the run finished.
func (r *run) finish() error {
	counts := map[string]int64{"households": r.result.Households, "household_years": r.result.HouseholdYears,
		"household_years_above_grid": r.result.AboveTop, "types": int64(len(r.problems)), "summary_passes": int64(r.summary.Passes())}
	return r.folder.Finish(output.Run{Version: version(), Title: r.sc.Title, Seed: r.sc.Seed, Scenario: r.hash, Inputs: r.inputHashes(),
		Counts: counts, Timings: r.timings, Warnings: r.warnings, Caution: caution})
}
