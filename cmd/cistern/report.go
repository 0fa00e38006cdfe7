package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"sync"
	"sync/atomic"

	"github.com/spf13/cobra"

	"cistern/configs"
	"cistern/output"
	"cistern/output/report"
)

func newReportCommand(g *globals) *cobra.Command {
	return &cobra.Command{
		Use:   "report RUN...",
		Short: "Make the page that people read, of one run or of several side by side",
		Long: `report writes one self-contained page: the answer in words, charts with the
numbers behind them, accuracy, assumptions and provenance. simulate leaves such a
page in the run's folder already; report makes it again, or one that holds several
runs side by side.

Of one run the page goes to report.html in its folder, of several to report.html in
the present folder; --out says otherwise. The page needs no network and can be
mailed, read on a phone or printed.`,
		Example: "  cistern report runs/quayside\n  cistern report runs/claim-65 runs/claim-67 --out claim-age.html",
		Args: func(_ *cobra.Command, args []string) error {
			if len(args) == 0 {
				return usagef("report takes the folder of a run, or of several")
			}
			return nil
		},
		RunE: func(cmd *cobra.Command, args []string) error { return writeReport(cmd.Context(), g, args) },
	}
}

func writeReport(ctx context.Context, g *globals, dirs []string) error {
	if page, err := readStressPage(dirs); page != nil || err != nil {
		if err != nil {
			return err
		}
		return g.writePage(page, dirs)
	}
	var runs []*report.Run
	for _, dir := range dirs {
		if ctx.Err() != nil {
			return context.Cause(ctx)
		}
		r, err := readReportRun(dir)
		if err != nil {
			return err
		}
		runs = append(runs, r)
	}
	page, err := report.Compare(runs)
	if err != nil {
		return usagef("%w", err)
	}
	return g.writePage(page, dirs)
}

// writePage writes a page about the runs in dirs to where it belongs.
func (g *globals) writePage(page *report.Page, dirs []string) error {
	out := g.out
	if out == "" {
		out = "report.html"
		if len(dirs) == 1 {
			out = filepath.Join(dirs[0], out)
		}
	}
	if info, err := os.Stat(out); err == nil && info.IsDir() {
		return usagef("--out %s is a folder, want the name of a file", out)
	}
	if err := output.WriteFile(out, page.Write); err != nil {
		return err
	}
	g.say("page: %s", out)
	return nil
}

// readReportRun reads what a page says about the finished run in the folder dir.
func readReportRun(dir string) (*report.Run, error) {
	record, err := output.ReadRun(dir)
	if errors.Is(err, os.ErrNotExist) {
		return nil, usagef("%s holds no finished run", dir)
	}
	if err != nil {
		return nil, err
	}
	if err := unchanged(dir, record); err != nil {
		return nil, err
	}
	sc, err := configs.Load(filepath.Join(dir, "scenario.yaml"), nil)
	if err != nil {
		return nil, err
	}
	r := reportRun(sc, record.Version, record.Scenario, record.Inputs)
	r.Name = filepath.Base(filepath.Clean(dir))
	r.Households, r.AboveGrid, r.Warnings = record.Counts["households"], record.Counts["household_years_above_grid"], record.Warnings
	if r.Summary, err = output.ReadTable(filepath.Join(dir, "summary.parquet")); err != nil {
		return nil, err
	}
	if r.Policy, err = output.ReadTable(filepath.Join(dir, "policy.parquet")); err != nil {
		return nil, err
	}
	for _, t := range []struct {
		name string
		to   **output.Table
	}{{"mobility.parquet", &r.Mobility}, {"transfer.parquet", &r.Transfer}, {"decomposition.parquet", &r.Decomposition}} {
		if !slices.ContainsFunc(record.Files, func(f output.FileHash) bool { return f.Path == t.name }) {
			continue
		}
		if *t.to, err = output.ReadTable(filepath.Join(dir, t.name)); err != nil {
			return nil, err
		}
	}
	file, err := os.Open(filepath.Join(dir, "accuracy.csv"))
	if err != nil {
		return nil, err
	}
	defer func() { _ = file.Close() }()
	if r.Accuracy, err = output.ReadCSV(file, new(accuracy).table(0)); err != nil {
		return nil, fmt.Errorf("%s: %w", file.Name(), err)
	}
	return r, nil
}

