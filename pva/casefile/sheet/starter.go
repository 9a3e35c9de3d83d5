package sheet

import (
	"fmt"
	"strconv"
	"strings"

	"github.com/xuri/excelize/v2"

	"ebbline/pva"
	"ebbline/pva/casefile"
)

// The other sheets of the starter workbook.
const (
	explainSheet = "How to fill it in"
	keysSheet    = "All keys"
)

// bornAt is the time stamped on the starter, so that it is always the same file.
const bornAt = "2000-01-01T00:00:00Z"

// Starter is a workbook to begin from: the keys of the starter case on a sheet
// Inputs, with lists to choose words from and blank cells for the sources, a
// sheet that explains it, and one of all keys. Read gives the starter's values
// back. The population in it is invented.
func Starter() ([]byte, error) {
	c, faults := casefile.Read("starter.toml", casefile.Starter())
	if len(faults) > 0 {
		return nil, faults
	}
	s := &starter{f: excelize.NewFile(), styles: map[string]int{}}
	defer s.f.Close()
	s.try(s.f.SetDefaultFont(starterFont))
	s.try(s.f.SetSheetName("Sheet1", InputsSheet))
	for _, name := range []string{explainSheet, keysSheet} {
		_, err := s.f.NewSheet(name)
		s.try(err)
	}
	s.inputs(starterRows(c))
	s.explain()
	s.keys()
	s.try(s.f.SetDocProps(&excelize.DocProperties{Title: "A case to begin from", Creator: "ebbline", LastModifiedBy: "ebbline",
		Created: bornAt, Modified: bornAt, Language: "en", Revision: "1"}))
	s.try(s.f.SetAppProps(&excelize.AppProperties{Application: "ebbline"}))
	s.f.SetActiveSheet(0)
	if s.err != nil {
		return nil, fmt.Errorf("the starter workbook: %w", s.err)
	}
	b, err := s.f.WriteToBuffer()
	if err != nil {
		return nil, fmt.Errorf("the starter workbook: %w", err)
	}
	return b.Bytes(), nil
}

// starterRows is the starter case by name; that a figure is invented stands in
// its note, because its source is left for the reader to fill in.
func starterRows(c *pva.Case) []casefile.Row {
	var rows []casefile.Row
	for _, r := range casefile.ToRows(c) {
		if strings.HasSuffix(r.Key, ".1.name") {
			continue // the name stands in the other keys of the row
		}
		if r.Source != "" {
			r.Note = "invented: put your own figure here"
		}
		r.Row = len(rows) + 2
		rows = append(rows, r)
	}
	return rows
}

// starter is the workbook being written.
type starter struct {
	f      *excelize.File
	styles map[string]int
	err    error
}

func (s *starter) try(err error) {
	if s.err == nil {
		s.err = err
	}
}

const (
	starterFont = "Arial"
	headGround  = "DCE9F3"
	fillGround  = "FFF8DC"
	greyText    = "595959"
	hairLine    = "D9D9D9"
)

// style makes a cell style from words: head, fill, grey, title, mono, first.
func (s *starter) style(words string) int {
	if id, ok := s.styles[words]; ok {
		return id
	}
	has := func(w string) bool { return strings.Contains(words, w) }
	st := &excelize.Style{Font: &excelize.Font{Family: starterFont, Size: 10, Color: "000000"},
		Alignment: &excelize.Alignment{Vertical: "top", Horizontal: "left", WrapText: true}}
	if has("head") {
		st.Font.Bold = true
		st.Fill = excelize.Fill{Type: "pattern", Pattern: 1, Color: []string{headGround}}
		st.Alignment.Vertical = "center"
	}
	if has("fill") {
		st.Fill = excelize.Fill{Type: "pattern", Pattern: 1, Color: []string{fillGround}}
		st.Border = append(st.Border, excelize.Border{Type: "left", Color: hairLine, Style: 1}, excelize.Border{Type: "right", Color: hairLine, Style: 1})
	}
	if has("line") {
		st.Border = append(st.Border, excelize.Border{Type: "bottom", Color: hairLine, Style: 1})
	}
	if has("first") {
		st.Border = append(st.Border, excelize.Border{Type: "top", Color: "7F7F7F", Style: 1})
	}
	if has("grey") {
		st.Font.Color = greyText
	}
	if has("title") {
		st.Font.Bold, st.Font.Size = true, 15
	}
	if has("bold") {
		st.Font.Bold = true
	}
	if has("mono") {
		st.Font.Family = "Courier New"
	}
	id, err := s.f.NewStyle(st)
	s.try(err)
	s.styles[words] = id
	return id
}

// say writes a text as text.
func (s *starter) say(sheet, cell, text, style string) {
	s.try(s.f.SetCellStr(sheet, cell, text))
	s.try(s.f.SetCellStyle(sheet, cell, cell, s.style(style)))
}

func (s *starter) widths(sheet string, widths ...float64) {
	for i, w := range widths {
		s.try(s.f.SetColWidth(sheet, columnName(i+1), columnName(i+1), w))
	}
}

// head writes a heading row that stays in view.
func (s *starter) head(sheet string, row int, heads ...string) {
	for i, h := range heads {
		s.say(sheet, columnName(i+1)+strconv.Itoa(row), h, "head")
	}
	s.try(s.f.SetRowHeight(sheet, row, 20))
	s.try(s.f.SetPanes(sheet, &excelize.Panes{Freeze: true, XSplit: 1, YSplit: row, TopLeftCell: "B" + strconv.Itoa(row+1), ActivePane: "bottomRight"}))
}

