package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"cistern/output"
)

// A run leaves a page; the command makes the same from the folder; several runs
// stand side by side; what was changed since is not reported on.
func TestReport(t *testing.T) {
	inFolder(t)
	simulate := func(args ...string) {
		t.Helper()
		if status, _, stderr := cistern(t, append([]string{"simulate", "port.yaml", "--households", "500", "--quiet"}, args...)...); status != 0 {
			t.Fatal(stderr)
		}
	}
	simulate("--out", "a", "--workers", "1")
	simulate("--out", "b", "--workers", "3")
	simulate("--out", "c", "--set", "saving.return=0.04")
	read := func(path string) []byte {
		t.Helper()
		text, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		return text
	}
	if !bytes.Equal(read("a/report.html"), read("b/report.html")) {
		t.Error("the page depends on the number of workers")
	}
	if err := output.Verify("a"); err != nil {
		t.Error(err)
	}
	if status, _, stderr := cistern(t, "report", "a", "--out", "again.html"); status != 0 || !strings.Contains(stderr, "page: again.html") {
		t.Errorf("status %d, %s", status, stderr)
	}
	if !bytes.Equal(read("a/report.html"), read("again.html")) {
		t.Error("report makes another page than simulate did")
	}
	if status, _, stderr := cistern(t, "report", "a", "c"); status != 0 {
		t.Errorf("status %d, %s", status, stderr)
	}
	if text := string(read("report.html")); !strings.Contains(text, "saving.return") || strings.Count(text, "<h2") < 6 {
		t.Errorf("two runs make a page of %d bytes without their difference", len(text))
	}
	if status, _, stderr := cistern(t, "report", "a", "--out", "b"); status != exitUsage || !strings.Contains(stderr, "is a folder") {
		t.Errorf("status %d, %s", status, stderr)
	}
	file := filepath.Join("c", "summary.parquet")
	text := read(file)
	text[len(text)/2] ^= 1
	if err := os.WriteFile(file, text, 0o666); err != nil {
		t.Fatal(err)
	}
	if status, _, stderr := cistern(t, "report", "c"); status != exitFailed || !strings.Contains(stderr, "was changed after") {
		t.Errorf("status %d, %s", status, stderr)
	}
}
