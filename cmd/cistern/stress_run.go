package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"time"

	"cistern/configs"
	"cistern/output"
	"cistern/output/contrast"
	"cistern/output/report"
	"cistern/policy"
	"cistern/sim"
	"cistern/sim/stress"
)

// stressRun is one stress of a scenario into a folder.
type stressRun struct {
	run
	st       *configs.Stress
	dir      string
	event    *sim.Event
	contrast *contrast.Contrast
	answers  *answers
	table    *output.Table // as written
}

// startStress sees to it that the stress can be run and, where there is something in
// its folder, that the folder can take it. An empty folder is made later, and a run
// to be replaced removed later, when the event turns out to be one that households
// can live through.
func startStress(g *globals, sc *configs.Scenario, st *configs.Stress) (*stressRun, error) {
	r := &stressRun{run: run{g: g, sc: sc, problems: sc.Problems()}, st: st, dir: g.stressFolder(sc, st)}
	cost := sc.StressCost(st, g.workers, r.options().Held())
	if free := freeMemory(); free > 0 && cost.MemoryBytes > free {
		return nil, &configs.PosError{File: sc.Name, Key: "households", Message: fmt.Sprintf("is %d: the stress would need about %s of memory, and %s are free; lower households, solver.asset_points, the stress's years.horizon or --workers",
			sc.Households, size(cost.MemoryBytes), size(free))}
	}
	r.hash = output.HashBytes([]byte(scenarioHash(sc) + output.HashBytes(st.YAML())))
	if entries, err := os.ReadDir(r.dir); !g.replace && (err == nil && len(entries) > 0 || err != nil && !errors.Is(err, os.ErrNotExist)) {
		return r, r.open(context.Background())
	}
	return r, nil
}

// open opens the folder.
func (r *stressRun) open(context.Context) error {
	if r.folder != nil {
		return nil
	}
	folder, err := output.OpenFolder(r.dir, output.Identity{Scenario: r.hash, Version: version()}, r.g.replace)
	r.folder = folder
	return folderHint(err)
}

// options is what is described of the two worlds.
func (r *stressRun) options() contrast.Options {
	return contrast.Options{FirstYear: -r.st.Window.Before, LastYear: r.st.Window.After, Groups: r.groupNames(), Bands: output.DefaultBands(r.sc.FirstAge, r.sc.LastAge),
		Percentiles: r.st.Percentiles, RunwayMonths: r.st.RunwayMonths, DryMonths: r.st.DryMonths, Worst: r.st.Worst, Within: r.st.Within,
		Households: r.sc.Households, RowsAYear: r.sc.RowsAYear(r.st), Weighted: r.sc.Growth != 0, Workers: r.g.workers}
}

// do takes all steps; run.json is the last.
func (r *stressRun) do(ctx context.Context) error {
	for _, step := range []struct {
		name string
		do   func(context.Context) error
	}{
		{"solve", r.solve},
		{"prepare", r.prepare},
		{"folder", r.open},
		{"scenario", r.writeInputs},
		{"simulate", r.simulate},
		{"tables", r.writeTables},
		{"report", r.report},
	} {
		start := time.Now()
		if err := step.do(ctx); err != nil {
			return err
		}
		r.timings = append(r.timings, output.Timing{Stage: step.name, Seconds: time.Since(start).Seconds()})
	}
	return r.finish()
}

func (r *stressRun) writeInputs(ctx context.Context) error {
	if err := r.writeScenario(ctx); err != nil {
		return err
	}
	return r.write("stress.yaml", func(w io.Writer) error { _, err := w.Write(r.st.YAML()); return err })
}

// solve finds the usual rules of all types.
func (r *stressRun) solve(ctx context.Context) error {
	var households []policy.Household
	for _, p := range r.problems {
		households = append(households, p.Household)
	}
	p := r.g.newProgress("solving", int64(len(households)))
	defer p.finish()
	var err error
	r.rules, err = solveAll(ctx, households, r.sc.Solver, r.g.workers, p.add)
	return err
}

// prepare finds what every type lives through that is hit, and the rules it follows.
func (r *stressRun) prepare(ctx context.Context) error {
	var p *progress
	defer func() {
		if p != nil {
			p.finish()
		}
	}()
	var err error
	r.event, err = stress.Prepare(ctx, r.sc.Population(r.rules, nil), &r.st.Event, r.st.Window, stress.Options{Solver: r.sc.Solver,
		Autocorrelation: r.sc.Autocorrelations(), Workers: r.g.workers, OnCourse: func(done, total int) {
			if p == nil {
				p = r.g.newProgress("preparing the event", int64(total))
			}
			p.set(int64(done))
		}})
	return err
}

