package main

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"cistern/configs"
	"cistern/output"
)

// affordable reports a scenario that needs more memory or, if a run of it is
// written to the folder dir, more disk than there is.
func affordable(sc *configs.Scenario, workers int, dir string) error {
	c := sc.Cost(workers)
	if free := freeMemory(); free > 0 && c.MemoryBytes > free {
		return &configs.PosError{File: sc.Name, Message: fmt.Sprintf("the run would need about %s of memory, and %s are free; lower solver.asset_points, income.persistent.points or --workers",
			size(c.MemoryBytes), size(free))}
	}
	if dir == "" {
		return nil
	}
	if free := freeDisk(dir); free > 0 && c.DiskBytes > free {
		return &configs.PosError{File: sc.Name, Key: "households", Message: fmt.Sprintf("is %d: the run would write about %s, and %s are free on the disk of %s; lower households, set panel.precision=single or panel.write=false",
			sc.Households, size(c.DiskBytes), size(free), dir)}
	}
	return nil
}

// freeMemory returns the bytes of memory that can be had, 0 if the system does not
// say.
func freeMemory() float64 {
	text, err := os.ReadFile("/proc/meminfo")
	if err != nil {
		return 0
	}
	for _, line := range strings.Split(string(text), "\n") {
		if f := strings.Fields(line); len(f) >= 2 && f[0] == "MemAvailable:" {
			kib, _ := strconv.ParseFloat(f[1], 64)
			return kib * 1024
		}
	}
	return 0
}

// freeDisk returns the bytes free where dir is or will be, 0 if the system does not
// say.
func freeDisk(dir string) float64 {
	dir, err := filepath.Abs(dir)
	if err != nil {
		return 0
	}
	for {
		if _, err := os.Stat(dir); err == nil {
			return freeBytes(dir)
		}
		up := filepath.Dir(dir)
		if up == dir {
			return 0
		}
		dir = up
	}
}

// size says bytes in words.
func size(bytes float64) string {
	for _, u := range []struct {
		name string
		unit float64
	}{{"TB", 1e12}, {"GB", 1e9}, {"MB", 1e6}, {"kB", 1e3}} {
		if bytes >= u.unit {
			return fmt.Sprintf("%.1f %s", bytes/u.unit, u.name)
		}
	}
	return fmt.Sprintf("%.0f bytes", bytes)
}

// folderHint names the flag that helps.
func folderHint(err error) error {
	var f *output.FolderError
	if errors.As(err, &f) && strings.Contains(f.Remedy, "replace") {
		return fmt.Errorf("%w with --replace", err)
	}
	return err
}
