// Package casefile turns a case file (TOML 1.0), or the rows of an Inputs sheet,
// into a case, and a case back into either. Only here do faults get a place: a
// file, line and column, or a cell.
//
// It refuses what it does not know: an unknown key, a value of the wrong kind, a
// date, an infinite number, a file too large or too deeply nested to be a case.
// It opens no files and prints nothing; the command line, the reports and the
// built-in examples call it.
package casefile
