// Package configs reads scenarios: what a population is, in words and numbers
// that an economist writes in YAML, turned into the households, rules of the
// public pension and simulation that the other packages work with.
//
// The format is described once, in describe.go and household.go: a walk over the
// keys in which each says its type, range, default and meaning. The same walk
// reads a file, lists every fault with its place, writes the scenario with every
// default filled in, and makes the JSON Schema.
//
// A file that a scenario names is found relative to the scenario. Nothing is read
// but the scenario and the files it names.
package configs
