package slurm

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os/exec"
	"os/user"
	"regexp"
	"strconv"
	"strings"
	"time"
)

// Limits are what the scheduler takes at a time; 0 stands for no limit.
type Limits struct {
	ArraySize int // tasks of one array
	Jobs      int // jobs, tasks included, that the user may have submitted
}

// Available reports whether the scheduler's commands are there and answer.
func Available(ctx context.Context) error {
	for _, name := range []string{"sbatch", "squeue", "scontrol"} {
		if _, err := exec.LookPath(name); err != nil {
			return fmt.Errorf("slurm: the command %s is not on this machine", name)
		}
	}
	_, err := run(ctx, "", "scontrol", "ping")
	return err
}

// run runs a command and returns what it prints.
func run(ctx context.Context, input, name string, args ...string) (string, error) {
	cmd := exec.CommandContext(ctx, name, args...)
	cmd.Stdin = strings.NewReader(input)
	var out, fault bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &fault
	if err := cmd.Run(); err != nil {
		if ctx.Err() != nil {
			return "", context.Cause(ctx)
		}
		return "", fmt.Errorf("slurm: %s: %w: %s", name, err, strings.TrimSpace(fault.String()))
	}
	return out.String(), nil
}

// AskLimits asks the scheduler for its limits.
func AskLimits(ctx context.Context) (Limits, error) {
	config, err := run(ctx, "", "scontrol", "show", "config")
	if err != nil {
		return Limits{}, err
	}
	var l Limits
	size, err := setting(config, "MaxArraySize")
	if err != nil {
		return Limits{}, err
	}
	l.ArraySize = max(size-1, 0) // the setting is one more than the highest task number
	if l.Jobs, err = setting(config, "MaxJobCount"); err != nil {
		return Limits{}, err
	}
	if !strings.Contains(config, "accounting_storage/slurmdbd") {
		return l, nil
	}
	user, err := user.Current()
	if err != nil {
		return l, nil
	}
	rows, err := run(ctx, "", "sacctmgr", "--noheader", "--parsable2", "show", "assoc", "where", "user="+user.Username, "format=MaxSubmitJobs")
	if err != nil {
		return l, nil // without accounting there is no such limit to obey
	}
	l.Jobs = lowest(l.Jobs, rows)
	return l, nil
}

// setting reads a number of scontrol's configuration.
func setting(config, name string) (int, error) {
	m := regexp.MustCompile(`(?m)^` + name + `\s*=\s*(\d+)`).FindStringSubmatch(config)
	if m == nil {
		return 0, fmt.Errorf("slurm: scontrol show config has no %s", name)
	}
	return strconv.Atoi(m[1])
}

// lowest is the lowest of a limit and those listed one a line.
func lowest(limit int, rows string) int {
	for _, f := range strings.Fields(rows) {
		if n, err := strconv.Atoi(f); err == nil && n > 0 && (limit == 0 || n < limit) {
			limit = n
		}
	}
	return limit
}

var jobID = regexp.MustCompile(`^(\d+)(;\S*)?\s*$`)

// Submit submits a script as an array of tasks 0 … tasks−1, in the folder dir, and
// returns the job's number. after are jobs that must have ended before; with tasks
// 0 it is a single job.
func Submit(ctx context.Context, dir, script string, tasks int, after []string) (id string, err error) {
	args := []string{"--parsable", "--chdir=" + dir}
	if tasks > 0 {
		args = append(args, fmt.Sprintf("--array=0-%d", tasks-1))
	}
	if len(after) > 0 {
		args = append(args, "--dependency=afterany:"+strings.Join(after, ":"))
	}
	out, err := run(ctx, script, "sbatch", args...)
	if err != nil {
		return "", err
	}
	m := jobID.FindStringSubmatch(out)
	if m == nil {
		return "", fmt.Errorf("slurm: sbatch answers %q, not a job's number", strings.TrimSpace(out))
	}
	return m[1], nil
}

// Task is how far one task of a job is.
type Task struct {
	Job   string
	Index int    // of an array; −1: a single job
	State string // PENDING, RUNNING, …, as the scheduler calls it
}

// Tasks returns the tasks of jobs that the scheduler still knows as waiting or at
// work.
func Tasks(ctx context.Context, jobs []string) ([]Task, error) {
	if len(jobs) == 0 {
		return nil, nil
	}
	out, err := run(ctx, "", "squeue", "--noheader", "--array", "--format=%i %T", "--jobs="+strings.Join(jobs, ","))
	if err != nil {
		if strings.Contains(err.Error(), "Invalid job id") {
			return nil, nil // all of them ended long ago
		}
		return nil, err
	}
	return readTasks(out)
}

var taskID = regexp.MustCompile(`^(\d+)(?:_(\d+))?$`)

func readTasks(out string) ([]Task, error) {
	var tasks []Task
	for line := range strings.Lines(out) {
		f := strings.Fields(line)
		if len(f) == 0 {
			continue
		}
		var m []string
		if len(f) == 2 {
			m = taskID.FindStringSubmatch(f[0])
		}
		if m == nil {
			return nil, fmt.Errorf("slurm: squeue answers %q", strings.TrimSpace(line))
		}
		t := Task{Job: m[1], Index: -1, State: f[1]}
		if m[2] != "" {
			t.Index, _ = strconv.Atoi(m[2])
		}
		tasks = append(tasks, t)
	}
	return tasks, nil
}

// Cancel cancels jobs, or tasks of jobs written as job_task.
func Cancel(ctx context.Context, jobs ...string) error {
	if len(jobs) == 0 {
		return errors.New("slurm: nothing to cancel")
	}
	_, err := run(ctx, "", "scancel", jobs...)
	return err
}

// Requeue sends a task back to wait. It may start again at once: by itself the
// scheduler would hold it back for two minutes.
func Requeue(ctx context.Context, job string) error {
	if _, err := run(ctx, "", "scontrol", "requeue", job); err != nil {
		return err
	}
	for range 100 { // the task must first have come to its end
		out, err := run(ctx, "", "scontrol", "show", "job", job)
		if err != nil {
			return err
		}
		if strings.Contains(out, "Reason=BeginTime") {
			_, err = run(ctx, "", "scontrol", "update", "JobId="+job, "StartTime=now")
			return err
		}
		if strings.Contains(out, "JobState=RUNNING") {
			return nil
		}
		select {
		case <-ctx.Done():
			return context.Cause(ctx)
		case <-time.After(100 * time.Millisecond):
		}
	}
	return nil
}
