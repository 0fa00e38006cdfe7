package output

import (
	"errors"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"
)

var thisRun = Identity{Scenario: "abc", Version: "1"}

// writeRun writes a whole run folder with a summary and a panel of two parts.
func writeRun(t *testing.T, f *Folder) {
	t.Helper()
	path, err := f.Path("summary.csv")
	if err == nil {
		err = WriteFile(path, put("group,age\n"))
	}
	if err != nil {
		t.Fatal(err)
	}
	panel, err := f.Path("panel/")
	if err != nil {
		t.Fatal(err)
	}
	o := testOptions(300)
	if o.From, err = o.Resume(panel); err != nil {
		t.Fatal(err)
	}
	if err := write(panel, o, generate(o).units); err != nil {
		t.Fatal(err)
	}
	err = f.Finish(Run{Seed: 7, Counts: map[string]int64{"households": 300}, Timings: []Timing{{"simulate", 1.5}}, Caution: "not a forecast"})
	if err != nil {
		t.Fatal(err)
	}
}

func open(t *testing.T, dir string, id Identity, replace bool) *Folder {
	t.Helper()
	f, err := OpenFolder(dir, id, replace)
	if err != nil {
		t.Fatal(err)
	}
	return f
}

func TestFolderFinish(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "runs", "quayside")
	f := open(t, dir, thisRun, false)
	if f.Resumed() || f.Dir() != dir {
		t.Errorf("a new folder %s is resumed", f.Dir())
	}
	if err := os.WriteFile(filepath.Join(dir, ".old.csv.1-0.partial"), nil, 0o666); err != nil { // of a killed run
		t.Fatal(err)
	}
	writeRun(t, f)
	if got, want := names(t, dir), []string{"panel", "run.json", "summary.csv"}; !reflect.DeepEqual(got, want) {
		t.Errorf("folder holds %v, want %v", got, want)
	}
	run, err := ReadRun(dir)
	if err != nil {
		t.Fatal(err)
	}
	if run.Program != "cistern" || run.Version != "1" || run.Scenario != "abc" || run.Seed != 7 || run.Counts["households"] != 300 ||
		!strings.HasPrefix(run.Go, "go1.") || !strings.Contains(run.Platform, "/") || run.Caution != "not a forecast" || run.Timings[0].Seconds != 1.5 {
		t.Errorf("run.json says %+v", run)
	}
	var paths []string
	for _, h := range run.Files {
		sum, err := HashFile(filepath.Join(dir, h.Path))
		info, err2 := os.Stat(filepath.Join(dir, h.Path))
		if err := errors.Join(err, err2); err != nil || sum != h.SHA256 || info.Size() != h.Bytes {
			t.Errorf("%s: hash or size is wrong (%v)", h.Path, err)
		}
		paths = append(paths, h.Path)
	}
	if want := []string{"panel/part-00000.parquet", "panel/part-00001.parquet", "summary.csv"}; !reflect.DeepEqual(paths, want) {
		t.Errorf("run.json lists %v, want %v", paths, want)
	}
	if err := Verify(dir); err != nil {
		t.Error(err)
	}
	if err := os.WriteFile(filepath.Join(dir, "summary.csv"), []byte("group,age!"), 0o666); err != nil {
		t.Fatal(err)
	}
	if err := os.Remove(filepath.Join(dir, "panel", "part-00001.parquet")); err != nil {
		t.Fatal(err)
	}
	err = Verify(dir)
	if err == nil || !strings.Contains(err.Error(), "summary.csv has changed") || !strings.Contains(err.Error(), "part-00001") {
		t.Errorf("a changed and a missing file give %v", err)
	}
}

func TestFolderMissingFile(t *testing.T) {
	dir := t.TempDir()
	f := open(t, dir, thisRun, false)
	if _, err := f.Path("report.html"); err != nil {
		t.Fatal(err)
	}
	if err := f.Finish(Run{}); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("finishing without an announced file gives %v", err)
	}
	if _, err := ReadRun(dir); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("the folder counts as finished: %v", err)
	}
}