// simulate runs the population through the event as many times as the figures ask
// for.
func (r *stressRun) simulate(ctx context.Context) error {
	population := r.sc.Population(r.rules, nil)
	var err error
	if r.contrast, err = contrast.New(r.options()); err != nil {
		return err
	}
	for more := true; more; {
		pass := r.contrast.Passes()
		p := r.g.newProgress(passName(pass-1), r.sc.Households)
		result, err := sim.Simulate(ctx, population, sim.Options{Workers: r.g.workers, Columns: sim.Identity | sim.Changes, Event: r.event,
			OnProgress: func(done, _ int64) { p.set(done) }}, func(worker int, b *sim.Block) (func() error, error) {
			return r.contrast.Add(worker, r.rows(population, b))
		})
		p.finish()
		if err != nil {
			return err
		}
		r.result = result
		if more, err = r.contrast.EndPass(); err != nil {
			return err
		}
	}
	if n := r.result.AboveTop; n > 0 {
		r.warnings = append(r.warnings, fmt.Sprintf("in %d of %d household-years lived in either world cash-on-hand lies above the top of the asset grid, where the rule is extrapolated; raise solver.highest_assets",
			n, r.result.HouseholdYears))
	}
	return nil
}

// rows are a block's rows as figures are made of them.
func (r *stressRun) rows(p *sim.Population, b *sim.Block) *contrast.Rows {
	rows := &contrast.Rows{First: b.First, Households: b.Households, Household: b.Household,
		Usual: contrast.World{Income: b.Income, Consumption: b.Consumption, Assets: b.Assets, Lowest: b.Lowest, JobLost: b.JobLost},
		Event: contrast.World{Income: b.EventIncome, Consumption: b.EventConsumption, Assets: b.EventAssets, Lowest: b.EventLowest, JobLost: b.EventJobLost}}
	for _, s := range b.Runs {
		rows.Spans = append(rows.Spans, contrast.Span{Year: s.Year, Group: s.Group, Age: r.sc.FirstAge + s.T - s.Year, Weight: stress.Weight(r.sc.Growth, s.Year-s.T),
			Working: p.Types[s.Type].Rule.Household.Working(s.T), From: s.From, To: s.To})
	}
	return rows
}

// writeTables writes the figures.
func (r *stressRun) writeTables(context.Context) error {
	r.answers = newAnswers(r.sc, r.st, r.contrast.Figures())
	t := r.contrast.Table()
	t.Provenance = r.provenance()
	t.Provenance["stress"] = r.st.Title
	r.table = t
	if err := r.write("stress.parquet", t.WriteParquet); err != nil {
		return err
	}
	return r.write("stress.csv", t.WriteCSV)
}

// report writes the page and its figures.
func (r *stressRun) report(ctx context.Context) error {
	page := stressPage(r.sc, r.st, reportRun(r.sc, version(), r.hash, r.inputHashes()), r.warnings, r.table)
	if err := r.write("report.html", page.Write); err != nil {
		return err
	}
	return r.writeFigures(ctx, report.Figures(page.Sections))
}

// stressPage is the page about a stress; of says what any page about the scenario
// does.
func stressPage(sc *configs.Scenario, st *configs.Stress, of *report.Run, warnings []string, t *output.Table) *report.Page {
	p := &report.StressRun{Title: title(sc, st), Currency: sc.Currency, Table: t, Assumptions: of.Assumptions, Provenance: of.Provenance, Warnings: warnings, Caution: caution}
	for k, a := range newAnswers(sc, st, contrast.ReadTable(t)).all() {
		if k == 0 { // everybody
			p.Words = append(p.Words, a.lines...)
			continue
		}
		p.Hit = append(p.Hit, report.Section{ID: fmt.Sprintf("hit-%d", k), Title: a.who, Words: a.lines})
	}
	for _, s := range st.Settings() {
		p.Event = append(p.Event, report.Assumption(s))
	}
	return report.StressPage(p)
}

// finish writes run.json, which makes the run finished.
func (r *stressRun) finish() error {
	counts := map[string]int64{"households": r.result.Households, "household_years": r.result.HouseholdYears,
		"household_years_above_grid": r.result.AboveTop, "types": int64(len(r.problems)), "passes": int64(r.contrast.Passes() - 1)}
	return r.folder.Finish(output.Run{Version: version(), Title: title(r.sc, r.st), Seed: r.sc.Seed, Scenario: r.hash, Inputs: r.inputHashes(),
		Counts: counts, Timings: r.timings, Warnings: r.warnings, Caution: caution})
}

// title says in a line what a stress is about.
func title(sc *configs.Scenario, st *configs.Stress) string {
	a, b := sc.Title, st.Title
	if a == "" {
		a = sc.Name
	}
	if b == "" {
		b = st.Name
	}
	return a + ": " + b
}
