package sheet

import (
	"math"
	"strings"
	"testing"

	"ebbline/pva"
)

// entry is the entry of a path; it fails the test if there is none.
func entry(t *testing.T, c *pva.Case, path string) pva.Entry {
	t.Helper()
	for _, e := range c.Entries() {
		if e.Path == path {
			return e
		}
	}
	t.Fatalf("no entry %s", path)
	return pva.Entry{}
}

// TestValues: a value is read as it is stored, whatever way it is written.
func TestValues(t *testing.T) {
	for _, c := range []struct {
		cell string
		want float64
	}{
		{`<c r="B6"><v>0.45</v></c>`, 0.45},
		{`<c r="B6" t="n"><v>4.5000000000000001E-1</v></c>`, 0.45},
		{`<c r="B6" s="2"><v>0.1</v></c>`, 0.1}, // a format that only looks like a date's
		{`<c r="B6" s="5"><v>0.1</v></c>`, 0.1},
		{`<c r="B6"><v>0</v></c>`, 0}, // zero is not blank
		{`<c r="B6"><f>0.3+0.15</f><v>0.45</v></c>`, 0.45},
		{`<c r="B6"><f t="shared" si="0"/><v>0.44999999999999996</v></c>`, math.Nextafter(0.45, 0)},
		{`<c r="B6" t="str"><f>"0."&amp;45</f><v>0.45</v></c>`, 0.45},
		{`<c r="B6" t="inlineStr"><is><t> 0.45 </t></is></c>`, 0.45},
		{`<c><v>0.45</v></c>`, 0.45}, // without a reference: the cell after A6
	} {
		got, errs := Read("w.xlsx", packed(t, parts(smallRows(c.cell))))
		if len(errs) > 0 {
			t.Errorf("%s: %v", c.cell, errs)
		} else if got.Births.Rate != c.want {
			t.Errorf("%s is read as %v, want %v", c.cell, got.Births.Rate, c.want)
		}
	}
}

// TestTexts: shared texts of several looks, escapes, sources and notes.
func TestTexts(t *testing.T) {
	rows := smallRows(goodRate + `<c r="C6" t="e"><v>#N/A</v></c><c r="D6" t="s"><v>1</v></c><c r="E6" t="s"><v>2</v></c><c r="F6" s="1"><v>40000</v></c>`)
	c, errs := Read("w.xlsx", packed(t, parts(rows)))
	if len(errs) > 0 {
		t.Fatal(errs)
	}
	e := entry(t, c, "births.rate")
	if e.Source != "nest survey" || e.Note != "A note\nof two lines, _x0041_" {
		t.Errorf("source %q, note %q", e.Source, e.Note)
	}
	if c.Births.Breeding != "pulse" || c.Deaths.Fraction.Value != 0.27 {
		t.Errorf("read %q and %v", c.Births.Breeding, c.Deaths.Fraction)
	}
}

// TestFlags: true and false as cells of their own kind, as text, and as the
// numbers that some programs make of them.
func TestFlags(t *testing.T) {
	for _, c := range []struct {
		cell string
		want bool
	}{
		{`<c r="B8" t="b"><v>1</v></c>`, true}, {`<c r="B8" t="b"><v>0</v></c>`, false}, {`<c r="B8"><v>0</v></c>`, false}, {`<c r="B8"><v>1</v></c>`, true},
		{inline("B8", "FALSE"), false}, {`<c r="B8" t="b"><f>FALSE()</f><v>0</v></c>`, false},
	} {
		got, errs := Read("w.xlsx", packed(t, parts(smallRows(goodRate)+`<row r="8">`+inline("A8", "run.baseline")+c.cell+`</row>`)))
		if len(errs) > 0 {
			t.Errorf("%s: %v", c.cell, errs)
		} else if got.Run.Baseline != c.want {
			t.Errorf("%s is read as %v", c.cell, got.Run.Baseline)
		}
	}
	if _, errs := Read("w.xlsx", packed(t, parts(smallRows(goodRate)+`<row r="8">`+inline("A8", "run.baseline")+`<c r="B8"><v>2</v></c></row>`))); len(errs) != 1 {
		t.Errorf("2 for true or false: %v", errs)
	}
}