// TestFolderRefuses checks what a folder may be opened over, and that refusing
// changes nothing.
func TestFolderRefuses(t *testing.T) {
	finished := func(t *testing.T, dir string) { writeRun(t, open(t, dir, thisRun, false)) }
	unfinished := func(t *testing.T, dir string) { open(t, dir, thisRun, false) }
	foreign := func(t *testing.T, dir string) {
		if err := WriteFile(filepath.Join(dir, "thesis.tex"), put("")); err != nil {
			t.Fatal(err)
		}
	}
	other := Identity{Scenario: "def", Version: "1"}
	newer := Identity{Scenario: "abc", Version: "2"}
	tests := []struct {
		name    string
		before  func(*testing.T, string)
		id      Identity
		replace bool
		want    string // reason; "" = opens
		resumed bool
	}{
		{"finished", finished, thisRun, false, "holds a finished run", false},
		{"finished, replaced", finished, thisRun, true, "", false},
		{"unfinished, same run", unfinished, thisRun, false, "", true},
		{"unfinished, same run, replaced", unfinished, thisRun, true, "", false},
		{"unfinished, other scenario", unfinished, other, false, "another scenario or program version", false},
		{"unfinished, other version", unfinished, newer, false, "another scenario or program version", false},
		{"unfinished, other scenario, replaced", unfinished, other, true, "", false},
		{"files of others", foreign, thisRun, false, "not those of a run", false},
		{"files of others, replaced", foreign, thisRun, true, "not those of a run", false},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			dir := t.TempDir()
			tt.before(t, dir)
			before := names(t, dir)
			f, err := OpenFolder(dir, tt.id, tt.replace)
			if tt.want == "" {
				if err != nil || f.Resumed() != tt.resumed {
					t.Fatalf("opens with %v, resumed %v, want %v", err, f != nil && f.Resumed(), tt.resumed)
				}
				writeRun(t, f) // and can be written
				return
			}
			var refused *FolderError
			if !errors.As(err, &refused) || !strings.Contains(refused.Reason, tt.want) || refused.Remedy == "" {
				t.Errorf("error is %v, want %q", err, tt.want)
			}
			if after := names(t, dir); !reflect.DeepEqual(before, after) {
				t.Errorf("refusing leaves %v of %v", after, before)
			}
		})
	}
}

// TestFolderReplaceSparesOthers checks that a replaced run takes its own files
// with it and no others.
func TestFolderReplaceSparesOthers(t *testing.T) {
	dir := t.TempDir()
	writeRun(t, open(t, dir, thisRun, false))
	for _, name := range []string{"notes.txt", "panel/mine.csv"} {
		if err := WriteFile(filepath.Join(dir, name), put("")); err != nil {
			t.Fatal(err)
		}
	}
	open(t, dir, Identity{Scenario: "def", Version: "1"}, true)
	if got, want := names(t, dir), []string{markFile, "notes.txt", "panel"}; !reflect.DeepEqual(got, want) {
		t.Errorf("folder holds %v, want %v", got, want)
	}
	if got := names(t, filepath.Join(dir, "panel")); !reflect.DeepEqual(got, []string{"mine.csv"}) {
		t.Errorf("panel holds %v, want the foreign file alone", got)
	}
}

// TestFolderReplaceStaysInside has a run.json claim a file outside its folder.
func TestFolderReplaceStaysInside(t *testing.T) {
	outer := t.TempDir()
	victim, dir := filepath.Join(outer, "victim"), filepath.Join(outer, "run")
	err := errors.Join(os.Mkdir(dir, 0o777), WriteFile(victim, put("")))
	err = errors.Join(err, (&Run{Files: []FileHash{{Path: "../victim"}}}).write(dir))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := OpenFolder(dir, thisRun, true); err == nil || !strings.Contains(err.Error(), "outside") {
		t.Errorf("error is %v", err)
	}
	if err := Verify(dir); err == nil || !strings.Contains(err.Error(), "outside") {
		t.Errorf("verifying gives %v", err)
	}
	if _, err := os.Stat(victim); err != nil {
		t.Error(err)
	}
}

// TestFolderResume interrupts a run in its panel and continues it: the files
// are those of a run that was never interrupted.
func TestFolderResume(t *testing.T) {
	whole, dir := t.TempDir(), t.TempDir()
	writeRun(t, open(t, whole, thisRun, false))
	f := open(t, dir, thisRun, false)
	panel, err := f.Path("panel/")
	if err != nil {
		t.Fatal(err)
	}
	o := testOptions(300)
	path, err := f.Path("summary.csv") // announced now, written before the interruption
	if err == nil {
		err = WriteFile(path, put("half"))
	}
	if err != nil {
		t.Fatal(err)
	}
	if err := write(panel, o, generate(o).units[:4]); err == nil {
		t.Fatal("an interrupted panel closes")
	}
	f = open(t, dir, thisRun, false)
	if !f.Resumed() {
		t.Error("the run is not resumed")
	}
	// The files announced before the interruption still belong to the run.
	if got := open(t, dir, thisRun, false).mark.Names; !reflect.DeepEqual(got, []string{"panel/", "summary.csv"}) {
		t.Errorf("the resumed run has announced %v", got)
	}
	writeRun(t, f)
	a, err1 := ReadRun(whole)
	b, err2 := ReadRun(dir)
	if err := errors.Join(err1, err2); err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(a.Files, b.Files) {
		t.Errorf("resumed run has files %v, want %v", b.Files, a.Files)
	}
}

func TestPeakMemory(t *testing.T) {
	if _, err := os.Stat("/proc/self/status"); err != nil {
		t.Skip("no /proc on this system")
	}
	before := PeakMemory()
	block := make([]byte, 64<<20)
	for i := range block {
		block[i] = byte(i)
	}
	after := PeakMemory()
	if before < 1<<20 || after-before < 32<<20 || after > 1<<40 || block[len(block)-1] != 255 {
		t.Errorf("peak goes from %d to %d bytes while 64 MiB are filled", before, after)
	}
}
