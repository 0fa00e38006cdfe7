package main

import (
	"context"
	"fmt"
	"math"

	"cistern/output"
	"cistern/output/distribution"
	"cistern/sim"
	"cistern/sim/transfer"
)

// wealthClasses is the number of equal parts of the distribution of wealth that
// responses to a transfer are told apart by.
const wealthClasses = 5

// transfer makes the experiment of that name, which the scenario asks for.
func (r *run) transfer(ctx context.Context) error {
	t := r.sc.Experiments.Transfer
	p := r.sc.Population(r.rules, nil)
	o := transfer.Options{Amount: t.Amount, Ages: t.Ages, Years: t.Years, Workers: r.g.workers}
	var bands []output.Band // those with an age of receipt
	for _, b := range output.DefaultBands(r.sc.FirstAge, r.sc.LastAge) {
		for _, age := range t.Ages {
			if b.First <= age && age <= b.Last {
				bands = append(bands, b)
				o.Bands = append(o.Bands, transfer.Band(b))
				break
			}
		}
	}
	for _, age := range t.Ages { // as in the summary, where ages are taken together
		o.Weights = append(o.Weights, math.Pow(1+r.sc.Growth, -float64(age-r.sc.FirstAge)))
	}
	var err error
	if o.Limits, err = r.wealthLimits(ctx, p, o); err != nil {
		return err
	}
	progress := r.g.newProgress("transfer", r.sc.Households)
	defer progress.finish()
	o.OnProgress = func(done, _ int64) { progress.set(done) }
	result, err := transfer.Run(ctx, p, o)
	if err != nil {
		return err
	}
	r.transferred = &output.Transfer{Amount: t.Amount, Bands: bands, Groups: r.groupNames(), Classes: wealthClasses, Years: t.Years}
	for i := range result.Cells {
		r.transferred.Cells = append(r.transferred.Cells, output.TransferSums(result.Cells[i]))
	}
	if result.AboveTop > 0 {
		r.warnings = append(r.warnings, fmt.Sprintf("with the transfer, %d of %d household-years are above the top of the asset grid; raise solver.highest_assets",
			result.AboveTop, result.HouseholdYears))
	}
	table := r.transferred.Table()
	table.Provenance = r.provenance()
	r.tables.transfer = table
	if err := r.write("transfer.parquet", table.WriteParquet); err != nil {
		return err
	}
	return r.write("transfer.csv", table.WriteCSV)
}

// wealthLimits finds the upper limits of the classes of wealth of every band, among
// all who enter a year of receipt in it, exactly: in as many passes as it takes.
func (r *run) wealthLimits(ctx context.Context, p *sim.Population, o transfer.Options) ([][]float64, error) {
	cells := make([]int, p.Years()) // [t] place in o.Ages, or −1
	for t := range cells {
		cells[t] = -1
	}
	study := distribution.Options{Variables: []distribution.Variable{{Name: "assets", Held: true}}, Cells: len(o.Ages),
		Rows: min(r.sc.Households*int64(len(o.Ages)), math.MaxUint32-1), Workers: r.g.workers}
	for i := 1; i < wealthClasses; i++ {
		study.Percentiles = append(study.Percentiles, float64(i)*100/wealthClasses)
	}
	for _, b := range o.Bands {
		target := distribution.Target{Wants: []distribution.Set{distribution.Percentiles}}
		for i, age := range o.Ages {
			if b.First <= age && age <= b.Last {
				cells[age-r.sc.FirstAge] = i
				target.Cells = append(target.Cells, distribution.Cell{Index: i, Weight: o.Weights[i]})
			}
		}
		study.Targets = append(study.Targets, target)
	}
	s, err := distribution.NewStudy(study)
	if err != nil {
		return nil, err
	}
	for more := true; more; {
		progress := r.g.newProgress(fmt.Sprintf("wealth fifths, pass %d", s.Passes()), r.sc.Households)
		_, err := sim.Simulate(ctx, p, sim.Options{Workers: r.g.workers, Columns: sim.Identity | sim.Changes,
			OnProgress: func(done, _ int64) { progress.set(done) }}, func(worker int, b *sim.Block) (func() error, error) {
			return s.Add(worker, receivers(b, cells))
		})
		progress.finish()
		if err != nil {
			return nil, err
		}
		if more, err = s.EndPass(); err != nil {
			return nil, err
		}
	}
	limits := make([][]float64, len(o.Bands))
	for i := range limits {
		t := s.Target(i)
		for k := range study.Percentiles {
			x := t.Percentile(0, k).Value
			if math.IsNaN(x) {
				x = 0 // nobody lives to these ages
			}
			limits[i] = append(limits[i], x)
		}
	}
	return limits, nil
}

// receivers are the assets with which those enter a year who are in a cell then.
func receivers(b *sim.Block, cells []int) *distribution.Rows {
	rows := &distribution.Rows{First: b.First, Values: make([][]float64, 1)}
	for _, run := range b.Runs {
		if cell := cells[run.T]; cell >= 0 {
			rows.Unit = append(rows.Unit, b.Household[run.From:run.To]...)
			rows.Values[0] = append(rows.Values[0], b.LastAssets[run.From:run.To]...)
			rows.Spans = append(rows.Spans, distribution.Span{Cell: cell, From: rows.N, To: len(rows.Unit)})
			rows.N = len(rows.Unit)
		}
	}
	return rows
}

// transferSentence says in a line what became of the transfer.
func (r *run) transferSentence() string {
	t := r.sc.Experiments.Transfer
	x := r.transferred.Response(-1, -1, -1)
	if x.Receipts == 0 {
		return fmt.Sprintf("of a bill of %g %s nothing can be said: no household could pay it", -t.Amount, r.sc.Currency)
	}
	percent := func(share, error float64) string { return fmt.Sprintf("%.2f %% (± %.2f)", 100*share, 100*error) }
	first, last := x.Consumed[0], x.Cumulated[t.Years]
	text := fmt.Sprintf("of %g %s that nobody expected, %s is consumed in the year it arrives", t.Amount, r.sc.Currency, percent(first.Value, first.StandardError))
	if t.Amount < 0 {
		text = fmt.Sprintf("of a bill of %g %s that nobody expected, consumption bears %s in the year it comes", -t.Amount, r.sc.Currency, percent(first.Value, first.StandardError))
	}
	if t.Years > 0 {
		text += fmt.Sprintf(", %s by the end of year %d after it", percent(last.Value, last.StandardError), t.Years)
	}
	text += fmt.Sprintf("; the rule's mean propensity is %s", percent(x.Propensity.Value, x.Propensity.StandardError))
	if t.Amount < 0 && x.Unable.Value > 0 {
		text += fmt.Sprintf("; %.2f %% of households could not pay and are left out", 100*x.Unable.Value)
	}
	return text
}
