//go:build linux || darwin || freebsd

package main

import "syscall"

func freeBytes(dir string) float64 {
	var s syscall.Statfs_t
	if err := syscall.Statfs(dir, &s); err != nil {
		return 0
	}
	return float64(s.Bavail) * float64(s.Bsize)
}
