package slurm

import (
	"errors"
	"fmt"
	"regexp"
	"strings"
)

// Job says what a batch job asks the cluster for. Empty fields are left to the
// cluster's defaults.
type Job struct {
	Name      string
	Partition string
	Account   string
	Time      string   // as sbatch takes it: minutes, or days-hours:minutes:seconds
	Memory    string   // a task, as sbatch takes it: 4G
	CPUs      int      // processors a task
	Modules   []string // environment modules to load before the command
	Log       string   // pattern of the log files, as sbatch takes it
	Options   []string // further options of sbatch, each "--name=value"
}

var (
	word     = regexp.MustCompile(`^[A-Za-z0-9_.:/+@%,=-]+$`)
	duration = regexp.MustCompile(`^(\d+-)?\d+(:\d+){0,2}$`)
	memory   = regexp.MustCompile(`^\d+[KMGT]?$`)
	option   = regexp.MustCompile(`^--[a-z][a-z-]*(=[A-Za-z0-9_.:/+@%,=-]+)?$`)
)

// Validate reports every fault at once, each a *FieldError.
func (j Job) Validate() error {
	var errs []error
	check := func(field, value string, form *regexp.Regexp, want string) {
		if value != "" && !form.MatchString(value) {
			errs = append(errs, &FieldError{field, value, want})
		}
	}
	plain := "letters, digits and .:/+@%,=_- without spaces"
	check("name", j.Name, word, plain)
	check("partition", j.Partition, word, plain)
	check("account", j.Account, word, plain)
	check("time", j.Time, duration, "minutes, minutes:seconds, hours:minutes:seconds or days-hours:minutes:seconds")
	check("memory", j.Memory, memory, "a number with K, M, G or T")
	for _, m := range j.Modules {
		check("modules", m, word, plain)
	}
	for _, o := range j.Options {
		check("options", o, option, "--name or --name=value")
	}
	if j.CPUs < 0 {
		errs = append(errs, &FieldError{"cpus", fmt.Sprint(j.CPUs), "at least 1"})
	}
	return errors.Join(errs...)
}

// A FieldError is a setting of a job that cannot be.
type FieldError struct{ Field, Value, Want string }

func (e *FieldError) Error() string {
	return fmt.Sprintf("slurm: %s is %q, want %s", e.Field, e.Value, e.Want)
}

// Script returns a batch script that runs command, words quoted for the shell. In
// them $SLURM_ARRAY_TASK_ID stands for itself, so that the tasks of an array can be
// told apart.
func (j Job) Script(command []string) string {
	var b strings.Builder
	b.WriteString("#!/bin/bash\n")
	line := func(option, value string) {
		if value != "" {
			fmt.Fprintf(&b, "#SBATCH --%s=%s\n", option, value)
		}
	}
	line("job-name", j.Name)
	line("partition", j.Partition)
	line("account", j.Account)
	line("time", j.Time)
	line("mem", j.Memory)
	if j.CPUs > 0 {
		line("cpus-per-task", fmt.Sprint(j.CPUs))
	}
	line("output", j.Log)
	b.WriteString("#SBATCH --ntasks=1\n#SBATCH --requeue\n#SBATCH --open-mode=append\n")
	for _, o := range j.Options {
		b.WriteString("#SBATCH " + o + "\n")
	}
	b.WriteString("set -eu\n")
	for _, m := range j.Modules {
		fmt.Fprintf(&b, "module load %s\n", Quote(m))
	}
	words := make([]string, len(command))
	for i, w := range command {
		words[i] = Quote(w)
		if w == TaskID {
			words[i] = `"$SLURM_ARRAY_TASK_ID"`
		}
	}
	b.WriteString("exec " + strings.Join(words, " ") + "\n")
	return b.String()
}

// TaskID is the word of a command that stands for the number of the array task.
const TaskID = "$SLURM_ARRAY_TASK_ID"

var safe = regexp.MustCompile(`^[A-Za-z0-9_./:=@%+,-]+$`)

// Quote returns a word quoted for a POSIX shell.
func Quote(w string) string {
	if safe.MatchString(w) {
		return w
	}
	return "'" + strings.ReplaceAll(w, "'", `'\''`) + "'"
}
