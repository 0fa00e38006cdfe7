// Command cistern simulates how households save under income risk.
//
// The libraries do the work; this package reads the command line, calls them,
// and shows what they found. See README.md for what it is for.
package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"runtime/debug"
	"strings"
	"syscall"

	"github.com/spf13/cobra"

	"cistern/configs"
)

// Exit statuses.
const (
	exitDone        = 0
	exitFailed      = 1   // the run failed
	exitUsage       = 2   // the command line or the scenario is at fault
	exitInterrupted = 130 // stopped by the user
)

func main() {
	if os.Getenv("GOGC") == "" {
		debug.SetGCPercent(25) // long-lived tables and buffers, little garbage: memory stays flat and nothing gets slower
	}
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	context.AfterFunc(ctx, stop) // a second Ctrl-C ends the program at once
	os.Exit(execute(ctx, os.Args[1:], os.Stdout, os.Stderr))
}

// execute runs the program with the given arguments and returns its exit status.
func execute(ctx context.Context, args []string, stdout, stderr io.Writer) int {
	root := newRootCommand(&globals{stdout: stdout, stderr: stderr})
	root.SetArgs(args)
	err := root.ExecuteContext(ctx)
	if err == nil {
		return exitDone
	}
	var usage *usageError
	switch {
	case ctx.Err() != nil && errors.Is(err, context.Canceled):
		fmt.Fprintln(stderr, "cistern: stopped"+resumeHint(err))
		return exitInterrupted
	case errors.As(err, &usage):
		fmt.Fprintf(stderr, "cistern: %v\n", err)
		return exitUsage
	case configs.IsFault(err):
		for _, line := range strings.Split(err.Error(), "\n") {
			fmt.Fprintln(stderr, line)
		}
		return exitUsage
	}
	fmt.Fprintf(stderr, "cistern: %v\n", err)
	return exitFailed
}

// A usageError is a mistake on the command line.
type usageError struct{ err error }

func (e *usageError) Error() string { return e.err.Error() }
func (e *usageError) Unwrap() error { return e.err }

func usagef(format string, args ...any) error { return &usageError{fmt.Errorf(format, args...)} }

// A resumableError is a run that was stopped and can go on.
type resumableError struct {
	err  error
	hint string
}

func (e *resumableError) Error() string { return e.err.Error() }
func (e *resumableError) Unwrap() error { return e.err }

func resumeHint(err error) string {
	var r *resumableError
	if errors.As(err, &r) {
		return "; " + r.hint
	}
	return ""
}

func newRootCommand(g *globals) *cobra.Command {
	root := &cobra.Command{
		Use:   "cistern",
		Short: "How households save when income is risky",
		Long: `cistern puts numbers on how people save when income is risky, borrowing is
limited, life is of uncertain length and public rules matter: it solves each
household type's consumption rule, simulates a household panel with it, and says
how much is saved because of risk, with the error of every number.

A model's output under stated assumptions; no personal financial advice.`,
		Example:           "  cistern simulate\n  cistern scenarios quayside > my-port.yaml\n  cistern check my-port.yaml\n  cistern simulate my-port.yaml --households 100000",
		SilenceUsage:      true,
		SilenceErrors:     true,
		Args:              knownCommand,
		PersistentPreRunE: func(cmd *cobra.Command, args []string) error { return g.check() },
		RunE:              func(cmd *cobra.Command, args []string) error { return cmd.Help() },
	}
	root.SetOut(g.stdout)
	root.SetErr(g.stderr)
	root.SuggestionsMinimumDistance = 2
	root.SetFlagErrorFunc(func(cmd *cobra.Command, err error) error {
		return usagef("%w%s; see %s --help", err, didYouMean(flagsLike(cmd, err)), cmd.CommandPath())
	})
	g.addFlags(root.PersistentFlags())
	root.AddCommand(newSimulateCommand(g), newStressCommand(g), newStressesCommand(g), newCheckCommand(g), newIncomeCommand(g), newSolveCommand(g),
		newScenariosCommand(g), newVerifyCommand(g), newReportCommand(g), newSummariseCommand(g), newSchemaCommand(g), newVersionCommand(g))
	addHelpAndCompletion(root)
	return root
}

// knownCommand refuses arguments that lead to no command.
func knownCommand(cmd *cobra.Command, args []string) error {
	root := cmd.Root()
	if _, rest, err := root.Find(args); err != nil || len(rest) > 0 {
		name := args[max(0, len(args)-max(1, len(rest)))]
		return usagef("there is no command %q%s; see cistern --help", name, didYouMean(root.SuggestionsFor(name)))
	}
	return nil
}

func didYouMean(words []string) string {
	if len(words) == 0 {
		return ""
	}
	return "; did you mean " + strings.Join(words, " or ") + "?"
}
