// Package output writes what a run leaves behind: the panel of simulated
// households, tables, and the run folder that holds them.
//
// It knows nothing of income processes, rules or simulations. It is handed
// plain columns and values, each with its unit and meaning, and it writes them
// in four shapes: Parquet for panels and large tables, CSV, JSON and aligned
// text for the rest.
//
// # Panel
//
// A [Panel] is a folder of part files, part-00000.parquet, part-00001.parquet
// and so on. Part k holds the households k·Block … (k+1)·Block − 1, one row a
// household and year alive, sorted by household, then age. A part consists of
// units of Unit consecutive households; each unit is one row group, encoded by
// whichever worker simulated it and appended in order of households. So the
// bytes of a part follow from its rows alone: not from the number of workers,
// nor from whether the run was interrupted and continued, nor from the clock.
//
// The simulation yields a unit's rows by age (all households of the unit at
// the first age, then at the next, …) together with each row's place in the
// order household, age. [Panel.Encode] scatters each column into that order.
//
// Invariants: a part file is whole or absent, since it is written under a
// temporary name in the same folder and renamed when its footer is on disk;
// every state written is finite; units arrive in ascending order without gaps.
//
// # Tables
//
// A [Table] is a value: named, typed columns with units and meanings. Renderers
// come second ([Table.WriteText], [Table.WriteCSV], [Table.WriteJSON],
// [Table.WriteParquet]). A missing value (a statistic that does not apply) is
// not a NaN (a statistic that could not be computed), and every renderer keeps
// the two apart.
//
// # Run folder
//
// A [Folder] is created by the command that runs a scenario, marked as
// unfinished with the hash of that scenario, and finished by run.json, which
// carries a SHA-256 of every other file. A finished folder is never overwritten
// unasked; an unfinished one is continued, provided the scenario is the same.
package output
