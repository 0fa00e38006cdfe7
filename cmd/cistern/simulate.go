package main

import (
	"context"
	"fmt"
	"strings"

	"github.com/spf13/cobra"

	"cistern/output"
)

func newSimulateCommand(g *globals) *cobra.Command {
	return &cobra.Command{
		Use:   "simulate [SCENARIO]",
		Short: "Solve a scenario's households and simulate a panel of them",
		Long: `simulate is the main job: it solves the consumption rule of every household
type of a scenario, simulates a panel of households and of their certain twins,
and writes panel, rule, summary and accuracy to a run folder. SCENARIO is a file
or a built-in scenario; without it, quayside.

Ctrl-C keeps what is finished; the same command goes on from there.`,
		Example: "  cistern simulate\n  cistern simulate my-port.yaml --households 100000 --out runs/large\n" +
			"  cistern simulate quayside --set saving.return=0.01 --out runs/low-return",
		Args:              atMostOne("scenario"),
		ValidArgsFunction: completeScenario,
		RunE: func(cmd *cobra.Command, args []string) error {
			return simulate(cmd.Context(), g, args)
		},
	}
}

// simulate runs the main job and prints what a person wants to see of it.
func simulate(ctx context.Context, g *globals, args []string) error {
	sc, err := g.scenario(args)
	if err != nil {
		return err
	}
	dir := g.folder(sc)
	if err := affordable(sc, g.workers, dir); err != nil {
		return err
	}
	r, err := startRun(g, sc, dir)
	if err != nil {
		return err
	}
	if err := r.do(ctx); err != nil {
		if ctx.Err() != nil {
			return &resumableError{err, fmt.Sprintf("what is finished is kept in %s, and the same command goes on from there", dir)}
		}
		return err
	}
	return r.show()
}

// show prints the run's table, where its files are and how far to trust it.
func (r *run) show() error {
	bands := r.summary.BandTable(output.Everyone, r.sc.Currency)
	for _, c := range bands.Columns {
		c.Digits = 5
		if strings.HasSuffix(c.Name, "_error") || strings.HasPrefix(c.Name, "share") {
			c.Digits = 3
		}
	}
	if err := r.g.render(bands); err != nil {
		return err
	}
	say := r.g.say
	say("")
	say("%d households, %d household-years; means over the years of each age band",
		r.result.Households, r.result.HouseholdYears)
	if r.transferred != nil {
		say("transfer: %s", r.transferSentence())
	}
	if r.apart != "" {
		say("wealth:   %s", r.apart)
	}
	if r.premium != "" {
		say("premium:  to be rid of income risk a household would give up, of its consumption%s", r.premium)
	}
	say("files:    %s", r.folder.Dir())
	say("accuracy: %s", r.accuracy.sentence())
	for _, w := range r.warnings {
		say("warning:  %s", w)
	}
	say("%s", caution)
	return nil
}

// caution stands under every result.
const caution = "A model's output under stated assumptions; no personal financial advice. Actuarial, legal and tax questions belong to licensed practitioners and local law."
