package sheet

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"strconv"
	"strings"

	"ebbline/pva"
	"ebbline/pva/casefile"
)

// RunAgainSheet is the sheet of a report that carries its case.
const RunAgainSheet = "Run again"

// Report is what a report says of the run that made it.
type Report struct {
	CaseText          string // in TOML, as verified by its lines and checksum
	Program, Version  string
	Command, CaseFile string
	Seed              uint64
	Replicates, Asked int64 // finished, and asked for
	Digest            string
}

// The labels of the sheet's first column.
const (
	labelProgram  = "Program"
	labelVersion  = "Version"
	labelCommand  = "Command line"
	labelFile     = "Case file"
	labelSeed     = "Seed"
	labelFinished = "Replicates finished"
	labelAsked    = "Replicates asked for"
	labelDigest   = "Digest of the case"
	labelLines    = "Lines of the case text"
	labelSum      = "SHA-256 of the case text"
)

// Altered is the error of a report whose case is not the one it was written
// with: its lines or its SHA-256 are not those stated beside it.
type Altered struct{ What casefile.Error }

// Error is what was found, with the report's name.
func (a Altered) Error() string { return a.What.Error() }

// Unwrap is the same without saying that the report was altered.
func (a Altered) Unwrap() error { return a.What }

// alter is refuseCell, or refuse where ref is empty, for an Altered report.
func alter(ref, format string, args ...any) error {
	e := casefile.Error{Fault: pva.Fault{Want: fmt.Sprintf(format, args...), Fix: "ask for the report as it was written"}}
	if ref != "" {
		e.Cell = RunAgainSheet + "!" + ref
	}
	return Altered{e}
}

// Embedded is the case that a report carries on its sheet Run again. A case
// text that does not have the lines or the SHA-256 stated beside it is an error
// of type Altered; a label that is missing or stands twice is an error too. That
// the text is the case of the digest is for the caller to check: it takes
// reading the case.
func Embedded(w *Workbook) (*Report, error) {
	r, err := w.embedded()
	return r, w.named(err)
}

func (w *Workbook) embedded() (*Report, error) {
	const fix = "give a report workbook that this program wrote"
	if _, ok := w.parts[RunAgainSheet]; !ok {
		return nil, refuse(fix, "has no sheet %q, so it is not a report that can be run again", RunAgainSheet)
	}
	cells, _, err := w.cells(RunAgainSheet, largestInputs, 2)
	if err != nil {
		return nil, err
	}
	said := map[string]Cell{}
	var lines []string
	var line strings.Builder // a line too long for one cell goes on in the next
	lastRow, number := 0, 0
	inText := false
	pair := func(row int, a, b Cell) error {
		switch {
		case !inText && a.Text == "Line" && b.Text == "Text":
			inText = true
		case inText:
			n, ok := whole(a.Text)
			if !ok || a.Kind != Number || n != number && n != number+1 || n == 0 || lastRow > 0 && row != lastRow+1 {
				return alter("A"+strconv.Itoa(row), "is not the number of the next line of the case: the case text was changed")
			}
			lastRow = row
			if n > number && number > 0 {
				lines = append(lines, line.String())
				line.Reset()
			}
			number = n
			line.WriteString(b.Text)
		case a.Text != "":
			if _, twice := said[a.Text]; twice && b.Text != "" {
				return refuseCell(RunAgainSheet, a.Ref(), fix, "says %q a second time", a.Text)
			}
			said[a.Text] = b
		}
		return nil
	}
	for i := 0; i < len(cells); {
		row := cells[i].Row
		var a, b Cell
		for ; i < len(cells) && cells[i].Row == row; i++ {
			if cells[i].Column == 1 {
				a = cells[i]
			} else {
				b = cells[i]
			}
		}
		if err := pair(row, a, b); err != nil {
			return nil, err
		}
	}
	if number > 0 {
		lines = append(lines, line.String())
	}
	r := &Report{}
	for _, f := range []struct {
		label string
		into  any
	}{
		{labelProgram, &r.Program}, {labelVersion, &r.Version}, {labelCommand, &r.Command}, {labelSeed, &r.Seed},
		{labelFinished, &r.Replicates}, {labelDigest, &r.Digest},
	} {
		c, ok := said[f.label]
		if !ok {
			return nil, refuse(fix, "says no %q on its sheet %q", f.label, RunAgainSheet)
		}
		if err := take(c, f.into); err != nil {
			return nil, refuseCell(RunAgainSheet, "B"+strconv.Itoa(c.Row), fix, "is no %q: %s", f.label, err)
		}
	}
	r.Asked = r.Replicates
	if c, ok := said[labelAsked]; ok {
		if err := take(c, &r.Asked); err != nil || r.Asked < r.Replicates {
			return nil, refuseCell(RunAgainSheet, c.Ref(), fix, "is no %q", labelAsked)
		}
	}
	r.CaseFile = said[labelFile].Text
	var count int64
	if take(said[labelLines], &count) != nil || count != int64(len(lines)) {
		return nil, alter("", "carries a case of %d lines where it says %q: the case text was changed", len(lines), said[labelLines].Text)
	}
	sum := sha256.Sum256([]byte(strings.Join(lines, "\n")))
	if got := hex.EncodeToString(sum[:]); got != said[labelSum].Text {
		return nil, alter("", "carries a case whose SHA-256 is not the one stated on its sheet %q: the case text or the checksum was changed", RunAgainSheet)
	}
	r.CaseText = strings.Join(lines, "\n") + "\n"
	return r, nil
}

// take puts a cell into a field.
func take(c Cell, into any) error {
	switch p := into.(type) {
	case *string:
		*p = c.Text
		if c.Kind != Text {
			return fmt.Errorf("%.40q is not a text", c.Text)
		}
	case *uint64:
		n, err := strconv.ParseUint(c.Text, 10, 64)
		if err != nil {
			return fmt.Errorf("%.40q is not a whole number", c.Text)
		}
		*p = n
	case *int64:
		if c.Kind != Number || c.Num != float64(int64(c.Num)) || c.Num < 0 || c.Num > 1e15 {
			return fmt.Errorf("%.40q is not a whole number", c.Text)
		}
		*p = int64(c.Num)
	}
	return nil
}
