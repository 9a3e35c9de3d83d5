package workbook

import (
	"crypto/sha256"
	"fmt"
	"strings"
	"testing"

	"github.com/xuri/excelize/v2"

	"ebbline/pva"
	"ebbline/reports"
	"ebbline/reports/internal/invented"
)

var (
	longText  = strings.Repeat("long \U0001F98A ", 6000) // 48,000 UTF-16 units
	nastyName = "half & <b>\"quoted\"</b> 'one'"
)

func given(path, text string) pva.Entry {
	return pva.Entry{Path: path, Value: pva.Text(text), Origin: pva.FromCase}
}

// hostile is a report full of texts that a workbook can trip over. A case
// refuses some of them; a report must not depend on that.
func hostile() *reports.Report {
	rate := pva.Entry{Path: "births.rate", Value: pva.Num(0.45), Origin: pva.FromCase, Source: "=HYPERLINK(\"http://example.invalid\",\"x\")"}
	r := report(given("case.purpose", "+cmd|' /c calc'!A0"), given("case.prepared", "_x0041_x0042_ and _x000D_ and _x005F_"), given("option.1.name", nastyName), rate,
		given("case.counts", "-adult & <females>"))
	r.Title = "=1+1 & Marsh heron \"&P\" \x02\uFFFE"
	plant := func(row, key, s string) {
		t := r.Table("inputs")
		t.Rows[t.Row(row)].Cells[t.Column(key)] = reports.Cell{Kind: reports.TextCell, Text: s}
	}
	plant("case.title", "value", r.Title)
	plant("births.rate", "note", longText)
	plant("births.year_sd", "note", "-1+1\x00\x01\x1f\x7f tab\there")
	plant("births.year_sd", "source", "@SUM(A1:A9)")
	plant("deaths.year_sd", "source", "bad \xff\xfe bytes")
	return r
}

// TestHostileTextStaysText: nothing from a case becomes a formula, loses
// characters unsaid or breaks the file.
func TestHostileTextStaysText(t *testing.T) {
	r := hostile()
	data := bytesOf(t, r)
	f := open(t, data)
	inputs := placesOf(r)["inputs"]
	cell := func(row, key string) string {
		at := inputs.at(inputs.t.Row(row), inputs.t.Column(key))
		if formula, _ := f.GetCellFormula(inputs.sheet, at); formula != "" {
			t.Errorf("%s is a formula: %s", at, formula)
		}
		if kind, _ := f.GetCellType(inputs.sheet, at); kind != excelize.CellTypeSharedString && kind != excelize.CellTypeInlineString {
			t.Errorf("%s is of type %v, not text", at, kind)
		}
		v, err := f.GetCellValue(inputs.sheet, at)
		if err != nil {
			t.Fatal(err)
		}
		return v
	}
	for row, want := range map[string]string{
		"case.title": "=1+1 & Marsh heron \"&P\" ", "case.purpose": "+cmd|' /c calc'!A0", "case.prepared": "_x0041_x0042_ and _x000D_ and _x005F_",
	} {
		if got := cell(row, "value"); got != want {
			t.Errorf("%s came back as %q, not %q", row, got, want)
		}
	}
	if got, want := cell("births.rate", "source"), "=HYPERLINK(\"http://example.invalid\",\"x\")"; got != want {
		t.Errorf("a source came back as %q", got)
	}
	if got, want := cell("births.year_sd", "note"), "-1+1\x7f tab\there"; got != want {
		t.Errorf("control characters came back as %q, not %q", got, want)
	}
	if got, want := cell("deaths.year_sd", "source"), "bad \uFFFD\uFFFD bytes"; got != want {
		t.Errorf("broken characters came back as %q", got)
	}
	note := cell("births.rate", "note")
	if units(note) > 32767 || !strings.HasSuffix(note, "the whole text is under Run again]") || !strings.HasPrefix(longText, note[:30000]) {
		t.Errorf("a note of %d units came back with %d and ends %q", units(longText), units(note), note[len(note)-60:])
	}
	if strings.Contains(unzip(t, data)["xl/sharedStrings.xml"], "by _x0041_") {
		t.Error("_x0041_ is stored bare: spreadsheets would read it as A")
	}
	if head, _ := f.GetHeaderFooter(reports.PartAnswer); !strings.Contains(head.OddHeader, `=1+1 && Marsh heron "&&P"`) {
		t.Errorf("the page header is %q: an ampersand there is a command", head.OddHeader)
	}
}

// TestOnlyOurFormulas: every formula in the file is one that the report asked
// for or one of a chart's columns.
func TestOnlyOurFormulas(t *testing.T) {
	r := hostile()
	f := open(t, bytesOf(t, r))
	want := map[string]bool{}
	for _, p := range placesOf(r) {
		for i, row := range p.t.Rows {
			for j, c := range row.Cells {
				if c.Formula != "" {
					want[p.sheet+"!"+p.at(i, j)] = true
				}
			}
		}
	}
	want[reports.PartAnswer+"!"+cellName(1, rowBig)] = true
	for _, sheet := range f.GetSheetList() {
		rows, err := f.GetRows(sheet)
		if err != nil {
			t.Fatal(err)
		}
		for i, row := range rows {
			for j := range row {
				at := cellName(j+1, i+1)
				formula, _ := f.GetCellFormula(sheet, at)
				chartColumn := strings.Trim(formula, "ABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789$'! abcdefghijklmnopqrstuvwxyz-") == ""
				if formula != "" && !want[sheet+"!"+at] && !chartColumn {
					t.Errorf("%s!%s: unexpected formula %s", sheet, at, formula)
				}
			}
		}
	}
}

// TestCaseTextComesBackWhole reads the case out of the workbook again, one line
// of it longer than a cell.
func TestCaseTextComesBackWhole(t *testing.T) {
	text := "title = \"x\"\r\n\nnote = \"" + longText + "\"\n  indented # =A1\n\t\ttabs\n"
	a := invented.Assessment(invented.Case(), 200)
	r := reports.Build(a, reports.Meta{CaseText: text})
	f := open(t, bytesOf(t, r))
	p := placesOf(r)["case_text"]
	var lines []string
	for i := range p.t.Rows {
		number, _ := f.GetCellValue(p.sheet, p.at(i, 0), excelize.Options{RawCellValue: true})
		part, _ := f.GetCellValue(p.sheet, p.at(i, 1))
		if units(part) > 32000 {
			t.Errorf("row %d holds %d units", i, units(part))
		}
		if number == "" || len(lines) > 0 && number == itoa(len(lines)) {
			lines[len(lines)-1] += part
			continue
		}
		lines = append(lines, part)
	}
	want := strings.ReplaceAll(strings.TrimSuffix(text, "\n"), "\r\n", "\n")
	if got := strings.Join(lines, "\n"); got != want {
		t.Errorf("the case text came back with %d characters, not %d", len(got), len(want))
	}
	rerun := placesOf(r)["rerun"]
	at := func(row string) string {
		v, _ := f.GetCellValue(rerun.sheet, rerun.at(rerun.t.Row(row), 1), excelize.Options{RawCellValue: true})
		return v
	}
	if at("lines") != itoa(len(lines)) || at("sha256") != fmt.Sprintf("%x", sha256.Sum256([]byte(want))) {
		t.Errorf("%s lines with sum %s are stated", at("lines"), at("sha256"))
	}
}

func itoa(n int) string { return reports.Format{Kind: reports.Dates}.Show(float64(n)) }
