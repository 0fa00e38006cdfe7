package output

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"sync"
)

// runFile is the name of the file that makes a run folder finished.
const runFile = "run.json"

// Run is what run.json says about a finished run. All of it but timings and
// peak memory is the same whenever the same run is repeated by the same build.
type Run struct {
	Program   string           `json:"program"`
	Version   string           `json:"version"`
	Go        string           `json:"go"`       // version of the compiler
	Platform  string           `json:"platform"` // operating system and architecture; bytes are promised within one
	Title     string           `json:"title,omitempty"`
	Seed      uint64           `json:"seed"`
	Scenario  string           `json:"scenario_sha256"` // of scenario.yaml as resolved
	Inputs    []FileHash       `json:"inputs"`          // every file the scenario names
	Counts    map[string]int64 `json:"counts"`          // households, household_years, …
	Timings   []Timing         `json:"timings"`
	PeakBytes int64            `json:"peak_memory_bytes,omitempty"` // 0 where the system does not tell
	Files     []FileHash       `json:"files"`                       // every other file of the folder that the run wrote, by path
	Warnings  []string         `json:"warnings"`
	Caution   string           `json:"caution"` // what the numbers must not be taken for
}

// FileHash identifies a file's contents. Path has forward slashes and is
// relative to the run folder or, for inputs, to the scenario.
type FileHash struct {
	Path   string `json:"path"`
	Bytes  int64  `json:"bytes"`
	SHA256 string `json:"sha256"`
}

// Timing is the wall time of a stage of the run.
type Timing struct {
	Stage   string  `json:"stage"`
	Seconds float64 `json:"seconds"`
}

// ReadRun reads the run.json of the folder dir. The error wraps os.ErrNotExist
// if the run is not finished.
func ReadRun(dir string) (*Run, error) {
	text, err := os.ReadFile(filepath.Join(dir, runFile))
	if err != nil {
		return nil, fmt.Errorf("output: %w", err)
	}
	r := new(Run)
	if err := json.Unmarshal(text, r); err != nil {
		return nil, fmt.Errorf("output: %s: %w", filepath.Join(dir, runFile), err)
	}
	return r, nil
}

// write puts run.json into dir.
func (r *Run) write(dir string) error {
	return WriteFile(filepath.Join(dir, runFile), func(w io.Writer) error {
		e := json.NewEncoder(w)
		e.SetEscapeHTML(false)
		e.SetIndent("", "  ")
		return e.Encode(r)
	})
}

// complete fills what the program itself knows, unless it is set.
func (r *Run) complete() {
	if r.Program == "" {
		r.Program = createdBy
	}
	if r.Go == "" {
		r.Go = runtime.Version()
	}
	if r.Platform == "" {
		r.Platform = runtime.GOOS + "/" + runtime.GOARCH
	}
	if r.PeakBytes == 0 {
		r.PeakBytes = PeakMemory()
	}
	// Empty lists are [] and {}, not null.
	if r.Inputs == nil {
		r.Inputs = []FileHash{}
	}
	if r.Counts == nil {
		r.Counts = map[string]int64{}
	}
	if r.Timings == nil {
		r.Timings = []Timing{}
	}
	if r.Warnings == nil {
		r.Warnings = []string{}
	}
}

// Verify compares the files of a finished run folder with the hashes in its
// run.json and reports every file that is missing or has changed.
func Verify(dir string) error {
	run, err := ReadRun(dir)
	if err != nil {
		return err
	}
	paths := make([]string, len(run.Files))
	for i, f := range run.Files {
		if !filepath.IsLocal(filepath.FromSlash(f.Path)) {
			return fmt.Errorf("output: run.json names %q, which is outside the run folder", f.Path)
		}
		paths[i] = f.Path
	}
	got, errs := hashFiles(dir, paths)
	for i, f := range run.Files {
		if errs[i] == nil && got[i] != f {
			errs[i] = fmt.Errorf("output: %s has changed since the run", f.Path)
		}
	}
	return errors.Join(errs...)
}

// hashFiles hashes the files at the paths within dir, on all processors, and
// returns results and errors in the order of paths.
func hashFiles(dir string, paths []string) ([]FileHash, []error) {
	hashes, errs := make([]FileHash, len(paths)), make([]error, len(paths))
	next := make(chan int)
	var wg sync.WaitGroup
	for range min(runtime.GOMAXPROCS(0), len(paths)) {
		wg.Go(func() {
			for i := range next {
				hashes[i], errs[i] = hashOne(dir, paths[i])
			}
		})
	}
	for i := range paths {
		next <- i
	}
	close(next)
	wg.Wait()
	return hashes, errs
}

func hashOne(dir, path string) (FileHash, error) {
	full := filepath.Join(dir, filepath.FromSlash(path))
	info, err := os.Stat(full)
	if err != nil {
		return FileHash{}, fmt.Errorf("output: %w", err)
	}
	sum, err := HashFile(full)
	return FileHash{Path: path, Bytes: info.Size(), SHA256: sum}, err
}

// PeakMemory returns the most physical memory this process has held so far, in
// bytes, or 0 where the operating system keeps no such record.
func PeakMemory() int64 {
	status, err := os.ReadFile("/proc/self/status")
	if err != nil {
		return 0
	}
	for line := range bytes.Lines(status) {
		f := strings.Fields(string(line))
		if len(f) == 3 && f[0] == "VmHWM:" && f[2] == "kB" {
			kib, err := strconv.ParseInt(f[1], 10, 64)
			if err != nil {
				return 0
			}
			return kib << 10
		}
	}
	return 0
}
