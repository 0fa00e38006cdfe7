package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// Every command that the README shows works, in the order shown. The test command
// is this test's own caller.
func TestReadmeCommands(t *testing.T) {
	if testing.Short() {
		t.Skip("runs every command of the README: takes half a minute")
	}
	text, err := os.ReadFile(filepath.Join("..", "..", "README.md"))
	if err != nil {
		t.Fatal(err)
	}
	commands := shellCommands(string(text))
	if len(commands) < 10 {
		t.Fatalf("found only %d commands", len(commands))
	}
	t.Chdir(t.TempDir())
	for _, line := range commands {
		if line == "go test ./..." {
			continue
		}
		args, file, ok := programArguments(line)
		if !ok {
			t.Errorf("%q is neither the program nor the tests", line)
			continue
		}
		status, stdout, stderr := cistern(t, args...)
		if status != 0 {
			t.Errorf("%s: status %d: %s", line, status, stderr)
		}
		if file != "" {
			if err := os.WriteFile(file, []byte(stdout), 0o666); err != nil {
				t.Fatal(err)
			}
		}
	}
	for _, want := range []string{"runs/quayside/run.json", "runs/quayside/panel/part-00000.parquet", "runs/my-port/summary.parquet", "runs/quayside/report.html",
		"runs/committee.html", "runs/claim-age.html", "runs/harbour-closure/stress.csv", "runs/wealth.csv"} {
		if _, err := os.Stat(want); err != nil {
			t.Errorf("the README promises %s: %v", want, err)
		}
	}
}

// shellCommands returns the lines of the blocks marked sh.
func shellCommands(text string) []string {
	var out []string
	inside := false
	for _, line := range strings.Split(text, "\n") {
		switch {
		case strings.HasPrefix(line, "```sh"):
			inside = true
		case strings.HasPrefix(line, "```"):
			inside = false
		case inside && strings.TrimSpace(line) != "":
			out = append(out, line)
		}
	}
	return out
}

// programArguments splits "go run ./cmd/cistern ARGUMENTS > FILE".
func programArguments(line string) (args []string, file string, ok bool) {
	rest, ok := strings.CutPrefix(line, "go run ./cmd/cistern ")
	if !ok {
		return nil, "", false
	}
	rest, file, _ = strings.Cut(rest, " > ")
	for i, part := range strings.Split(rest, `"`) {
		if i%2 == 1 { // quoted
			args = append(args, part)
		} else {
			args = append(args, strings.Fields(part)...)
		}
	}
	return args, file, true
}
