// Package sheet opens the workbooks that come from outside: a case in the form
// of an Inputs sheet, or a report that is to be run again. It also writes the
// starter workbook.
//
// A workbook is checked before any of it is believed: its size, the number and
// names of its parts, what they unzip to and whether each agrees with its
// checksum; then the few parts that matter are read with a plain XML reader,
// within bounds, so that neither a damaged nor a hostile file costs more than
// seconds or gives a number that nobody wrote. It refuses passwords, document
// types and entities, cells that were written twice, formulas without a stored
// value, dates, errors, and merged cells among the inputs. It opens no files;
// the command line calls it.
package sheet
