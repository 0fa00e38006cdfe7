package main

import (
	"github.com/spf13/cobra"

	"cistern/configs"
)

func newSchemaCommand(g *globals) *cobra.Command {
	return &cobra.Command{
		Use:       "schema [FORMAT]",
		Short:     "Print the scenario or stress format as JSON Schema, for editors",
		Example:   "  cistern schema > cistern.schema.json\n  cistern schema stress > cistern-stress.schema.json",
		Args:      atMostOne("format"),
		ValidArgs: []string{"scenario", "stress"},
		RunE: func(cmd *cobra.Command, args []string) error {
			schema := configs.Schema
			if len(args) > 0 {
				switch args[0] {
				case "scenario":
				case "stress":
					schema = configs.StressSchema
				default:
					return usagef("there is no format %q, want scenario or stress", args[0])
				}
			}
			_, err := g.stdout.Write(schema())
			return err
		},
	}
}

func noArguments(cmd *cobra.Command, args []string) error {
	if len(args) > 0 {
		return usagef("%s takes no argument; see %s --help", cmd.CommandPath(), cmd.CommandPath())
	}
	return nil
}
