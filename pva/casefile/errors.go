package casefile

import (
	"fmt"
	"sort"
	"strings"

	"ebbline/pva"
)

// Error is one fault with its place: a line and column of a file, or a cell of
// a workbook. Line and Col count from 1, Col in characters; Line 0 means that
// the fault has no place of its own.
type Error struct {
	File      string
	Line, Col int
	Cell      string // "Inputs!B7" where the case came from a workbook
	Fault     pva.Fault
	Snippet   string // the offending line and, below it, a caret; "" if there is none

	offset int
}

// Error is the place and the fault on one line.
func (e Error) Error() string {
	place := e.File
	switch {
	case e.Cell != "":
		place += ":" + e.Cell
	case e.Line > 0:
		place += fmt.Sprintf(":%d:%d", e.Line, e.Col)
	}
	return place + ": " + e.Fault.Error()
}

// Unwrap gives the fault without its place.
func (e Error) Unwrap() error { return e.Fault }

// Errors is all that is wrong with a case, in the order of the file. An empty
// list is no error.
type Errors []Error

// mostShown is the number of faults that are printed; more would only scroll
// the first ones, which the rest often follow from, out of sight.
const mostShown = 50

// Error is every fault on a line of its own, at most 50 of them.
func (es Errors) Error() string { return es.Text(false) }

// Text is Error, with the offending line and a caret below each fault if
// snippets is true.
func (es Errors) Text(snippets bool) string {
	var b strings.Builder
	for i, e := range es {
		if i == mostShown {
			fmt.Fprintf(&b, "\n(and %d more)", len(es)-mostShown)
			break
		}
		if i > 0 {
			b.WriteByte('\n')
		}
		b.WriteString(e.Error())
		if snippets && e.Snippet != "" {
			b.WriteString("\n" + e.Snippet)
		}
	}
	return b.String()
}

func (es Errors) sort() {
	sort.SliceStable(es, func(i, j int) bool { return es[i].offset < es[j].offset })
}
