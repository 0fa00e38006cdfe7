package slurm

import (
	"context"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"cistern/cmd/cistern/slurm/slurmtest"
)

func TestScript(t *testing.T) {
	j := Job{Name: "port", Partition: "short", Account: "econ", Time: "1-00:30:00", Memory: "4G", CPUs: 2, Modules: []string{"go/1.26"}, Log: "log/%A_%a", Options: []string{"--qos=low"}}
	if err := j.Validate(); err != nil {
		t.Fatal(err)
	}
	want := `#!/bin/bash
#SBATCH --job-name=port
#SBATCH --partition=short
#SBATCH --account=econ
#SBATCH --time=1-00:30:00
#SBATCH --mem=4G
#SBATCH --cpus-per-task=2
#SBATCH --output=log/%A_%a
#SBATCH --ntasks=1
#SBATCH --requeue
#SBATCH --open-mode=append
#SBATCH --qos=low
set -eu
module load go/1.26
exec run 'it'\''s $HOME' "$SLURM_ARRAY_TASK_ID"
`
	if got := j.Script([]string{"run", "it's $HOME", TaskID}); got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
	// A shell reads the words as they were meant.
	out, err := exec.Command("sh", "-c", "SLURM_ARRAY_TASK_ID=7; printf '<%s>' "+strings.TrimPrefix(lastLine(want), "exec run ")).Output()
	if err != nil || string(out) != "<it's $HOME><7>" {
		t.Errorf("the shell reads %s, %v", out, err)
	}
}

func lastLine(s string) string {
	lines := strings.Split(strings.TrimSpace(s), "\n")
	return lines[len(lines)-1]
}

// What could add lines or options to a batch script is refused.
func TestJobFaults(t *testing.T) {
	for field, j := range map[string]Job{
		"name": {Name: "a\n#SBATCH --x"}, "partition": {Partition: "a b"}, "account": {Account: "$(id)"}, "time": {Time: "soon"},
		"memory": {Memory: "4 GB"}, "modules": {Modules: []string{"a; b"}}, "options": {Options: []string{"qos"}}, "cpus": {CPUs: -1},
	} {
		var f *FieldError
		if err := j.Validate(); !errors.As(err, &f) || f.Field != field {
			t.Errorf("%+v: got %v, want a fault of %s", j, err, field)
		}
	}
}

func TestReadTasks(t *testing.T) {
	tasks, err := readTasks("17_0 RUNNING\n17_12 PENDING\n\n18 PENDING\n")
	if err != nil || len(tasks) != 3 || tasks[1] != (Task{"17", 12, "PENDING"}) || tasks[2] != (Task{"18", -1, "PENDING"}) {
		t.Errorf("got %+v, %v", tasks, err)
	}
	for _, bad := range []string{"17_[0-3] PENDING\n", "x RUNNING\n", "17\n"} {
		if _, err := readTasks(bad); err == nil {
			t.Errorf("%q is taken", bad)
		}
	}
	if got := lowest(10000, "\n500\n\n700\n"); got != 500 {
		t.Errorf("limit %d, want 500", got)
	}
}

// A real cluster runs an array, a job that waits for it, and a task that is sent
// back to wait; one that is cancelled does not run.
func TestCluster(t *testing.T) {
	slurmtest.Start(t, 20)
	ctx, cancel := context.WithTimeout(context.Background(), 2*time.Minute)
	defer cancel()
	if err := Available(ctx); err != nil {
		t.Fatal(err)
	}
	limits, err := AskLimits(ctx)
	if err != nil || limits.ArraySize != 20 || limits.Jobs < 1000 {
		t.Fatalf("limits %+v, %v, want arrays of 20 tasks", limits, err)
	}
	dir := t.TempDir()
	j := Job{Name: "port", Log: "log-%a"}
	script := j.Script([]string{"sh", "-c", `sleep 3; echo "$0 $SLURM_RESTART_COUNT" >> done-$0`, TaskID})
	id, err := Submit(ctx, dir, script, 6, nil)
	if err != nil {
		t.Fatal(err)
	}
	if err := Cancel(ctx, id+"_5"); err != nil {
		t.Fatal(err)
	}
	gather, err := Submit(ctx, dir, j.Script([]string{"sh", "-c", "ls done-* > all"}), 0, []string{id})
	if err != nil {
		t.Fatal(err)
	}
	requeued := false
	for {
		tasks, err := Tasks(ctx, []string{id, gather})
		if err != nil {
			t.Fatal(err)
		}
		for _, k := range tasks {
			if k.Job == id && k.Index == 1 && k.State == "RUNNING" && !requeued {
				requeued = true
				if err := Requeue(ctx, id+"_1"); err != nil {
					t.Fatal(err)
				}
			}
		}
		if len(tasks) == 0 {
			break
		}
		select {
		case <-ctx.Done():
			t.Fatalf("still there: %+v", tasks)
		case <-time.After(200 * time.Millisecond):
		}
	}
	all, err := os.ReadFile(filepath.Join(dir, "all"))
	if err != nil || string(all) != "done-0\ndone-1\ndone-2\ndone-3\ndone-4\n" {
		t.Errorf("the job that waits for the array finds %q, %v", all, err)
	}
	if again, err := os.ReadFile(filepath.Join(dir, "done-1")); err != nil || requeued && !strings.Contains(string(again), "1 1") {
		t.Errorf("task 1, sent back to wait (%v), leaves %q, %v", requeued, again, err)
	}
	if _, err := Submit(ctx, dir, script, 22, nil); err == nil {
		t.Error("an array beyond the cluster's limit is taken")
	}
}
