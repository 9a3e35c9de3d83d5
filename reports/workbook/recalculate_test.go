package workbook

import (
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"testing"

	"github.com/xuri/excelize/v2"

	"ebbline/reports"
)

// recalcAlways makes the office program recalculate every workbook it loads.
const recalcAlways = `<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema" xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance">
<item oor:path="/org.openoffice.Office.Calc/Formula/Load"><prop oor:name="OOXMLRecalcMode" oor:op="fuse"><value>0</value></prop></item>
</oor:items>`

var storedValue = regexp.MustCompile(`(</f><v>)[^<]*(</v>)`)

// TestRecalculatedValuesAreTheStoredOnes gives the workbook, with every stored
// value of a formula spoilt, to LibreOffice and compares what its formulas yield
// with the report: numbers to 1e-12, words exactly.
func TestRecalculatedValuesAreTheStoredOnes(t *testing.T) {
	if testing.Short() {
		t.Skip("skipped in short mode: starts an office program")
	}
	office, err := exec.LookPath("soffice")
	if err != nil {
		t.Skip("skipped: LibreOffice (soffice) is not installed, so no formula was recalculated")
	}
	r := report()
	folder := t.TempDir()
	profile := filepath.Join(folder, "profile")
	if err := os.MkdirAll(filepath.Join(profile, "user"), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(filepath.Join(profile, "user", "registrymodifications.xcu"), []byte(recalcAlways), 0o644); err != nil {
		t.Fatal(err)
	}
	spoilt := filepath.Join(folder, "in.xlsx")
	if err := os.WriteFile(spoilt, spoil(t, bytesOf(t, r)), 0o644); err != nil {
		t.Fatal(err)
	}
	out := filepath.Join(folder, "out")
	command := exec.Command(office, "--headless", "-env:UserInstallation=file://"+profile, "--convert-to", "xlsx", "--outdir", out, spoilt)
	if text, err := command.CombinedOutput(); err != nil {
		t.Fatalf("soffice: %v\n%s", err, text)
	}
	f, err := excelize.OpenFile(filepath.Join(out, "in.xlsx"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	compared := 0
	for _, p := range placesOf(r) {
		for i, row := range p.t.Rows {
			for j, c := range row.Cells {
				if c.Formula == "" {
					continue
				}
				got, err := f.GetCellValue(p.sheet, p.at(i, j), excelize.Options{RawCellValue: true})
				if err != nil {
					t.Fatal(err)
				}
				compared++
				if c.Kind == reports.TextCell {
					if got != c.Text {
						t.Errorf("%s!%s: recalculated to %q, stored is %q", p.sheet, p.at(i, j), got, c.Text)
					}
					continue
				}
				v, err := strconv.ParseFloat(got, 64)
				if err != nil || math.Abs(v-c.Num) > 1e-12*math.Max(1, math.Abs(c.Num)) {
					t.Errorf("%s!%s (%s): recalculated to %q, stored is %v", p.sheet, p.at(i, j), c.Formula, got, c.Num)
				}
			}
		}
	}
	if compared < 400 {
		t.Errorf("only %d formulas were recalculated", compared)
	}
}

// spoil sets the stored value of every formula to a number that none has.
func spoil(t *testing.T, data []byte) []byte {
	t.Helper()
	texts := unzip(t, data)
	parts := map[string][]byte{}
	var names []string
	for name, text := range texts {
		if filepath.Dir(name) == "xl/worksheets" {
			text = storedValue.ReplaceAllString(text, "${1}-987654${2}")
		}
		parts[name] = []byte(text)
		names = append(names, name)
	}
	out, err := packed(parts, names)
	if err != nil {
		t.Fatal(err)
	}
	return out
}
