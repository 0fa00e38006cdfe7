//go:build !(linux || darwin || freebsd)

package main

func freeBytes(string) float64 { return 0 }
