package workbook

import (
	"archive/zip"
	"bytes"
	"encoding/xml"
	"io"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/xuri/excelize/v2"

	"ebbline/pva"
	"ebbline/reports"
	"ebbline/reports/internal/invented"
)

const caseText = "[case]\ntitle = \"Marsh heron (invented)\"\n\n[question]\nthreshold = 20 # \u03b1 & <b>\n=SUM(A1)\n"

// report is the invented report with an exact answer, baseline, options and drivers.
func report(more ...pva.Entry) *reports.Report {
	a := invented.Assessment(invented.Case(more...), 1000)
	invented.Exact(a)
	return reports.Build(a, reports.Meta{Version: "0.1.0", Command: "ebbline assess heron.toml", CaseText: caseText, CaseFile: "heron.toml"})
}

func plainReport() *reports.Report {
	c := invented.Plain()
	return reports.Build(invented.Assessment(c, 400), reports.Meta{Version: "0.1.0", CaseText: caseText})
}

func bytesOf(t *testing.T, r *reports.Report) []byte {
	t.Helper()
	data, err := Bytes(r)
	if err != nil {
		t.Fatal(err)
	}
	return data
}

func open(t *testing.T, data []byte) *excelize.File {
	t.Helper()
	f, err := excelize.OpenReader(bytes.NewReader(data))
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { f.Close() })
	return f
}

// placesOf lays a report out again, to know where each table stands.
func placesOf(r *reports.Report) map[string]place {
	b := &book{r: r, places: map[string]place{}}
	for _, p := range r.Parts {
		if p.Name == reports.PartAnswer {
			b.placeAnswer(p)
		} else {
			b.placePart(p)
		}
	}
	return b.places
}

// TestCellsHoldTheReport compares every cell of every table with the report, as
// a reader sees it that does not recalculate.
func TestCellsHoldTheReport(t *testing.T) {
	for name, r := range map[string]*reports.Report{"full": report(), "plain": plainReport()} {
		f := open(t, bytesOf(t, r))
		if got := strings.Join(f.GetSheetList(), ","); got != strings.Join(partNames(r), ",") {
			t.Errorf("%s: sheets are %s", name, got)
		}
		cells, formulas := 0, 0
		for id, p := range placesOf(r) {
			for i, row := range p.t.Rows {
				for j, c := range row.Cells {
					at := p.at(i, j)
					got, err := f.GetCellValue(p.sheet, at, excelize.Options{RawCellValue: true})
					if err != nil {
						t.Fatal(err)
					}
					want := c.Text
					switch c.Kind {
					case reports.NumberCell:
						want = strconv.FormatFloat(c.Num, 'g', -1, 64)
						kind, _ := f.GetCellType(p.sheet, at)
						if kind != excelize.CellTypeUnset && kind != excelize.CellTypeNumber {
							t.Errorf("%s: %s!%s is of type %v, not a number", name, p.sheet, at, kind)
						}
					case reports.FlagCell:
						want = map[bool]string{true: "1", false: "0"}[c.Flag]
					}
					if got != want {
						t.Errorf("%s: table %s, row %s, column %s: cell %s holds %q, the report %q", name, id, row.ID, p.t.Columns[j].Key, at, got, want)
					}
					formula, _ := f.GetCellFormula(p.sheet, at)
					if (formula != "") != (c.Formula != "") {
						t.Errorf("%s: %s!%s has formula %q, the report %q", name, p.sheet, at, formula, c.Formula)
					}
					cells++
					if formula != "" {
						formulas++
					}
				}
			}
		}
		if cells < 500 || formulas < 100 {
			t.Errorf("%s: only %d cells and %d formulas compared", name, cells, formulas)
		}
	}
}

func partNames(r *reports.Report) []string {
	var names []string
	for _, p := range r.Parts {
		names = append(names, p.Name)
	}
	return names
}

// TestKeyFiguresAreLive names the figures of which a reviewer asks where they
// come from: each must be a formula, not a bare number.
func TestKeyFiguresAreLive(t *testing.T) {
	r := report()
	for _, want := range [][3]string{
		{"figures", "risk", "estimate"}, {"figures", "risk", "low"}, {"figures", "risk", "high"}, {"figures", "risk", "count"},
		{"figures", "added", "estimate"}, {"figures", "added", "low"}, {"figures", "limit", "note"},
		{"years", "50", "fallen"}, {"years", "50", "low"}, {"years", "50", "base_high"}, {"years", "2", "newly"},
		{"options", "option_1", "difference_low"}, {"options", "option_2", "difference_high"}, {"options", "baseline", "difference"}, {"options", "option_1", "verdict"},
		{"drivers", "driver_2", "difference"}, {"pairs", "added", "phi"}, {"pairs", "added", "high"}, {"settings", "run", "z"},
		{"batches", "3", "running"}, {"smallest", "20", "estimate"}, {"numbers", "median_last", "value"},
	} {
		if r.Table(want[0]).Cell(want[1], want[2]).Formula == "" {
			t.Errorf("table %s, row %s, column %s has no formula", want[0], want[1], want[2])
		}
	}
}

// TestSameReportSameBytes saves the same report again and again.
func TestSameReportSameBytes(t *testing.T) {
	first := bytesOf(t, report())
	for i := range 20 {
		if again := bytesOf(t, report()); !bytes.Equal(first, again) {
			t.Fatalf("save %d differs: %s", i+2, firstDifference(t, first, again))
		}
	}
}

