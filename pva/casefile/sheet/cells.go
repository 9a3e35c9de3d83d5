package sheet

import (
	"encoding/xml"
	"strconv"
	"strings"
)

// Kind is the kind of a cell's value.
type Kind uint8

// The kinds of value: a number, a text, true or false, an error such as
// #DIV/0!, and nothing (a formula whose value was not stored).
const (
	Number Kind = iota
	Text
	Flag
	Failure
	Nothing
)

// Cell is one cell that holds something.
type Cell struct {
	Row, Column int // from 1
	Kind        Kind
	Text        string // the text; of a number its digits as stored; of a flag "true" or "false"
	Num         float64
	Date        bool // a number that is shown as a date or time
	IsFormula   bool
	Formula     string // "" where the cell shares another cell's formula
	Style       int
}

// Ref is the cell as people write it: "B7".
func (c Cell) Ref() string { return columnName(c.Column) + strconv.Itoa(c.Row) }

// Bounds on a sheet; rows and columns are those of the file format.
const (
	lastRow    = 1 << 20
	lastColumn = 1 << 14
	mostCells  = 1_000_000
	mostMerges = 20_000
)

// area is a rectangle of cells, from 1, both ends in it.
type area struct {
	ref                     string
	left, top, right, under int
}

// Cells reads the cells of a sheet that hold something, row by row. A sheet
// that is damaged or too large is an error of type casefile.Error.
func (w *Workbook) Cells(sheet string) ([]Cell, error) {
	cells, _, err := w.cells(sheet, largestPart, lastColumn)
	return cells, w.named(err)
}

// cells reads the cells of the first columns of a sheet, and its merged areas.
func (w *Workbook) cells(sheet string, most, columns int) ([]Cell, []area, error) {
	part, ok := w.parts[sheet]
	if !ok {
		return nil, nil, refuse(takeAnother, "has no sheet %q with cells", sheet)
	}
	r := &cellReader{w: w, sheet: sheet, columns: columns}
	err := w.archive.scan(part, "worksheet", most, visitor{start: r.start, end: r.end})
	return r.cells, r.merges, err
}

// cellReader follows the XML of one sheet.
type cellReader struct {
	w        *Workbook
	sheet    string
	columns  int
	cells    []Cell
	merges   []area
	data     bool // the table of cells has begun
	row, col int  // where the reader is

	cell     Cell
	kind     string // the cell's type as written
	value    string
	hasValue bool
	inline   strings.Builder
	hasIn    bool
}

func (r *cellReader) start(s *scanner, e xml.StartElement) (bool, error) {
	depth := len(s.path)
	if depth < 2 {
		return false, nil
	}
	if s.path[1] == "mergeCells" {
		return false, r.merge(s, e)
	}
	if s.path[1] != "sheetData" {
		return false, nil
	}
	name := e.Name.Local
	switch depth {
	case 2:
		if r.data {
			return false, s.broken()
		}
		r.data = true
	case 3:
		if name != "row" {
			return false, s.broken()
		}
		return false, r.startRow(s, e)
	case 4:
		if name == "extLst" {
			return false, nil
		}
		if name != "c" {
			return false, s.broken()
		}
		return false, r.startCell(s, e)
	case 5:
		switch name {
		case "f":
			if r.cell.IsFormula {
				return false, s.broken()
			}
			r.cell.IsFormula = true
			return true, nil
		case "v":
			if r.hasValue {
				return false, s.broken()
			}
			r.hasValue = true
			return true, nil
		case "is":
			if r.hasIn {
				return false, s.broken()
			}
			r.hasIn = true
		case "extLst":
		default:
			return false, s.broken()
		}
	case 6, 7:
		return s.path[4] == "is" && name == "t" && (depth == 6 || s.path[5] == "r"), nil
	}
	return false, nil
}

func (r *cellReader) startRow(s *scanner, e xml.StartElement) error {
	r.row++
	if at := attr(e, "r"); at != "" {
		n, ok := whole(at)
		if !ok || n < r.row {
			return s.broken() // rows follow one another; none stands twice
		}
		r.row = n
	}
	if r.row > lastRow {
		return refuse(saveAnew, "has a row %d on the sheet %q, beyond the last there is", r.row, r.sheet)
	}
	r.col = 0
	return nil
}

func (r *cellReader) startCell(s *scanner, e xml.StartElement) error {
	r.col++
	if ref := attr(e, "r"); ref != "" {
		col, row, ok := place(ref)
		if !ok || row != r.row || col < r.col {
			return s.broken()
		}
		r.col = col
	}
	if r.col > lastColumn {
		return refuse(saveAnew, "has a column %d on the sheet %q, beyond the last there is", r.col, r.sheet)
	}
	style := 0
	if at := attr(e, "s"); at != "" {
		n, ok := whole(at)
		if !ok || n >= len(r.w.dates) && n > 0 {
			return s.broken()
		}
		style = n
	}
	r.cell = Cell{Row: r.row, Column: r.col, Style: style}
	r.kind, r.value, r.hasValue, r.hasIn = attr(e, "t"), "", false, false
	r.inline.Reset()
	return nil
}