// tall sets a row's height to what its texts need in columns of these widths.
func (s *starter) tall(sheet string, row int, texts []string, widths []float64) {
	n := 1
	for i, t := range texts {
		at, lines := 0.0, 1
		for _, word := range strings.Fields(t) {
			w := 0.82 * float64(len([]rune(word)))
			if at > 0 && at+1+w > widths[i]-1 {
				lines++
				at = w
			} else {
				at += 1 + w
			}
		}
		n = max(n, lines)
	}
	s.try(s.f.SetRowHeight(sheet, row, 13.2*float64(n)+3))
}

// stated are the tables whose numbers put the question or say how it is run:
// they rest on nobody's data.
var stated = map[string]bool{"case": true, "question": true, "run": true, "option": true}

// inputs writes the sheet that is read.
func (s *starter) inputs(rows []casefile.Row) {
	sheet := InputsSheet
	widths := []float64{32, 24, 21, 34, 34, 56}
	s.widths(sheet, widths...)
	s.head(sheet, 1, "Key", "Value", "Unit", "Source", "Note", "What to give")
	top := ""
	for _, r := range rows {
		at := strconv.Itoa(r.Row)
		mark := "line"
		if group, _, _ := strings.Cut(r.Key, "."); group != top {
			top, mark = group, "line first"
		}
		k := caseKey(r.Key)
		asks, unit := "", r.Unit
		if k != nil {
			asks, unit = k.Asks(), k.Unit
		}
		s.say(sheet, "A"+at, r.Key, mark+" bold")
		s.value(sheet, "B"+at, r.Value, mark+" fill")
		s.say(sheet, "C"+at, unit, mark+" grey")
		if k != nil && k.IsNumber() && !stated[top] {
			s.try(s.f.SetCellStyle(sheet, "D"+at, "D"+at, s.style(mark+" fill")))
			s.list(sheet, "D"+at, []string{"assumed"}, false)
		} else {
			s.try(s.f.SetCellStyle(sheet, "D"+at, "D"+at, s.style(mark)))
		}
		s.say(sheet, "E"+at, r.Note, mark)
		s.say(sheet, "F"+at, asks, mark+" grey")
		if k != nil {
			s.list(sheet, "B"+at, wordsOf(k), true)
		}
		s.tall(sheet, r.Row, []string{r.Key, r.Value.String(), unit, "", r.Note, asks}, widths)
	}
	s.page(sheet, "$A$1:$F$"+strconv.Itoa(len(rows)+1), true)
}

func (s *starter) value(sheet, cell string, v pva.Value, style string) {
	switch v.Kind {
	case pva.NumberKind:
		s.try(s.f.SetCellDefault(sheet, cell, strconv.FormatFloat(v.Num, 'f', -1, 64)))
	case pva.FlagKind:
		s.try(s.f.SetCellBool(sheet, cell, v.Flag))
	default:
		s.try(s.f.SetCellStr(sheet, cell, v.Text))
	}
	s.try(s.f.SetCellStyle(sheet, cell, cell, s.style(style)))
}

// wordsOf is the words to choose from under a key.
func wordsOf(k *pva.Key) []string {
	if _, flag := k.Default.(bool); flag {
		return []string{"true", "false"}
	}
	return k.Choices
}

// list gives a cell a list to choose from; strict refuses everything else.
func (s *starter) list(sheet, cell string, words []string, strict bool) {
	if len(words) == 0 {
		return
	}
	v := excelize.NewDataValidation(true)
	v.SetSqref(cell)
	s.try(v.SetDropList(words))
	if strict {
		v.SetError(excelize.DataValidationErrorStyleStop, "Not one of the words", "Choose "+strings.Join(words, ", ")+".")
	}
	s.try(s.f.AddDataValidation(sheet, v))
}

// page sets up the printing: landscape A4, one page wide, headings repeated.
func (s *starter) page(sheet, area string, repeat bool) {
	landscape, paper, wide, tall, fit := "landscape", 9, 1, 0, true
	s.try(s.f.SetPageLayout(sheet, &excelize.PageLayoutOptions{Orientation: &landscape, Size: &paper, FitToWidth: &wide, FitToHeight: &tall}))
	s.try(s.f.SetSheetProps(sheet, &excelize.SheetPropsOptions{FitToPage: &fit}))
	m := func(inches float64) *float64 { return &inches }
	s.try(s.f.SetPageMargins(sheet, &excelize.PageLayoutMarginsOptions{Left: m(0.5), Right: m(0.5), Top: m(0.7), Bottom: m(0.7), Header: m(0.3), Footer: m(0.3)}))
	s.try(s.f.SetHeaderFooter(sheet, &excelize.HeaderFooterOptions{OddHeader: "&R" + sheet, OddFooter: "&RPage &P of &N"}))
	s.try(s.f.SetDefinedName(&excelize.DefinedName{Name: "_xlnm.Print_Area", RefersTo: "'" + sheet + "'!" + area, Scope: sheet}))
	if repeat {
		s.try(s.f.SetDefinedName(&excelize.DefinedName{Name: "_xlnm.Print_Titles", RefersTo: "'" + sheet + "'!$1:$1", Scope: sheet}))
	}
}

func viewWithoutGrid(no *bool) *excelize.ViewOptions { return &excelize.ViewOptions{ShowGridLines: no} }
