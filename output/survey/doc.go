// Package survey describes the rows of Parquet files, whoever wrote them: a
// simulated panel or a survey of real households. It finds the cells that some
// columns tell apart, and hands the rows to package distribution, file by file and
// row group by row group, as often as that asks for them. Memory does not grow with
// the files, unless rows have weights.
//
// A unit (a household, a person) may have several rows; errors delete whole units.
// A weight is a sampling weight: a row stands for a number of units in proportion to
// it.
package survey
