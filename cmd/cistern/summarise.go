package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"cistern/output"
	"cistern/output/distribution"
	"cistern/output/survey"
)

// summariseFlags are the flags of summarise.
type summariseFlags struct {
	unit, weight  string
	by, variables []string

	percentiles, lorenz, topShares, shortfall []float64
	tail                                      float64
}

func newSummariseCommand(g *globals) *cobra.Command {
	f := &summariseFlags{}
	cmd := &cobra.Command{
		Use:   "summarise PANEL...",
		Short: "Describe the distribution of any columns of Parquet files, with errors",
		Long: `summarise describes a panel of households that simulate wrote, or any Parquet file
or folder of files with columns of numbers, so that a survey of real households can
be held beside a simulated one. Of a run folder it takes the panel.

It prints a row for every variable and statistic: mean, standard deviation,
percentiles, Gini coefficient, Lorenz ordinates, shares of the richest, S80/S20,
expected shortfall, the tail index of Hill, and the share at or below zero, each with
its standard error and 95 % interval. Percentiles are exact however large the files.

Several rows may belong to one unit (a household): errors then come from leaving out
whole units. A weight is a sampling weight: a row stands for units in proportion to
it.`,
		Example: `  cistern summarise runs/quayside --by group
  cistern summarise runs/quayside --by age --variables assets --percentiles 1,50,99.9 --out wealth.csv
  cistern summarise survey.parquet --unit person --weight weight --variables wealth`,
		Args: func(_ *cobra.Command, args []string) error {
			if len(args) == 0 {
				return usagef("summarise takes a panel: a run folder, a Parquet file or a folder of them")
			}
			return nil
		},
		RunE: func(cmd *cobra.Command, args []string) error { return summarise(cmd.Context(), g, f, args) },
	}
	fs := cmd.Flags()
	fs.StringVar(&f.unit, "unit", "", "`column` of the unit that a row belongs to; household, if there is one")
	fs.StringVar(&f.weight, "weight", "", "`column` of sampling weights")
	fs.StringSliceVar(&f.by, "by", nil, "`columns` to tell apart, up to 4")
	fs.StringSliceVar(&f.variables, "variables", nil, "`columns` to describe; all of money in a panel of ours, all numbers elsewhere")
	fs.Float64SliceVar(&f.percentiles, "percentiles", []float64{1, 5, 10, 25, 50, 75, 90, 95, 99, 99.9}, "`percentiles`")
	fs.Float64SliceVar(&f.lorenz, "lorenz", []float64{10, 20, 30, 40, 50, 60, 70, 80, 90}, "poorest `shares` whose part of the total is wanted, in percent")
	fs.Float64SliceVar(&f.topShares, "top-shares", []float64{10, 1, 0.1}, "richest `shares` whose part of the total is wanted, in percent")
	fs.Float64SliceVar(&f.shortfall, "shortfall", []float64{1, 5}, "worst `shares` whose mean is wanted, in percent")
	fs.Float64Var(&f.tail, "tail", 5, "upper `share` whose tail index is wanted, in percent; 0 for none")
	return cmd
}

// ours are the variables of our own panels that summarise describes by itself.
var ours = []string{"income", "consumption", "assets"}

func summarise(ctx context.Context, g *globals, f *summariseFlags, panels []string) error {
	var all *output.Table
	for _, panel := range panels {
		t, err := summarisePanel(ctx, g, f, panel)
		if err != nil {
			return err
		}
		if len(panels) > 1 {
			t = named(t, panel)
		}
		if all, err = stacked(all, t); err != nil {
			return err
		}
	}
	if g.out == "" {
		return g.render(all)
	}
	write, ok := map[string]func(io.Writer) error{".csv": all.WriteCSV, ".json": all.WriteJSON, ".parquet": all.WriteParquet}[filepath.Ext(g.out)]
	if !ok {
		return usagef("--out %s: want the name of a file that ends in .csv, .json or .parquet", g.out)
	}
	if err := output.WriteFile(g.out, write); err != nil {
		return err
	}
	g.say("table: %s", g.out)
	return nil
}

