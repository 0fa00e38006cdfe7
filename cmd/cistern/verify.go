package main

import (
	"fmt"

	"github.com/spf13/cobra"

	"cistern/output"
	"cistern/sim/evidence"
)

func newVerifyCommand(g *globals) *cobra.Command {
	return &cobra.Command{
		Use:   "verify",
		Short: "Compare the program with published and derived values",
		Long: `verify recomputes values that are known from outside the program: published
tables, closed forms, numbers derived by other means. Each row names its source.
The exit status is 1 if any check fails.`,
		Example: "  cistern verify\n  cistern verify --format csv > evidence.csv",
		Args:    noArguments,
		RunE: func(cmd *cobra.Command, args []string) error {
			checks, err := evidence.Run(cmd.Context(), nil)
			if err != nil {
				return err
			}
			failed := 0
			for _, c := range checks {
				if !c.Pass() {
					failed++
				}
			}
			if err := g.render(evidenceTable(checks)); err != nil {
				return err
			}
			if failed > 0 {
				return fmt.Errorf("%d of %d checks fail", failed, len(checks))
			}
			g.say("all %d checks pass", len(checks))
			return nil
		},
	}
}

func evidenceTable(checks []evidence.Check) *output.Table {
	t := output.NewTable("evidence")
	area := t.AddString("area", "", "package concerned")
	name := t.AddString("check", "", "what is compared")
	expected := t.AddFloat("expected", "", "value expected")
	found := t.AddFloat("found", "", "value that this program finds")
	tolerance := t.AddFloat("tolerance", "", "largest difference allowed")
	verdict := t.AddString("verdict", "", "passes or fails")
	source := t.AddString("source", "", "where the expected value comes from")
	expected.Digits, found.Digits, tolerance.Digits = 12, 12, 2
	for _, c := range checks {
		area.AppendString(c.Area)
		name.AppendString(c.Name)
		expected.AppendFloat(c.Expected)
		found.AppendFloat(c.Found)
		tolerance.AppendFloat(c.Tolerance)
		verdict.AppendString(map[bool]string{true: "passes", false: "fails"}[c.Pass()])
		source.AppendString(c.Source)
	}
	return t
}