// TestPartsAreInOrder: the parts of the zip and its list of content types are
// sorted, and every part has a type; the library writes the list in the order of
// a map, which differs only now and then.
func TestPartsAreInOrder(t *testing.T) {
	data := bytesOf(t, report())
	var types struct {
		Default []struct {
			Extension string `xml:"Extension,attr"`
		} `xml:"Default"`
		Override []struct {
			PartName string `xml:"PartName,attr"`
		} `xml:"Override"`
	}
	if err := xml.Unmarshal([]byte(unzip(t, data)["[Content_Types].xml"]), &types); err != nil {
		t.Fatal(err)
	}
	var listed []string
	for _, o := range types.Override {
		listed = append(listed, o.PartName)
	}
	if !slices.IsSorted(listed) || len(listed) < 20 || len(types.Default) < 2 {
		t.Errorf("the content types are %v", listed)
	}
	z, err := zip.NewReader(bytes.NewReader(data), int64(len(data)))
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, e := range z.File[1:] {
		names = append(names, e.Name)
		if !strings.HasSuffix(e.Name, ".rels") && !slices.Contains(listed, "/"+e.Name) {
			t.Errorf("part %s has no content type", e.Name)
		}
	}
	if z.File[0].Name != "[Content_Types].xml" || !slices.IsSorted(names) {
		t.Errorf("the parts are in the order %s, %v", z.File[0].Name, names)
	}
}

func firstDifference(t *testing.T, a, b []byte) string {
	x, y := unzip(t, a), unzip(t, b)
	for name := range x {
		if x[name] != y[name] {
			return name
		}
	}
	return "the zip itself"
}

func unzip(t *testing.T, data []byte) map[string]string {
	t.Helper()
	z, err := zip.NewReader(bytes.NewReader(data), int64(len(data)))
	if err != nil {
		t.Fatal(err)
	}
	out := map[string]string{}
	for _, e := range z.File {
		r, err := e.Open()
		if err != nil {
			t.Fatal(err)
		}
		text, err := io.ReadAll(r)
		if err != nil {
			t.Fatal(err)
		}
		out[e.Name] = string(text)
	}
	return out
}

// TestNoClock looks for any time but the fixed ones.
func TestNoClock(t *testing.T) {
	data := bytesOf(t, report())
	if core := unzip(t, data)["docProps/core.xml"]; strings.Count(core, bornAt) != 2 || !strings.Contains(core, "<dc:creator>ebbline</dc:creator>") {
		t.Errorf("properties are %s", core)
	}
	z, err := zip.NewReader(bytes.NewReader(data), int64(len(data)))
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range z.File {
		if !e.Modified.Equal(packedAt) {
			t.Errorf("part %s is dated %v", e.Name, e.Modified)
		}
	}
}

// TestEveryPartIsXML parses every part to its end.
func TestEveryPartIsXML(t *testing.T) {
	for name, text := range unzip(t, bytesOf(t, hostile())) {
		d := xml.NewDecoder(strings.NewReader(text))
		for {
			_, err := d.Token()
			if err == io.EOF {
				break
			}
			if err != nil {
				t.Errorf("%s: %v", name, err)
				break
			}
		}
	}
}

// TestPagesAreSetUp checks what makes a sheet printable and readable.
func TestPagesAreSetUp(t *testing.T) {
	r := report()
	f := open(t, bytesOf(t, r))
	for _, p := range r.Parts {
		layout, err := f.GetPageLayout(p.Name)
		if err != nil {
			t.Fatal(err)
		}
		props, _ := f.GetSheetProps(p.Name)
		if *layout.Orientation != "landscape" || *layout.FitToWidth != 1 || *layout.FitToHeight != 0 || props.FitToPage == nil || !*props.FitToPage {
			t.Errorf("%s is not landscape and one page wide", p.Name)
		}
		head, _ := f.GetHeaderFooter(p.Name)
		if head == nil || !strings.Contains(head.OddHeader, "Marsh heron") || !strings.Contains(head.OddFooter, "&P") {
			t.Errorf("%s has no title above or page number below: %+v", p.Name, head)
		}
		margins, _ := f.GetPageMargins(p.Name)
		for _, m := range []*float64{margins.Left, margins.Right, margins.Top, margins.Bottom, margins.Header, margins.Footer} {
			if m == nil || *m < 0.3 {
				t.Errorf("%s has a margin that is not set", p.Name)
			}
		}
		for _, table := range p.Tables {
			if !table.Main {
				continue
			}
			panes, err := f.GetPanes(p.Name)
			if at := placesOf(r)[table.ID]; err != nil || !panes.Freeze || panes.YSplit != at.head {
				t.Errorf("%s: the heading of row %d is not kept in view: %+v", p.Name, at.head, panes)
			}
		}
	}
	// The form in which a case is read back starts in the first row.
	var head []string
	for _, cell := range []string{"A1", "B1", "C1", "D1", "E1", "F1"} {
		v, _ := f.GetCellValue(reports.PartInputs, cell)
		head = append(head, v)
	}
	if strings.Join(head, "|") != "Key|Value|Unit|Source|Note|Status" {
		t.Errorf("Inputs is headed %v", head)
	}
}
