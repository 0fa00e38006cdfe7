package main

import (
	"context"
	"fmt"
	"strings"

	"cistern/output"
	"cistern/output/stats"
	"cistern/sim/decomposition"
)

// decompose makes the experiment of that name, which the scenario asks for.
func (r *run) decompose(ctx context.Context) error {
	d := r.sc.Experiments.Decomposition
	o := decomposition.Options{Order: d.Causes(), Households: d.Households, Solver: r.sc.Solver, Workers: r.g.workers}
	var p *progress
	stage := ""
	o.OnProgress = func(now string, done, total int64) {
		if now != stage {
			if p != nil {
				p.finish()
			}
			p, stage = r.g.newProgress(now, total), now
		}
		p.set(done)
	}
	population := r.sc.Population(r.rules, r.twins)
	result, err := decomposition.Run(ctx, population, o)
	if p != nil {
		p.finish()
	}
	if err != nil {
		return err
	}
	out := &output.Decomposition{FirstAge: r.sc.FirstAge, Groups: result.Groups, Removed: d.Order, Growth: r.sc.Growth}
	for _, year := range result.Cells {
		var cells []output.DecompositionSums
		for _, c := range year {
			cells = append(cells, output.DecompositionSums(c))
		}
		out.Cells = append(out.Cells, cells)
	}
	if out.Premium, err = decomposition.Premium(population); err != nil {
		return err
	}
	for _, g := range population.Groups {
		out.Shares = append(out.Shares, g.Share)
	}
	table := out.Table()
	table.Provenance = r.provenance()
	r.tables.decomposition = table
	r.apart = r.apartSentence(out)
	for i, g := range out.Groups {
		r.premium += fmt.Sprintf(", %s %.3g %%", g, 100*out.Premium[i])
	}
	if err := r.write("decomposition.parquet", table.WriteParquet); err != nil {
		return err
	}
	return r.write("decomposition.csv", table.WriteCSV)
}

// apartSentence says in a line what mean wealth is held for.
func (r *run) apartSentence(d *output.Decomposition) string {
	all, parts, left := d.Whole()
	money := func(e stats.Estimate) string { return fmt.Sprintf("%.0f (± %.0f)", e.Value, e.StandardError) }
	text := fmt.Sprintf("of mean assets of %s %s, ", money(all), r.sc.Currency)
	for k, cause := range d.Removed {
		held := " because of "
		if k == 0 {
			held = " are held because of "
		}
		if cause == "borrowing_limit" {
			cause = "the " + cause
		}
		text += money(parts[k]) + held + strings.ReplaceAll(cause, "_", " ") + ", "
	}
	return text + fmt.Sprintf("removed in this order; %s are left", money(left))
}
