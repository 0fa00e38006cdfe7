package main

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"cistern/configs"
	"cistern/output"
)

func newStressCommand(g *globals) *cobra.Command {
	return &cobra.Command{
		Use:   "stress SCENARIO STRESS",
		Short: "Bring an unforeseen event over a scenario's population of all ages",
		Long: `stress lets households of all ages live through the same years twice, with the
same luck: as usual, and under an event that nobody foresaw. It says who runs dry,
how long assets last, by how much consumption falls short and how long it takes to
recover, with the Monte Carlo error of every difference, and writes the whole of it
by year, group and age to a run folder. STRESS is a file or a built-in stress; see
cistern stresses.`,
		Example: "  cistern stress quayside harbour-closure\n  cistern stress my-port.yaml my-event.yaml --households 100000 --out runs/my-event\n" +
			"  cistern stress quayside price-shock --set saving.borrowing_limit=2000 --out runs/with-credit",
		Args: func(cmd *cobra.Command, args []string) error {
			if len(args) != 2 {
				return usagef("%s takes a scenario and a stress, not %d arguments; see %s --help and cistern stresses", cmd.CommandPath(), len(args), cmd.CommandPath())
			}
			return nil
		},
		ValidArgsFunction: func(cmd *cobra.Command, args []string, toComplete string) ([]string, cobra.ShellCompDirective) {
			switch len(args) {
			case 0:
				return configs.Names(), cobra.ShellCompDirectiveDefault
			case 1:
				return configs.StressNames(), cobra.ShellCompDirectiveDefault
			}
			return nil, cobra.ShellCompDirectiveNoFileComp
		},
		RunE: func(cmd *cobra.Command, args []string) error {
			return stressed(cmd.Context(), g, args)
		},
	}
}

// stressed runs a stress and prints what a person wants to know of it.
func stressed(ctx context.Context, g *globals, args []string) error {
	sc, err := g.scenario(args[:1])
	if err != nil {
		return err
	}
	st, err := stressOf(args[1], sc)
	if err != nil {
		return err
	}
	r, err := startStress(g, sc, st)
	if err != nil {
		return err
	}
	if err := r.do(ctx); err != nil {
		if ctx.Err() != nil {
			return &resumableError{err, fmt.Sprintf("the same command begins it again in %s", r.dir)}
		}
		return st.Fault(err)
	}
	return r.show()
}

// stressOf loads what the second argument names: a file, or a built-in stress.
func stressOf(name string, sc *configs.Scenario) (*configs.Stress, error) {
	if name == "" {
		return nil, usagef("the stress's name is empty")
	}
	if _, err := os.Stat(name); err != nil && !strings.ContainsAny(name, "./\\") {
		return configs.BuiltinStress(name, sc)
	}
	return configs.LoadStress(name, sc)
}

// stressFolder is where a stress is written.
func (g *globals) stressFolder(sc *configs.Scenario, st *configs.Stress) string {
	if g.out != "" {
		return g.out
	}
	return filepath.Join("runs", sc.Name+"-"+st.Name)
}

func newStressesCommand(g *globals) *cobra.Command {
	return &cobra.Command{
		Use:     "stresses [NAME]",
		Short:   "List the built-in stresses, or print one to start from",
		Example: "  cistern stresses\n  cistern stresses harbour-closure > my-event.yaml",
		Args:    atMostOne("name"),
		ValidArgsFunction: func(cmd *cobra.Command, args []string, toComplete string) ([]string, cobra.ShellCompDirective) {
			return configs.StressNames(), cobra.ShellCompDirectiveNoFileComp
		},
		RunE: func(cmd *cobra.Command, args []string) error {
			if len(args) == 1 {
				source, err := configs.StressSource(args[0])
				if err != nil {
					return err
				}
				_, err = g.stdout.Write(source)
				return err
			}
			t := output.NewTable("stresses")
			name, title := t.AddString("name", "", "name of the built-in stress"), t.AddString("title", "", "what happens")
			for _, n := range configs.StressNames() {
				what, err := configs.StressTitle(n)
				if err != nil {
					return fmt.Errorf("built-in stress: %w", err)
				}
				name.AppendString(n)
				title.AppendString(what)
			}
			return g.render(t)
		},
	}
}