// TestDefaults: a row that a report lists as a default is left out while it is
// one; once somebody changed it or gave it a source it counts.
func TestDefaults(t *testing.T) {
	row := func(value, source string) *pva.Case {
		t.Helper()
		more := `<row r="8">` + inline("A8", "deaths.year_sd") + `<c r="B8"><v>` + value + `</v></c>` + source + inline("G8", "default") + `</row>` +
			`<row r="9">` + inline("A9", "births.offspring") + inline("B9", "poisson") + inline("G9", "default") + `</row>`
		c, errs := Read("w.xlsx", packed(t, parts(smallRows(goodRate)+more)))
		if len(errs) > 0 {
			t.Fatal(errs)
		}
		return c
	}
	has := func(c *pva.Case, path string) bool {
		for _, e := range c.Entries() {
			if e.Path == path {
				return true
			}
		}
		return false
	}
	if c := row("0", ""); has(c, "deaths.year_sd") || has(c, "births.offspring") {
		t.Error("a default counts as given")
	}
	if c := row("0.05", ""); c.Deaths.YearSD != 0.05 {
		t.Error("a changed default is passed over")
	}
	if c := row("0", inline("D8", "a survey")); !has(c, "deaths.year_sd") {
		t.Error("a default with a source is passed over")
	}
}

// TestCellFaults: what is wrong with a cell is named with the cell, all at once.
func TestCellFaults(t *testing.T) {
	for _, c := range []struct{ cell, want string }{
		{`<c r="B6"><f>1+1</f></c>`, "w.xlsx:Inputs!B6: births.rate: holds a formula without a stored value; open the workbook in a spreadsheet program and save it, or write the value itself"},
		{`<c r="B6"><f>1+1</f><v></v></c>`, "w.xlsx:Inputs!B6: births.rate: holds a formula without a stored value; open the workbook in a spreadsheet program and save it, or write the value itself"},
		{`<c r="B6" t="e"><v>#DIV/0!</v></c>`, "w.xlsx:Inputs!B6: births.rate: holds the error #DIV/0!; mend its formula, or write the value itself"},
		{`<c r="B6" s="1"><v>45000</v></c>`, "w.xlsx:Inputs!B6: births.rate: holds a date or time; format the cell as a number, or as text, and write it again"},
		{`<c r="B6" s="3"><v>45000</v></c>`, "w.xlsx:Inputs!B6: births.rate: holds a date or time; format the cell as a number, or as text, and write it again"},
		{`<c r="B6" s="4"><v>0.5</v></c>`, "w.xlsx:Inputs!B6: births.rate: holds a date or time; format the cell as a number, or as text, and write it again"},
		{`<c r="B6" t="d"><v>2024-03-01</v></c>`, "w.xlsx:Inputs!B6: births.rate: holds a date or time; format the cell as a number, or as text, and write it again"},
		{goodRate + `<c r="D6" s="1"><v>45000</v></c>`, "w.xlsx:Inputs!D6: births.rate: holds a date or time; format the cell as a number, or as text, and write it again"},
		{``, "w.xlsx:Inputs!B6: births.rate: has no value; fill the cell or remove the row"},
		{`<c r="B6" s="2"/>`, "w.xlsx:Inputs!B6: births.rate: has no value; fill the cell or remove the row"},
		{`<c r="B6"><v>18014398509481985</v></c>`, "w.xlsx:Inputs!B6: births.rate: holds 18014398509481985, which is longer than a spreadsheet's numbers can be; format the cell as text and write all its digits"},
		{`<c r="B6" t="b"><v>1</v></c>`, "w.xlsx:Inputs!B6: births.rate: true is not a number"},
		{`<c r="B6"><v>0x1p-2</v></c>`, `w.xlsx:Inputs!B6: holds "0x1p-2" where a number is stored; ` + takeAnother},
		{`<c r="B6" t="s"><v>3</v></c>`, `w.xlsx:Inputs!B6: points to a text that is not there; ` + takeAnother},
	} {
		_, errs := Read("w.xlsx", packed(t, parts(smallRows(c.cell))))
		if len(errs) != 1 || !strings.HasPrefix(errs[0].Error(), c.want) {
			t.Errorf("%s:\n  %v\nwant\n  %s", c.cell, errs, c.want)
		}
	}

	// Faults of cells and of the case come together, in the order of the rows.
	rows := strings.Replace(smallRows(`<c r="B6"><f>1</f></c>`), "<v>50</v>", "<v>-5</v>", 1) + `<row r="8">` + inline("A8", "deaths.rat") + `<c r="B8"><v>1</v></c></row>`
	_, errs := Read("w.xlsx", packed(t, parts(rows)))
	var cells []string
	for _, e := range errs {
		cells = append(cells, e.Cell)
	}
	if strings.Join(cells, " ") != "Inputs!B3 Inputs!B6 Inputs!A8" {
		t.Errorf("faults in %v: %v", cells, errs)
	}
}

