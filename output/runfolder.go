package output

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strings"
)

// markFile marks a run folder as unfinished. It appears before any result and
// goes after run.json has come.
const markFile = ".unfinished.json"

// Identity says which run a folder belongs to. A run is continued only by the
// same program version with the same scenario, or its files would not fit
// together.
type Identity struct {
	Scenario string `json:"scenario_sha256"` // hash of the scenario as resolved
	Version  string `json:"version"`         // of the program
}

// mark is the content of markFile: whose folder it is and what the run has
// announced to write.
type mark struct {
	Identity
	Names []string `json:"files"` // in the order announced
}

// Folder is the folder of a run that is being written.
type Folder struct {
	dir     string
	mark    mark
	resumed bool
}

// A FolderError is a folder that cannot take the run: Reason says what it is,
// Remedy what to do.
type FolderError struct{ Dir, Reason, Remedy string }

func (e *FolderError) Error() string {
	return fmt.Sprintf("output: %s %s; %s", e.Dir, e.Reason, e.Remedy)
}

// OpenFolder prepares the folder dir for the run id.
//
//   - An absent or empty folder is made and marked as unfinished.
//   - A finished run (run.json is there) is refused with a *FolderError unless
//     replace is set; then the files that its run.json lists are removed first.
//   - An unfinished run of the same id is continued: Resumed is true. One of
//     another id is refused unless replace is set.
//   - A folder with anything else in it is refused in any case. Files that no
//     run wrote are never removed.
func OpenFolder(dir string, id Identity, replace bool) (*Folder, error) {
	entries, err := os.ReadDir(dir)
	if err != nil && !errors.Is(err, os.ErrNotExist) {
		return nil, fmt.Errorf("output: %w", err)
	}
	f := &Folder{dir: dir, mark: mark{Identity: id}}
	if len(entries) == 0 {
		return f, f.start()
	}
	names, finished, err := previous(dir)
	switch {
	case err != nil:
		return nil, err
	case names == nil:
		return nil, &FolderError{dir, "holds files that are not those of a run", "choose another folder"}
	case finished && !replace:
		return nil, &FolderError{dir, "holds a finished run", "choose another folder or replace it"}
	case !finished && names.Identity == id && !replace:
		f.mark, f.resumed = *names, true
		return f, nil
	case !finished && !replace:
		return nil, &FolderError{dir, "holds an unfinished run of another scenario or program version",
			"continue that run, choose another folder or replace it"}
	}
	if err := removeRun(dir, names.Names); err != nil {
		return nil, err
	}
	return f, f.start()
}

// previous returns the mark of the run that dir holds, or one made up from its
// run.json if it is finished; nil if there is no run.
func previous(dir string) (m *mark, finished bool, err error) {
	run, err := ReadRun(dir)
	if err == nil {
		m = &mark{Identity: Identity{run.Scenario, run.Version}}
		for _, f := range run.Files {
			m.Names = append(m.Names, f.Path)
		}
		return m, true, nil
	}
	if !errors.Is(err, os.ErrNotExist) {
		return nil, false, err
	}
	text, err := os.ReadFile(filepath.Join(dir, markFile))
	if errors.Is(err, os.ErrNotExist) {
		return nil, false, nil
	}
	if err != nil {
		return nil, false, fmt.Errorf("output: %w", err)
	}
	m = new(mark)
	if err := json.Unmarshal(text, m); err != nil {
		return nil, false, fmt.Errorf("output: %s: %w", filepath.Join(dir, markFile), err)
	}
	return m, false, nil
}

// start makes the folder and marks it.
func (f *Folder) start() error {
	if err := os.MkdirAll(f.dir, 0o777); err != nil {
		return fmt.Errorf("output: %w", err)
	}
	return f.writeMark()
}

func (f *Folder) writeMark() error {
	return WriteFile(filepath.Join(f.dir, markFile), func(w io.Writer) error {
		return json.NewEncoder(w).Encode(f.mark)
	})
}

// Dir returns the folder's path.
func (f *Folder) Dir() string { return f.dir }

// Resumed reports whether the folder holds the beginning of the same run.
func (f *Folder) Resumed() bool { return f.resumed }

