package output

import (
	"errors"
	"io"
	"os"
	"path/filepath"
	"testing"
)

// names lists the folder.
func names(t *testing.T, dir string) []string {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	var s []string
	for _, e := range entries {
		s = append(s, e.Name())
	}
	return s
}

func put(text string) func(io.Writer) error {
	return func(w io.Writer) error { _, err := io.WriteString(w, text); return err }
}

func TestWriteFileWholeOrNotAtAll(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "x.csv")
	if err := WriteFile(path, put("old")); err != nil {
		t.Fatal(err)
	}
	fault := errors.New("no space")
	err := WriteFile(path, func(w io.Writer) error {
		if err := put("half")(w); err != nil {
			return err
		}
		if n := len(names(t, dir)); n != 2 {
			t.Errorf("%d files while writing, want the old and the temporary one", n)
		}
		return fault
	})
	if !errors.Is(err, fault) {
		t.Errorf("error is %v, want %v", err, fault)
	}
	if got, _ := os.ReadFile(path); string(got) != "old" || len(names(t, dir)) != 1 {
		t.Errorf("after a failed write the file is %q among %v", got, names(t, dir))
	}
	if err := WriteFile(path, put("new")); err != nil {
		t.Fatal(err)
	}
	if got, _ := os.ReadFile(path); string(got) != "new" || len(names(t, dir)) != 1 {
		t.Errorf("after a write the file is %q among %v", got, names(t, dir))
	}
}

// TestCommitCannotRename has a folder stand where the file should go.
func TestCommitCannotRename(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "x.csv")
	if err := os.MkdirAll(filepath.Join(path, "full"), 0o777); err != nil {
		t.Fatal(err)
	}
	if err := WriteFile(path, put("text")); err == nil {
		t.Error("a file replaces a folder")
	}
	if got := names(t, dir); len(got) != 1 {
		t.Errorf("%v is left, want the folder alone", got)
	}
	if err := WriteFile(filepath.Join(dir, "absent", "x.csv"), put("text")); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("writing into an absent folder gives %v", err)
	}
}

func TestFileAfterCommit(t *testing.T) {
	f, err := CreateFile(filepath.Join(t.TempDir(), "x"))
	if err != nil {
		t.Fatal(err)
	}
	g, err := CreateFile(f.path) // a second writer of the same file has a temporary file of its own
	if err != nil || g.tmp.Name() == f.tmp.Name() {
		t.Fatalf("second writer: %v", err)
	}
	if err := errors.Join(f.Commit(), f.Abort(), g.Abort(), g.Abort()); err != nil {
		t.Error(err)
	}
	if _, err := f.Write(nil); !errors.Is(err, os.ErrClosed) {
		t.Errorf("writing after the commit gives %v", err)
	}
	if err := f.Commit(); !errors.Is(err, os.ErrClosed) {
		t.Errorf("a second commit gives %v", err)
	}
	if _, err := os.Stat(f.path); err != nil {
		t.Error(err)
	}
}

func TestHash(t *testing.T) {
	// published: NIST FIPS 180-4 example, SHA-256 of "abc"
	const want = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
	path := filepath.Join(t.TempDir(), "abc")
	if err := WriteFile(path, put("abc")); err != nil {
		t.Fatal(err)
	}
	if got, err := HashFile(path); got != want || err != nil {
		t.Errorf("file's hash is %s (%v), want %s", got, err, want)
	}
	if got := HashBytes([]byte("abc")); got != want {
		t.Errorf("hash is %s, want %s", got, want)
	}
}
