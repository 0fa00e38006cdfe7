package main

import (
	"fmt"

	"github.com/spf13/cobra"

	"cistern/configs"
	"cistern/output"
)

func newScenariosCommand(g *globals) *cobra.Command {
	return &cobra.Command{
		Use:               "scenarios [NAME]",
		Short:             "List the built-in scenarios, or print one to start from",
		Example:           "  cistern scenarios\n  cistern scenarios quayside > my-port.yaml",
		Args:              atMostOne("name"),
		ValidArgsFunction: completeScenario,
		RunE: func(cmd *cobra.Command, args []string) error {
			if len(args) == 1 {
				source, err := configs.Source(args[0])
				if err != nil {
					return err
				}
				_, err = g.stdout.Write(source)
				return err
			}
			return listScenarios(g)
		},
	}
}

func listScenarios(g *globals) error {
	t := output.NewTable("scenarios")
	name, title := t.AddString("name", "", "name of the built-in scenario"), t.AddString("title", "", "what it is about")
	for _, n := range configs.Names() {
		sc, err := configs.Builtin(n, nil)
		if err != nil {
			return fmt.Errorf("built-in scenario: %w", err)
		}
		name.AppendString(n)
		title.AppendString(sc.Title)
	}
	return g.render(t)
}
