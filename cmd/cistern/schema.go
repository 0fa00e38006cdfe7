package main

import (
	"github.com/spf13/cobra"

	"cistern/configs"
)

func newSchemaCommand(g *globals) *cobra.Command {
	return &cobra.Command{
		Use:     "schema",
		Short:   "Print the scenario format as JSON Schema, for editors",
		Example: "  cistern schema > cistern.schema.json",
		Args:    noArguments,
		RunE: func(cmd *cobra.Command, args []string) error {
			_, err := g.stdout.Write(configs.Schema())
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