// TestSheetFaults: merged cells, missing sheets and headings.
func TestSheetFaults(t *testing.T) {
	sheet := "xl/worksheets/sheet1.xml"
	merged := func(ref string) []part {
		return changed(parts(""), sheet, strings.Replace(sheetXML(smallRows(goodRate)), "</sheetData>", `</sheetData><mergeCells count="1"><mergeCell ref="`+ref+`"/></mergeCells>`, 1))
	}
	for _, c := range []struct {
		parts []part
		want  string
	}{
		{merged("A3:A4"), "w.xlsx:Inputs!A3:A4: are merged cells; unmerge them: a row has one key and one value"},
		{merged("B6:C6"), "w.xlsx:Inputs!B6:C6: are merged cells"},
		{changed(parts(""), "xl/workbook.xml", strings.Replace(bookXML, "Inputs", "Figures", 1)), `w.xlsx: has no sheet "Inputs"; ` + "`ebbline new FILE.xlsx` writes one to begin from"},
		{parts(strings.Replace(smallRows(goodRate), "Value", "Amount", 1)), `w.xlsx:Inputs!B1: is not the heading "Value"; row 1 holds the headings Key, Value, Unit, Source, Note`},
		{parts(""), `w.xlsx:Inputs!A1: is not the heading "Key"`},
		{parts(strings.Replace(smallRows(goodRate), `<c r="G1"`, `<c r="F1" t="inlineStr"><is><t>status </t></is></c><c r="G1"`, 1)), `w.xlsx:Inputs!G1: is a second heading "Status"; keep one of them`},
	} {
		_, errs := Read("w.xlsx", packed(t, c.parts))
		if len(errs) != 1 || !strings.HasPrefix(errs[0].Error(), c.want) {
			t.Errorf("%v\nwant\n  %s", errs, c.want)
		}
	}
	for _, ref := range []string{"H2:I9", "A20:B30"} { // beside and below the inputs
		if _, errs := Read("w.xlsx", packed(t, merged(ref))); len(errs) > 0 {
			t.Errorf("merged %s: %v", ref, errs)
		}
	}
	ps := changed(parts(""), sheet, sheetXML(smallRows(goodRate)))
	if _, errs := Read("w.xlsx", packed(t, changed(ps, "xl/workbook.xml", strings.Replace(bookXML, "Inputs", "inputs ", 1)))); len(errs) > 0 {
		t.Error(errs)
	}
}

// TestDateFormats: which number formats show a date or a time, by the format
// codes of ECMA-376 Part 1, 18.8.30 and 18.8.31.
func TestDateFormats(t *testing.T) {
	for code, want := range map[string]bool{
		"General": false, "0.00": false, "#,##0": false, "0.00E+00": false, "@": false, `0" days"`: false, `\d0`: false, "[Red]0": false,
		"[$-409]0": false, `_(* #,##0_);_(* \(#,##0\)`: false, `"true";;"false"`: false, "general": false, `[=0]0\ %;[<0.5]0.0\ %;0\ %`: false,
		"d-mmm-yy": true, "yyyy": true, "[h]:mm:ss": true, "[ss]": true, "mm:ss.0": true, `[$-409]d\.m`: true, `0;"x";yyyy`: true,
	} {
		if got := dateFormat(code); got != want {
			t.Errorf("%s: a date %v, want %v", code, got, want)
		}
	}
}