// Path announces that the run writes the file name, a slash-separated path
// within the folder such as "summary.csv", and returns where. A name that ends
// in a slash is a folder of part files ("panel/"), which is made. Only files
// announced are hashed by Finish and removed when the run is replaced.
func (f *Folder) Path(name string) (string, error) {
	full := filepath.Join(f.dir, filepath.FromSlash(name))
	if !filepath.IsLocal(filepath.FromSlash(name)) || path.Clean(name) == "." || name == runFile || name == markFile {
		panic("output: no run writes a file " + name)
	}
	parent := filepath.Dir(full)
	if strings.HasSuffix(name, "/") {
		parent = full
	}
	if err := os.MkdirAll(parent, 0o777); err != nil {
		return "", fmt.Errorf("output: %w", err)
	}
	if slices.Contains(f.mark.Names, name) {
		return full, nil
	}
	f.mark.Names = append(f.mark.Names, name)
	return full, f.writeMark()
}

// Finish hashes the files announced, writes run.json with run and those hashes
// (run.Files is replaced; the program's name, compiler, platform and peak
// memory are filled in if they are not set) and takes the mark away. A file
// announced that is not there is an error: the run is then not finished.
func (f *Folder) Finish(run Run) error {
	paths, err := f.written()
	if err != nil {
		return err
	}
	var errs []error
	run.Files, errs = hashFiles(f.dir, paths)
	if err := errors.Join(errs...); err != nil {
		return err
	}
	run.complete()
	run.Scenario, run.Version = f.mark.Scenario, f.mark.Version
	if err := f.clean(); err != nil {
		return err
	}
	if err := run.write(f.dir); err != nil {
		return err
	}
	if err := os.Remove(filepath.Join(f.dir, markFile)); err != nil {
		return fmt.Errorf("output: %w", err)
	}
	return nil
}

// written returns the files announced, part files one by one, in order of path.
func (f *Folder) written() ([]string, error) {
	var paths []string
	for _, name := range f.mark.Names {
		if !strings.HasSuffix(name, "/") {
			paths = append(paths, name)
			continue
		}
		parts, err := Finished(filepath.Join(f.dir, filepath.FromSlash(name)))
		if err != nil {
			return nil, err
		}
		for _, p := range parts {
			paths = append(paths, name+PartName(p.Index))
		}
	}
	slices.Sort(paths)
	return paths, nil
}

// clean removes temporary files that killed runs left.
func (f *Folder) clean() error {
	errs := []error{removeTemporaries(f.dir)}
	for _, name := range f.mark.Names {
		errs = append(errs, removeTemporaries(filepath.Join(f.dir, filepath.FromSlash(path.Dir(name)))))
	}
	return errors.Join(errs...)
}

// removeRun removes the files names of a run from dir, then its run.json and
// mark, so that a removal cut short can be taken up again.
func removeRun(dir string, names []string) error {
	folders := map[string]bool{".": true}
	var files []string // relative to dir
	for _, name := range names {
		local := filepath.FromSlash(name)
		if !filepath.IsLocal(local) {
			return fmt.Errorf("output: the run in %s claims the file %q, which is outside it", dir, name)
		}
		if !strings.HasSuffix(name, "/") {
			files = append(files, local)
			folders[filepath.Dir(local)] = true
			continue
		}
		folders[filepath.Clean(local)] = true
		entries, err := os.ReadDir(filepath.Join(dir, local))
		if err != nil && !errors.Is(err, os.ErrNotExist) {
			return fmt.Errorf("output: %w", err)
		}
		for _, e := range entries {
			if _, isPart := partIndex(e.Name()); isPart {
				files = append(files, filepath.Join(local, e.Name()))
			}
		}
	}
	var errs []error
	for _, file := range files {
		errs = append(errs, removeFile(dir, file))
	}
	for folder := range folders {
		errs = append(errs, removeTemporaries(filepath.Join(dir, folder)))
		if folder != "." {
			_ = os.Remove(filepath.Join(dir, folder)) // fails, as it should, if it holds files that are not ours
		}
	}
	if err := errors.Join(errs...); err != nil {
		return err
	}
	return errors.Join(removeFile(dir, runFile), removeFile(dir, markFile))
}

// removeFile removes a file that may be gone already.
func removeFile(dir, name string) error {
	if err := os.Remove(filepath.Join(dir, name)); err != nil && !errors.Is(err, os.ErrNotExist) {
		return fmt.Errorf("output: %w", err)
	}
	return nil
}
