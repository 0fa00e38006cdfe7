package main

import (
	"fmt"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"cistern/configs"
	"cistern/output"
)

// globals holds the streams and the flags that all commands share.
type globals struct {
	stdout, stderr io.Writer

	set        []string
	out        string
	format     string
	seed       int64
	households int64
	workers    int
	quiet      bool
	replace    bool
	flags      *pflag.FlagSet
}

func (g *globals) addFlags(fs *pflag.FlagSet) {
	fs.StringArrayVar(&g.set, "set", nil, "set a scenario key, as in `key.path=value` (repeatable)")
	fs.Int64Var(&g.seed, "seed", 0, "use this `seed` in place of the scenario's")
	fs.Int64Var(&g.households, "households", 0, "simulate `n` households in place of the scenario's number")
	fs.IntVar(&g.workers, "workers", runtime.GOMAXPROCS(0), "use `n` processors; results do not depend on it")
	fs.StringVar(&g.out, "out", "", "write the run to `folder`")
	fs.BoolVar(&g.replace, "replace", false, "replace a finished run in that folder")
	fs.StringVar(&g.format, "format", "table", "print results as `table`, csv or json")
	fs.BoolVar(&g.quiet, "quiet", false, "print no progress and no messages")
	g.flags = fs
}

// check refuses values of common flags that no command can do anything with.
func (g *globals) check() error {
	switch {
	case g.workers < 1:
		return usagef("--workers is %d, want at least 1", g.workers)
	case g.format != "table" && g.format != "csv" && g.format != "json":
		return usagef("--format is %s, want table, csv or json", g.format)
	case g.flags.Changed("out") && g.out == "":
		return usagef("--out is empty, want a folder")
	}
	return nil
}

// folder is where simulate writes a scenario's run.
func (g *globals) folder(sc *configs.Scenario) string {
	if g.out != "" {
		return g.out
	}
	return filepath.Join("runs", sc.Name)
}

// overrides are --set, --seed and --households as settings of scenario keys.
func (g *globals) overrides() ([]configs.Override, error) {
	var all []configs.Override
	for _, s := range g.set {
		o, err := configs.ParseOverride(s)
		if err != nil {
			return nil, err
		}
		all = append(all, o)
	}
	if g.flags.Changed("seed") {
		all = append(all, configs.Override{Key: "seed", Value: strconv.FormatInt(g.seed, 10)})
	}
	if g.flags.Changed("households") {
		all = append(all, configs.Override{Key: "households", Value: strconv.FormatInt(g.households, 10)})
	}
	return all, nil
}

// scenario loads what a command's argument names: a file, or a built-in scenario.
func (g *globals) scenario(args []string) (*configs.Scenario, error) {
	overrides, err := g.overrides()
	if err != nil {
		return nil, err
	}
	name := configs.Default
	if len(args) > 0 {
		name = args[0]
	}
	if name == "" {
		return nil, usagef("the scenario's name is empty")
	}
	if _, err := os.Stat(name); err != nil && !strings.ContainsAny(name, "./\\") {
		return configs.Builtin(name, overrides)
	}
	return configs.Load(name, overrides)
}

// atMostOne allows a single argument, named in the error.
func atMostOne(what string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		if len(args) > 1 {
			return usagef("%s takes one %s, not %d arguments; see %s --help", cmd.CommandPath(), what, len(args), cmd.CommandPath())
		}
		return nil
	}
}

func exactlyOne(what string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		if len(args) != 1 {
			return usagef("%s takes one %s, not %d arguments; see %s --help", cmd.CommandPath(), what, len(args), cmd.CommandPath())
		}
		return nil
	}
}

// render writes a table to standard output in the chosen format.
func (g *globals) render(t *output.Table) error {
	switch g.format {
	case "csv":
		return t.WriteCSV(g.stdout)
	case "json":
		return t.WriteJSON(g.stdout)
	}
	return t.WriteText(g.stdout)
}

// say prints a message to standard error unless --quiet.
func (g *globals) say(format string, args ...any) {
	if !g.quiet {
		fmt.Fprintf(g.stderr, format+"\n", args...)
	}
}

// completeScenario offers the built-in scenarios to shell completion, and files.
func completeScenario(cmd *cobra.Command, args []string, toComplete string) ([]string, cobra.ShellCompDirective) {
	if len(args) > 0 {
		return nil, cobra.ShellCompDirectiveNoFileComp
	}
	return configs.Names(), cobra.ShellCompDirectiveDefault
}
