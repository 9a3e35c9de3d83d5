// Package workbook renders a report as a spreadsheet workbook: a sheet a part,
// the answer first, live formulas with their values stored where a figure
// follows from others, native charts, and all that is needed to run again.
//
// It decides nothing about content, reads no files and no clock: one report
// always gives the same bytes. Text from a case is always written as text, never
// as a formula. It is called by the commands.
package workbook

import (
	"fmt"

	"github.com/xuri/excelize/v2"

	"ebbline/reports"
)

// book is a workbook being written.
type book struct {
	r      *reports.Report
	f      *excelize.File
	places map[string]place             // table id -> where it stands
	ids    map[styleKey]int             // styles made so far
	wants  map[string]map[string]string // sheet -> cell -> formula, put in by seal
	charts []string                     // chart parts in the order they were added
	err    error                        // the first failure; later steps do nothing
}

// Bytes is the workbook of a report, ready to be saved. It fails only where the
// workbook cannot hold the report: more rows than a sheet has, or a formula
// longer than a cell may carry.
func Bytes(r *reports.Report) ([]byte, error) {
	b := &book{r: r, f: excelize.NewFile(), places: map[string]place{}, ids: map[styleKey]int{}, wants: map[string]map[string]string{}}
	defer b.f.Close()
	b.try(b.f.SetDefaultFont(fontName))
	for i, p := range r.Parts {
		if i == 0 {
			b.try(b.f.SetSheetName("Sheet1", p.Name))
		} else {
			_, err := b.f.NewSheet(p.Name)
			b.try(err)
		}
	}
	// Tables get their places before anything is written, because formulas and
	// charts point from sheet to sheet.
	layouts := make([]layout, len(r.Parts))
	for i, p := range r.Parts {
		if p.Name == reports.PartAnswer {
			layouts[i] = b.placeAnswer(p)
		} else {
			layouts[i] = b.placePart(p)
		}
	}
	for i, p := range r.Parts {
		if p.Name == reports.PartAnswer {
			b.writeAnswer(p, layouts[i])
		} else {
			b.writePart(p, layouts[i])
		}
	}
	b.properties()
	if b.err != nil {
		return nil, fmt.Errorf("the report workbook: %w", b.err)
	}
	buffer, err := b.f.WriteToBuffer()
	if err != nil {
		return nil, fmt.Errorf("the report workbook: %w", err)
	}
	return b.seal(buffer.Bytes())
}

// try keeps the first error.
func (b *book) try(err error) {
	if b.err == nil {
		b.err = err
	}
}

// bornAt is the time stamped on every report: reports carry no clock, so that
// the same run gives the same bytes.
const bornAt = "2000-01-01T00:00:00Z"

func (b *book) properties() {
	b.try(b.f.SetDocProps(&excelize.DocProperties{
		Title: clean(b.r.Title), Subject: cut(clean(b.r.Question), 255), Creator: reports.Program, LastModifiedBy: reports.Program,
		Description: "Risk report of a population viability assessment", Created: bornAt, Modified: bornAt, Language: "en", Revision: "1",
	}))
	b.try(b.f.SetAppProps(&excelize.AppProperties{Application: reports.Program}))
	for _, p := range [][2]string{
		{reports.PropertyProgram, reports.Program}, {reports.PropertyVersion, b.r.Version},
		{reports.PropertyTitle, reports.TitleMark(b.r.Title)}, {reports.PropertyCase, b.r.Digest},
	} {
		b.try(b.f.SetCustomProps(excelize.CustomProperty{Name: p[0], Value: clean(p[1])}))
	}
	yes := true
	b.try(b.f.SetCalcProps(&excelize.CalcPropsOptions{FullCalcOnLoad: &yes}))
	b.f.SetActiveSheet(0)
}

// page sets up the printing of a sheet: landscape A4, one page wide, the title
// and the sheet's name above, page numbers below. area is what is printed;
// titleRow, if above 0, is repeated on every page.
func (b *book) page(sheet, area string, titleRow int) {
	landscape, paper, wide, tall, fit := "landscape", 9, 1, 0, true
	b.try(b.f.SetPageLayout(sheet, &excelize.PageLayoutOptions{Orientation: &landscape, Size: &paper, FitToWidth: &wide, FitToHeight: &tall}))
	b.try(b.f.SetSheetProps(sheet, &excelize.SheetPropsOptions{FitToPage: &fit}))
	m := func(inches float64) *float64 { return &inches }
	b.try(b.f.SetPageMargins(sheet, &excelize.PageLayoutMarginsOptions{Left: m(0.5), Right: m(0.5), Top: m(0.8), Bottom: m(0.7), Header: m(0.35), Footer: m(0.35)}))
	title := headerText(cut(clean(b.r.Title), 90))
	b.try(b.f.SetHeaderFooter(sheet, &excelize.HeaderFooterOptions{
		OddHeader: "&L" + title + "&R" + headerText(sheet),
		OddFooter: "&L" + headerText(cut(reports.Program+" "+b.r.Version, 60)) + "&RPage &P of &N",
	}))
	b.try(b.f.SetDefinedName(&excelize.DefinedName{Name: "_xlnm.Print_Area", RefersTo: quoted(sheet) + "!" + area, Scope: sheet}))
	if titleRow > 0 {
		b.try(b.f.SetDefinedName(&excelize.DefinedName{Name: "_xlnm.Print_Titles", RefersTo: fmt.Sprintf("%s!$%d:$%d", quoted(sheet), titleRow, titleRow), Scope: sheet}))
	}
}
