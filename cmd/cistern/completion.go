package main

import (
	"errors"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"
)

// addHelpAndCompletion adds the commands that cobra makes, and has them refuse
// what leads nowhere as the others do.
func addHelpAndCompletion(root *cobra.Command) {
	root.InitDefaultHelpCmd()
	root.InitDefaultCompletionCmd()
	for _, c := range root.Commands() {
		switch c.Name() {
		case "help":
			c.Args = knownCommand
		case "completion":
			c.Example = "  cistern completion bash > /etc/bash_completion.d/cistern\n  cistern completion zsh > \"${fpath[1]}/_cistern\""
			c.Args = knownShell
			c.RunE = func(cmd *cobra.Command, args []string) error { return cmd.Help() }
			for _, shell := range c.Commands() {
				shell.Args = noArguments
			}
		}
	}
}

// knownShell refuses a shell for which there is no completion.
func knownShell(cmd *cobra.Command, args []string) error {
	if len(args) == 0 {
		return nil
	}
	var shells []string
	for _, c := range cmd.Commands() {
		shells = append(shells, c.Name())
	}
	return usagef("there is no completion for %q, want one of %s", args[0], strings.Join(shells, ", "))
}

// flagsLike returns the flags of a command that a misspelt one may stand for.
func flagsLike(cmd *cobra.Command, err error) []string {
	var unknown *pflag.NotExistError
	if !errors.As(err, &unknown) {
		return nil
	}
	var names []string
	cmd.Flags().VisitAll(func(f *pflag.Flag) { names = append(names, f.Name) })
	like := nearest(unknown.GetSpecifiedName(), names)
	for i, name := range like {
		like[i] = "--" + name
	}
	return like
}

// nearest returns the names that a misspelt one may stand for.
func nearest(name string, known []string) []string {
	names := &cobra.Command{SuggestionsMinimumDistance: 2} // cobra compares names of commands only: lend it some
	for _, k := range known {
		names.AddCommand(&cobra.Command{Use: k, Run: func(*cobra.Command, []string) {}})
	}
	return names.SuggestionsFor(name)
}
