// Package slurm hands work to a Slurm cluster: it writes batch scripts, submits
// them as job arrays within the limits that the scheduler reports, and asks how far
// they are. It runs the scheduler's own commands (sbatch, squeue, scontrol,
// sacctmgr) and reads their plain output, which has the same form in all versions
// since 20.
package slurm
