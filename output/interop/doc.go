// Package interop reads what the program writes with DuckDB, a Parquet reader
// that shares no code with the writer. It has a module of its own, since DuckDB
// needs a C compiler and the program does not. There is nothing here but tests:
//
//	cd output/interop && go test ./...
package interop
