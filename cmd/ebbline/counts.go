package main

import (
	"errors"
	"fmt"
	"path/filepath"
	"strconv"
	"strings"

	"ebbline/pva/casefile"
	"ebbline/pva/casefile/sheet"
	"ebbline/pva/fit"
)

// countsSheet is the sheet that is read wherever it stands; without one it is
// the first sheet.
const countsSheet = "Counts"

// Bounds on the table of counts in a workbook, wide of any that can be read.
const (
	countColumns = 64
	countRows    = 2000
)

// readCounts reads a series of counts from a CSV file or a workbook.
func readCounts(path string) (*fit.Series, error) {
	name := filepath.Base(path)
	if !isWorkbook(path) {
		data, err := readBounded(path, largestCase)
		if err != nil {
			return nil, err
		}
		return fit.Read(name, data)
	}
	data, err := readBounded(path, sheet.LargestFile)
	if err != nil {
		return nil, err
	}
	return workbookCounts(name, data)
}

// workbookCounts reads a series of counts from a workbook.
func workbookCounts(name string, data []byte) (*fit.Series, error) {
	book, err := sheet.Open(name, data)
	if err != nil {
		var e casefile.Error
		if errors.As(err, &e) && e.Fault.Want == "is not a workbook" {
			e.Fault.Fix = "give an .xlsx workbook, or the counts as CSV"
			return nil, e
		}
		return nil, err
	}
	from := ""
	for _, s := range book.Sheets() {
		if strings.EqualFold(strings.TrimSpace(s), countsSheet) {
			from = s
			break
		}
		if from == "" && book.SheetPart(s) != "" {
			from = s
		}
	}
	if from == "" {
		return nil, fmt.Errorf("%s: has no sheet with cells; put the counts on a sheet %s", name, countsSheet)
	}
	cells, err := book.Cells(from)
	if err != nil {
		return nil, err
	}
	var rows [][]fit.Cell
	var at []int // the row of the sheet
	for _, c := range cells {
		if c.Column > countColumns {
			return nil, fit.Faults{{File: name, Cell: from + "!" + c.Ref(), Want: fmt.Sprintf("stands beyond column %d", countColumns), Fix: "put the counts alone on a sheet " + countsSheet}}
		}
		if n := len(at); n == 0 || at[n-1] != c.Row {
			if n == countRows {
				break
			}
			rows, at = append(rows, nil), append(at, c.Row)
		}
		row := &rows[len(rows)-1]
		for len(*row) < c.Column {
			*row = append(*row, fit.Cell{})
		}
		(*row)[c.Column-1] = countCell(c)
	}
	return fit.ReadRows(name, rows, func(row, column int) string {
		return from + "!" + sheet.Cell{Row: at[row], Column: column + 1}.Ref()
	})
}

// countCell is what a cell of a workbook gives to a table of counts.
func countCell(c sheet.Cell) fit.Cell {
	switch {
	case c.Kind == sheet.Nothing:
		return fit.Cell{Want: "holds a formula without a stored value", Fix: "open the workbook in a spreadsheet program and save it, or write the value itself"}
	case c.Kind == sheet.Failure:
		return fit.Cell{Text: c.Text, Want: "is an error", Fix: "mend the formula, or leave the cell empty if nobody counted"}
	case c.Date:
		return fit.Cell{Want: "holds a date or time", Fix: "format the cell as a number and write it again: a year is a number such as 2004"}
	case c.Kind == sheet.Number:
		return fit.Cell{Text: strconv.FormatFloat(c.Num, 'g', -1, 64)}
	}
	return fit.Cell{Text: c.Text}
}