func (r *cellReader) end(s *scanner, name, text string) error {
	if len(s.path) < 4 || s.path[1] != "sheetData" {
		return nil
	}
	switch depth := len(s.path); {
	case depth == 4 && name == "c":
		return r.endCell(s)
	case depth == 5 && name == "f":
		r.cell.Formula = text
	case depth == 5 && name == "v":
		r.value = text
	case depth >= 6 && name == "t" && s.path[4] == "is":
		r.inline.WriteString(text)
	}
	if len(text) > longestCell || r.inline.Len() > longestCell {
		return refuseCell(r.sheet, r.cell.Ref(), saveAnew, "holds more than any cell can hold")
	}
	return nil
}

// endCell settles what the cell holds.
func (r *cellReader) endCell(s *scanner) error {
	c := &r.cell
	raw := strings.TrimSpace(r.value)
	if r.hasIn && r.kind != "inlineStr" {
		return s.broken()
	}
	empty := !r.hasValue || r.value == ""
	switch {
	case r.kind == "inlineStr":
		c.Kind, c.Text = Text, unescaped(r.inline.String())
	case r.kind == "str" && r.hasValue:
		c.Kind, c.Text = Text, unescaped(r.value)
	case empty && c.IsFormula:
		c.Kind = Nothing
	case empty:
		return nil // formatted and blank
	case r.kind == "s":
		n, ok := whole(raw)
		if !ok || n >= len(r.w.texts) {
			return refuseCell(r.sheet, c.Ref(), takeAnother, "points to a text that is not there")
		}
		c.Kind, c.Text = Text, r.w.texts[n]
	case r.kind == "b":
		if raw != "0" && raw != "1" {
			return s.broken()
		}
		c.Kind, c.Text = Flag, map[string]string{"0": "false", "1": "true"}[raw]
	case r.kind == "e":
		c.Kind, c.Text = Failure, raw
	case r.kind == "d":
		c.Kind, c.Text, c.Date = Number, raw, true
	case r.kind == "" || r.kind == "n":
		v, ok := number(raw)
		if !ok {
			return refuseCell(r.sheet, c.Ref(), takeAnother, "holds %.40q where a number is stored", raw)
		}
		c.Kind, c.Text, c.Num = Number, raw, v
		c.Date = c.Style < len(r.w.dates) && r.w.dates[c.Style]
	default:
		return s.broken()
	}
	if c.Column > r.columns {
		return nil
	}
	if len(r.cells) == mostCells {
		return refuse(saveAnew, "has more than %d cells on the sheet %q", mostCells, r.sheet)
	}
	r.cells = append(r.cells, *c)
	return nil
}

// merge notes a merged area.
func (r *cellReader) merge(s *scanner, e xml.StartElement) error {
	if !s.at("worksheet", "mergeCells", "mergeCell") {
		return nil
	}
	if len(r.merges) == mostMerges {
		return refuse(saveAnew, "has more than %d merged areas on the sheet %q", mostMerges, r.sheet)
	}
	ref := attr(e, "ref")
	from, to, both := strings.Cut(ref, ":")
	if !both {
		to = from
	}
	var a area
	var ok, ok2 bool
	a.ref = ref
	a.left, a.top, ok = place(from)
	a.right, a.under, ok2 = place(to)
	if !ok || !ok2 || a.right < a.left || a.under < a.top {
		return s.broken()
	}
	r.merges = append(r.merges, a)
	return nil
}

// whole is a plain whole number within the bounds of a sheet.
func whole(s string) (int, bool) {
	if s == "" || len(s) > 9 || strings.Trim(s, "0123456789") != "" {
		return 0, false
	}
	n, err := strconv.Atoi(s)
	return n, err == nil
}

// number is a number as workbooks store them: decimal digits, finite.
func number(s string) (float64, bool) {
	if len(s) > 400 || strings.Trim(s, "0123456789+-.eE") != "" {
		return 0, false
	}
	v, err := strconv.ParseFloat(s, 64) // too large is an error, and so is a gap in the digits
	return v, err == nil
}

// place is the column and row of a reference such as "B7".
func place(ref string) (column, row int, ok bool) {
	i := 0
	for i < len(ref) && ref[i] >= 'A' && ref[i] <= 'Z' {
		column = column*26 + int(ref[i]-'A') + 1
		if i++; i > 3 {
			return 0, 0, false
		}
	}
	row, ok = whole(ref[i:])
	return column, row, ok && i > 0 && column <= lastColumn && row >= 1 && row <= lastRow && ref[i] != '0'
}

func columnName(n int) string {
	name := ""
	for ; n > 0; n = (n - 1) / 26 {
		name = string(rune('A'+(n-1)%26)) + name
	}
	return name
}
