package main

import (
	"fmt"
	"time"

	"github.com/spf13/cobra"
)

func newCheckCommand(g *globals) *cobra.Command {
	return &cobra.Command{
		Use:   "check SCENARIO",
		Short: "Check a scenario; print what it resolves to and what a run would cost",
		Long: `check reads a scenario as simulate would, with --set and the like in place, and
prints it with every default written out, to standard output, and what a run of
it would take, to standard error. Every fault is listed with its place, the key
and the allowed range; the exit status is then 2.`,
		Example:           "  cistern check my-port.yaml\n  cistern check quayside --set preferences.discount_factor=0.98",
		Args:              exactlyOne("scenario"),
		ValidArgsFunction: completeScenario,
		RunE: func(cmd *cobra.Command, args []string) error {
			sc, err := g.scenario(args)
			if err != nil {
				return err
			}
			if err := affordable(sc, g.workers, g.folder(sc)); err != nil {
				return err
			}
			if _, err := g.stdout.Write(sc.YAML()); err != nil {
				return err
			}
			c := sc.Cost(g.workers)
			g.say("a run would simulate %.3g household-years; about %v on %d workers, %s of memory, %s of disk",
				c.HouseholdYears, duration(c.Seconds), g.workers, size(c.MemoryBytes), size(c.DiskBytes))
			return nil
		},
	}
}

// duration rounds an estimate of seconds to what it is worth.
func duration(seconds float64) string {
	switch d := time.Duration(seconds * float64(time.Second)); {
	case seconds < 1:
		return "a second"
	case seconds < 120:
		return fmt.Sprint(d.Round(time.Second))
	case seconds < 3*3600:
		return fmt.Sprintf("%.0f minutes", d.Minutes())
	default:
		return fmt.Sprintf("%.0f hours", d.Hours())
	}
}
