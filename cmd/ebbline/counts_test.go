package main

import (
	"reflect"
	"strings"
	"testing"

	"ebbline/pva/fit"

	"github.com/xuri/excelize/v2"
)

// countBook is a workbook of the named sheets; at puts values, each under
// "Sheet!A1".
func countBook(t *testing.T, sheets []string, at map[string]any) (*excelize.File, func() []byte) {
	t.Helper()
	f := excelize.NewFile()
	for i, s := range sheets {
		if i == 0 {
			if err := f.SetSheetName("Sheet1", s); err != nil {
				t.Fatal(err)
			}
		} else if _, err := f.NewSheet(s); err != nil {
			t.Fatal(err)
		}
	}
	for ref, v := range at {
		s, cell, _ := strings.Cut(ref, "!")
		if err := f.SetCellValue(s, cell, v); err != nil {
			t.Fatal(err)
		}
	}
	return f, func() []byte {
		b, err := f.WriteToBuffer()
		if err != nil {
			t.Fatal(err)
		}
		return b.Bytes()
	}
}

// TestWorkbookCounts: the counts of a workbook are those of the same table as
// CSV, on the sheet Counts or else the first; blank rows, a gap in the counts,
// numbers kept as text and a formula with its value are read as a person means.
func TestWorkbookCounts(t *testing.T) {
	want, err := fit.Read("counts.xlsx", []byte("year,count,se,note\n2001,212.5,4,\n2002,,,storm\n2003,NA,,\n2004,198,3,\n2005,240,2,x\n"))
	if err != nil {
		t.Fatal(err)
	}
	table := map[string]any{"B3": "Year", "C3": "count", "D3": "se", "E3": "note",
		"B4": 2001, "C4": 212.5, "D4": 4, "B5": 2002, "E5": "storm", "B6": 2003, "C6": "NA",
		"B8": "2004", "C8": 198, "D8": 3, "B9": 2005, "D9": 2, "E9": "x"}
	for _, sheets := range [][]string{{"Herons"}, {"Read me", " counts "}} {
		at := map[string]any{}
		s := sheets[len(sheets)-1]
		for ref, v := range table {
			at[s+"!"+ref] = v
		}
		if len(sheets) > 1 {
			at["Read me!A1"] = "an invented series"
		}
		f, bytes := countBook(t, sheets, at)
		if err := f.SetCellValue(s, "C9", 240); err != nil {
			t.Fatal(err)
		}
		if err := f.SetCellFormula(s, "C9", "120*2"); err != nil { // the value stays stored
			t.Fatal(err)
		}
		got, err := workbookCounts("counts.xlsx", bytes())
		if err != nil {
			t.Errorf("%q: %v", sheets, err)
			continue
		}
		if !reflect.DeepEqual(got, want) {
			t.Errorf("%q: %+v, want %+v", sheets, got, want)
		}
	}
}

// TestWorkbookCountsWrong: faults name the cell, and come together.
func TestWorkbookCountsWrong(t *testing.T) {
	f, bytes := countBook(t, []string{"Counts"}, map[string]any{"Counts!A1": "year", "Counts!B1": "count", "Counts!C1": "note",
		"Counts!A2": 2001, "Counts!B2": "many", "Counts!A3": 37000, "Counts!B3": 4, "Counts!A4": 2003, "Counts!B5": 7,
		"Counts!A6": 2005, "Counts!B6": -1, "Counts!A7": 2006, "Counts!B7": "1,234", "Counts!C7": 37000, "Counts!A8": 2007, "Counts!B8": true,
		"Counts!A9": 2008, "Counts!B9": 5, "Counts!D9": 6})
	date, err := f.NewStyle(&excelize.Style{NumFmt: 14})
	if err != nil {
		t.Fatal(err)
	}
	for _, cell := range []string{"A3", "C7"} {
		if err := f.SetCellStyle("Counts", cell, cell, date); err != nil {
			t.Fatal(err)
		}
	}
	if err := f.SetCellFormula("Counts", "B4", "SUM(E1:E9)"); err != nil { // no stored value
		t.Fatal(err)
	}
	_, err = workbookCounts("counts.xlsx", bytes())
	faults, ok := err.(fit.Faults)
	want := []string{
		`counts.xlsx:Counts!B2: count: "many" is not a number; give a count of 0 or more`,
		`counts.xlsx:Counts!A3: year: holds a date or time; format the cell as a number`,
		`counts.xlsx:Counts!B4: count: holds a formula without a stored value; open`,
		`counts.xlsx:Counts!A5: year: is missing; give`,
		`counts.xlsx:Counts!B6: count: "-1" is not between 0 and`,
		`counts.xlsx:Counts!B7: count: "1,234" is not a number`,
		`counts.xlsx:Counts!B8: count: "true" is not a number`,
		`counts.xlsx:Counts!D9: "6" stands under no column`,
	}
	if !ok || len(faults) != len(want) {
		t.Fatalf("%d faults, want %d:\n%v", len(faults), len(want), err)
	}
	for i, w := range want {
		if !strings.HasPrefix(faults[i].Error(), w) {
			t.Errorf("%s\n  want %s", faults[i].Error(), w)
		}
	}
	for want, at := range map[string]map[string]any{
		"counts.xlsx: there is no header row":                                                   {},
		`counts.xlsx:Sums!B1: "counts" is no column of a series of counts; did you mean count?`: {"Sums!A1": "year", "Sums!B1": "counts"},
		"counts.xlsx: there are no counts":                                                      {"Sums!A1": "year", "Sums!B1": "count"},
		`counts.xlsx:Sums!C9: count: "few" is not a number`:                                     {"Sums!B4": "year", "Sums!C4": "count", "Sums!B6": 2001, "Sums!C6": 3, "Sums!B9": 2002, "Sums!C9": "few"},
		"counts.xlsx:Sums!BM2: stands beyond column 64":                                         {"Sums!A1": "year", "Sums!B1": "count", "Sums!BM2": 1},
	} {
		_, bytes := countBook(t, []string{"Sums"}, at)
		if _, err := workbookCounts("counts.xlsx", bytes()); err == nil || !strings.HasPrefix(err.Error(), want) {
			t.Errorf("%v: %v, want %s", at, err, want)
		}
	}
	if _, err := workbookCounts("counts.xlsx", []byte("year,count\n2001,3\n")); err == nil || !strings.Contains(err.Error(), "counts.xlsx: is not a workbook; give an .xlsx workbook, or the counts as CSV") {
		t.Errorf("text under the name of a workbook: %v", err)
	}
	if _, err := workbookCounts("counts.xlsx", bytes()[:2000]); err == nil || !strings.Contains(err.Error(), "damaged") {
		t.Errorf("half a workbook: %v", err)
	}
}
