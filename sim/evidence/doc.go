// Package evidence holds the program to values from outside it: published tables,
// worked numbers derived by hand or by another program, and closed forms. Each
// check names its source, what is expected, what this program finds and the
// tolerance, so that a reader can judge it and an auditor can rerun it.
package evidence