// readStressPage makes the page about the stress in a folder; nil if there is none.
func readStressPage(dirs []string) (*report.Page, error) {
	for _, dir := range dirs {
		record, err := output.ReadRun(dir)
		if err != nil || !slices.ContainsFunc(record.Files, func(f output.FileHash) bool { return f.Path == "stress.parquet" }) {
			continue
		}
		if len(dirs) > 1 {
			return nil, usagef("%s holds a stress, which is shown by itself", dir)
		}
		if err := unchanged(dir, record); err != nil {
			return nil, err
		}
		sc, err := configs.Load(filepath.Join(dir, "scenario.yaml"), nil)
		if err != nil {
			return nil, err
		}
		st, err := configs.LoadStress(filepath.Join(dir, "stress.yaml"), sc)
		if err != nil {
			return nil, err
		}
		t, err := output.ReadTable(filepath.Join(dir, "stress.parquet"))
		if err != nil {
			return nil, err
		}
		return stressPage(sc, st, reportRun(sc, record.Version, record.Scenario, record.Inputs), record.Warnings, t), nil
	}
	return nil, nil
}

// unchanged reports files of a run that a page is made of and that are not as they
// were written.
func unchanged(dir string, record *output.Run) error {
	made := []string{"scenario.yaml", "summary.parquet", "policy.parquet", "mobility.parquet", "transfer.parquet", "decomposition.parquet", "accuracy.csv", "stress.yaml", "stress.parquet"}
	for _, f := range record.Files {
		if !slices.Contains(made, f.Path) {
			continue
		}
		hash, err := output.HashFile(filepath.Join(dir, f.Path))
		if err != nil {
			return err
		}
		if hash != f.SHA256 {
			return fmt.Errorf("%s was changed after the run was written", filepath.Join(dir, f.Path))
		}
	}
	return nil
}

// reportRun is what a page says about a run whatever its results.
func reportRun(sc *configs.Scenario, version, hash string, inputs []output.FileHash) *report.Run {
	r := &report.Run{Name: sc.Name, Title: sc.Title, Currency: sc.Currency, Caution: caution}
	if r.Title == "" {
		r.Title = sc.Name
	}
	for _, s := range sc.Settings() {
		r.Assumptions = append(r.Assumptions, report.Assumption(s))
	}
	r.Provenance = [][2]string{{"program", "cistern " + version}, {"seed", fmt.Sprint(sc.Seed)}, {"scenario, SHA-256", hash}}
	for _, in := range inputs {
		r.Provenance = append(r.Provenance, [2]string{in.Path + ", SHA-256", in.SHA256})
	}
	return r
}

// inputHashes identifies the files that the scenario names.
func (r *run) inputHashes() []output.FileHash {
	var inputs []output.FileHash
	for _, in := range r.sc.Inputs {
		inputs = append(inputs, output.FileHash{Path: in.Name, Bytes: int64(len(in.Data)), SHA256: output.HashBytes(in.Data)})
	}
	return inputs
}

// report writes the page and the figures.
func (r *run) report(ctx context.Context) error {
	p := reportRun(r.sc, version(), r.hash, r.inputHashes())
	p.Households, p.AboveGrid, p.Warnings = r.result.Households, r.result.AboveTop, r.warnings
	p.Summary, p.Policy, p.Accuracy = r.tables.summary, r.tables.policy, r.tables.accuracy
	p.Mobility, p.Transfer, p.Decomposition = r.tables.mobility, r.tables.transfer, r.tables.decomposition
	page, err := report.Compare([]*report.Run{p})
	if err != nil {
		return err
	}
	if err := r.write("report.html", page.Write); err != nil {
		return err
	}
	return r.writeFigures(ctx, report.Figures(page.Sections))
}

// writeFigures writes the charts as files, shared out over workers.
func (r *run) writeFigures(ctx context.Context, figures []report.Figure) error {
	paths := make([]string, len(figures))
	for i, f := range figures {
		var err error
		if paths[i], err = r.folder.Path("figures/" + f.Name); err != nil {
			return err
		}
	}
	errs := make([]error, len(figures))
	var next atomic.Int64
	var wg sync.WaitGroup
	for range min(r.g.workers, len(figures)) {
		wg.Go(func() {
			for i := int(next.Add(1)) - 1; i < len(figures) && ctx.Err() == nil; i = int(next.Add(1)) - 1 {
				errs[i] = output.WriteFile(paths[i], figures[i].Write)
			}
		})
	}
	wg.Wait()
	if ctx.Err() != nil {
		return context.Cause(ctx)
	}
	return errors.Join(errs...)
}