func summarisePanel(ctx context.Context, g *globals, f *summariseFlags, panel string) (*output.Table, error) {
	files, err := panelFiles(panel)
	if err != nil {
		return nil, err
	}
	o := survey.Options{Files: files, Unit: f.unit, Weight: f.weight, By: f.by, Variables: f.variables, Percentiles: f.percentiles,
		Lorenz: f.lorenz, TopShares: f.topShares, Shortfalls: f.shortfall, Tail: f.tail, Workers: g.workers}
	if o.Weight != "" { // weighted rows are held in memory
		o.Budget = int64(freeMemory() / 2)
	}
	if err := o.Levels(); err != nil {
		return nil, usagef("%w", err)
	}
	names, err := columnsOf(files[0])
	if err != nil {
		return nil, err
	}
	if o.Unit == "" && slices.Contains(names, "household") {
		o.Unit = "household"
	}
	if o.Variables == nil && !slices.ContainsFunc(ours, func(v string) bool { return !slices.Contains(names, v) }) {
		o.Variables = ours
	}
	var p *progress
	stage := ""
	o.OnProgress = func(now string, done, all int64) {
		if now != stage {
			if p != nil {
				p.finish()
			}
			p, stage = g.newProgress(filepath.Base(panel)+", "+now, all), now
		}
		p.set(done)
	}
	t, err := survey.Describe(ctx, o)
	if p != nil {
		p.finish()
	}
	var column *survey.ColumnError
	var memory *distribution.MemoryError
	switch {
	case errors.As(err, &column):
		return nil, usagef("%w%s", err, didYouMean(nearest(column.Column, column.Known)))
	case errors.As(err, &memory):
		return nil, usagef("%s: %w; name fewer --variables", panel, err)
	case err != nil && ctx.Err() == nil:
		return nil, fmt.Errorf("%s: %w", panel, err)
	}
	return t, err
}

// columnsOf lists the columns of a file.
func columnsOf(path string) ([]string, error) {
	s, err := output.OpenParquet(path)
	if err != nil {
		return nil, err
	}
	defer func() { _ = s.Close() }()
	return s.Names(), nil
}

// panelFiles lists the Parquet files that an argument stands for: of a run folder
// those of its panel, of any other folder all below it, in the order of their names.
func panelFiles(panel string) ([]string, error) {
	info, err := os.Stat(panel)
	if err != nil {
		return nil, usagef("%s: %w", panel, errors.Unwrap(err))
	}
	if !info.IsDir() {
		return []string{panel}, nil
	}
	if _, err := output.ReadRun(panel); err == nil {
		inside := filepath.Join(panel, "panel")
		if _, err := os.Stat(inside); err != nil {
			return nil, usagef("the run in %s kept no panel: it was made with panel.write: false", panel)
		}
		panel = inside
	}
	var files []string
	err = filepath.WalkDir(panel, func(path string, e fs.DirEntry, err error) error {
		if err == nil && !e.IsDir() && strings.HasSuffix(path, ".parquet") {
			files = append(files, path)
		}
		return err
	})
	if err != nil {
		return nil, err
	}
	if len(files) == 0 {
		return nil, usagef("%s holds no Parquet file", panel)
	}
	return files, nil
}

// named returns the table with a first column that names the panel.
func named(t *output.Table, panel string) *output.Table {
	c := &output.Column{Name: "panel", Kind: output.String, Meaning: "the panel that is described"}
	for range t.Len() {
		c.AppendString(panel)
	}
	t.Columns = append([]*output.Column{c}, t.Columns...)
	for i, n := range t.Notes {
		t.Notes[i] = panel + ": " + n
	}
	return t
}

// stacked returns the rows of a, which may be nil, and those of b below.
func stacked(a, b *output.Table) (*output.Table, error) {
	if a == nil {
		return b, nil
	}
	for i, c := range a.Columns {
		d := b.Columns[i]
		if c.Kind != d.Kind {
			return nil, usagef("column %s holds %ss in one panel and %ss in another", c.Name, c.Kind, d.Kind)
		}
		for k := range d.Len() {
			switch {
			case d.IsMissing(k):
				c.AppendMissing()
			case c.Kind == output.String:
				c.AppendString(d.Strings[k])
			case c.Kind == output.Int:
				c.AppendInt(d.Ints[k])
			default:
				c.AppendFloat(d.Floats[k])
			}
		}
	}
	a.Notes = append(a.Notes, b.Notes...)
	return a, nil
}
