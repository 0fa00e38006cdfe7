package output

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
)

// temporarySuffix ends the name of every file that is not yet whole.
const temporarySuffix = ".partial"

// A File is a file that appears under its own name only when it is whole. It is
// written under a temporary name in the same folder; Commit puts it on disk and
// renames it, Abort removes it. An existing file of that name stays untouched
// until the rename replaces it in one step.
//
// A File is not safe for concurrent use.
type File struct {
	path string
	tmp  *os.File // nil once committed or aborted
}

// CreateFile starts the file path; its folder must exist.
func CreateFile(path string) (*File, error) {
	dir, base := filepath.Split(path)
	// Names differ between processes, so two runs that write the same file by
	// mistake cannot mix their bytes.
	const attempts = 1000
	for n := range attempts {
		name := fmt.Sprintf(".%s.%d-%d%s", base, os.Getpid(), n, temporarySuffix)
		f, err := os.OpenFile(filepath.Join(dir, name), os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
		if errors.Is(err, os.ErrExist) {
			continue
		}
		if err != nil {
			return nil, fmt.Errorf("output: %w", err)
		}
		return &File{path: path, tmp: f}, nil
	}
	return nil, fmt.Errorf("output: %d temporary files for %s lie about; remove those whose names end in %s", attempts, path, temporarySuffix)
}

// Write appends to the temporary file.
func (f *File) Write(p []byte) (int, error) {
	if f.tmp == nil {
		return 0, os.ErrClosed
	}
	return f.tmp.Write(p)
}

// Commit flushes the file to disk and gives it its name. On an error the
// temporary file is gone and whatever stood under the name before still does.
func (f *File) Commit() error {
	if f.tmp == nil {
		return os.ErrClosed
	}
	tmp := f.tmp
	f.tmp = nil
	err := tmp.Sync()
	if e := tmp.Close(); err == nil {
		err = e
	}
	if err == nil {
		err = os.Rename(tmp.Name(), f.path)
	}
	if err != nil {
		return fmt.Errorf("output: %w", errors.Join(err, os.Remove(tmp.Name())))
	}
	syncFolder(filepath.Dir(f.path))
	return nil
}

// Abort removes the temporary file. After Commit or a first Abort it does
// nothing, so it can be deferred.
func (f *File) Abort() error {
	if f.tmp == nil {
		return nil
	}
	tmp := f.tmp
	f.tmp = nil
	return errors.Join(tmp.Close(), os.Remove(tmp.Name()))
}

// syncFolder makes a rename durable. Some file systems refuse to sync a folder;
// the file's own contents are safe by then, so that is no reason to fail.
func syncFolder(dir string) {
	if d, err := os.Open(dir); err == nil {
		_ = d.Sync()
		_ = d.Close()
	}
}

// WriteFile writes the file path by write, whole or not at all.
func WriteFile(path string, write func(io.Writer) error) error {
	f, err := CreateFile(path)
	if err != nil {
		return err
	}
	defer func() { _ = f.Abort() }()
	if err := write(f); err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	return f.Commit()
}

// HashFile returns the SHA-256 of the file path as 64 lower-case hex digits.
func HashFile(path string) (string, error) {
	f, err := os.Open(path)
	if err != nil {
		return "", fmt.Errorf("output: %w", err)
	}
	defer func() { _ = f.Close() }()
	h := sha256.New()
	if _, err := io.Copy(h, f); err != nil {
		return "", fmt.Errorf("output: %w", err)
	}
	return hex.EncodeToString(h.Sum(nil)), nil
}

// HashBytes returns the SHA-256 of b as 64 lower-case hex digits.
func HashBytes(b []byte) string {
	sum := sha256.Sum256(b)
	return hex.EncodeToString(sum[:])
}

// isTemporary reports whether name is that of a file not yet whole.
func isTemporary(name string) bool {
	return strings.HasPrefix(name, ".") && strings.HasSuffix(name, temporarySuffix)
}

// removeTemporaries removes what an interrupted run left half-written in dir.
func removeTemporaries(dir string) error {
	entries, err := os.ReadDir(dir)
	if errors.Is(err, os.ErrNotExist) {
		return nil
	}
	if err != nil {
		return fmt.Errorf("output: %w", err)
	}
	var errs []error
	for _, e := range entries {
		if isTemporary(e.Name()) {
			errs = append(errs, os.Remove(filepath.Join(dir, e.Name())))
		}
	}
	return errors.Join(errs...)
}
