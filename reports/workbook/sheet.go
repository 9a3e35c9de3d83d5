package workbook

import (
	"fmt"
	"math"

	"github.com/xuri/excelize/v2"

	"ebbline/pva"
	"ebbline/reports"
)

// lineHeight is the height of one line of 10-point text, in points.
const lineHeight = 13.2

// Widths of columns in characters: numbers at least and at most, sentences always.
const (
	leastWidth    = 9.5
	mostWidth     = 36.0
	sentenceWidth = 64
	// Sheets of more columns than manyColumns have narrower ones.
	manyColumns    = 10
	leastOfMany    = 7.5
	sentenceOfMany = 38.0
	besideColumns  = 11 // columns that a chart beside a table takes
)

// put writes one cell of a report: numbers with all their digits, text as text.
func (b *book) put(sheet, cell string, c reports.Cell, style int) {
	switch c.Kind {
	case reports.NumberCell:
		b.try(b.f.SetCellDefault(sheet, cell, exact(c.Num)))
	case reports.TextCell:
		b.try(b.f.SetCellStr(sheet, cell, cellText(c.Text)))
	case reports.FlagCell:
		b.try(b.f.SetCellBool(sheet, cell, c.Flag))
	}
	b.try(b.f.SetCellStyle(sheet, cell, cell, style))
}

// say writes a text of the workbook's own.
func (b *book) say(sheet, cell, s string, k styleKey) {
	b.put(sheet, cell, reports.Cell{Kind: reports.TextCell, Text: s}, b.style(k))
}

// formula notes that a cell follows from others; seal writes it beside the value.
func (b *book) formula(sheet, cell, f string) {
	if len(f) > 8192 {
		b.try(fmt.Errorf("sheet %s, cell %s: a formula of %d characters is longer than a cell holds", sheet, cell, len(f)))
		return
	}
	if b.wants[sheet] == nil {
		b.wants[sheet] = map[string]string{}
	}
	b.wants[sheet][cell] = f
}

func (b *book) link(sheet, cell, to, target, tip string) {
	b.try(b.f.SetCellHyperLink(sheet, cell, quoted(to)+"!"+target, "Location", excelize.HyperlinkOpts{Tooltip: &tip}))
}

// headText is a column's heading with its unit under it.
func headText(c reports.Column) string {
	if c.Unit != "" && c.Unit != c.Head {
		return c.Head + "\n" + c.Unit
	}
	return c.Head
}

func numeric(c reports.Column) bool { return c.Format.Kind != reports.Inherit && !c.Wide }

// table writes a table at its place: title, note, heading and rows.
func (b *book) table(p place, widths []float64) {
	sheet := p.sheet
	row := p.head
	if p.t.Note != "" {
		row--
		b.say(sheet, cellName(p.left, row), p.t.Note, styleKey{colour: grey, wrap: true})
		total := 0.0
		for _, w := range widths {
			total += w
		}
		b.try(b.f.MergeCell(sheet, cellName(p.left, row), cellName(len(widths), row)))
		b.try(b.f.SetRowHeight(sheet, row, float64(lines(p.t.Note, total))*lineHeight+2))
	}
	if p.t.Title != "" {
		row--
		b.say(sheet, cellName(p.left, row), p.t.Title, styleKey{bold: true, size: 11})
	}
	tall := 1
	for j, c := range p.t.Columns {
		k := styleKey{bold: true, ground: headGround, wrap: true, right: numeric(c) && c.Key != "value", middle: true, head: j > 0}
		if j > 0 && !k.right {
			k.indent = 1 // over the text of its cells
		}
		b.say(sheet, cellName(p.left+j, p.head), headText(c), k)
		tall = max(tall, lines(headText(c), widths[p.left+j-1]/1.1))
	}
	b.try(b.f.SetRowHeight(sheet, p.head, float64(tall)*lineHeight+3))
	for i, r := range p.t.Rows {
		tall := 1
		for j, cell := range r.Cells {
			column := p.t.Columns[j]
			k := styleKey{format: numberFormat(p.t.FormatOf(i, j), cell.Num), right: cell.Kind == reports.NumberCell && column.Key != "value", line: true}
			if cell.Kind != reports.NumberCell {
				k.format = ""
				k.right = numeric(column) && column.Key != "value"
				k.wrap = cell.Kind == reports.TextCell
			}
			if cell.Kind == reports.FlagCell {
				k.format = `"true";;"false"` // some programs show a flag as a number
			}
			if j > 0 && !k.right {
				k.indent = 1 // room between a number and the text after it
			}
			if cell.Kind == reports.TextCell {
				n := lines(cell.Text, widths[p.left+j-1]-2)
				if p.t.ID == "case_text" {
					n = monoLines(cell.Text, widths[p.left+j-1]-4)
				}
				tall = max(tall, n)
			}
			if p.t.ID == "case_text" {
				k.line, k.mono, k.right = false, column.Key == "text", false
			}
			if c := tint(column.Key, cell.Text); c != "" {
				k.ground, k.bold = c, true
			}
			b.put(sheet, p.at(i, j), cell, b.style(k))
			if cell.Formula != "" {
				b.formula(sheet, p.at(i, j), b.resolve(p, i, cell.Formula))
			}
		}
		b.try(b.f.SetRowHeight(sheet, p.head+1+i, math.Min(409, float64(tall)*lineHeight+1.8)))
	}
	if p.t.Shaded && len(p.t.Rows) > 0 && len(p.t.Columns) > 1 {
		b.try(b.f.SetConditionalFormat(sheet, p.at(0, 1)+":"+p.at(len(p.t.Rows)-1, len(p.t.Columns)-1), []excelize.ConditionalFormatOptions{
			{Type: "2_color_scale", Criteria: "=", MinType: "min", MaxType: "max", MinColor: "#FFFFFF", MaxColor: "#56B4E9"}}))
	}
}

// tints are the grounds of verdicts and of inputs that rest on little; the words
// carry the meaning.
var tints = map[string]map[string]string{
	"verdict": {string(pva.Within): withinTint, string(pva.AboveLimit): aboveTint, string(pva.Undecided): undecidedTint},
	"status":  {reports.Unsourced: aboveTint, reports.Assumed: undecidedTint, reports.Overridden: withinTint},
}

func tint(key, text string) string { return tints[key][text] }

// columnWidths makes every column of a sheet as wide as its tables need.
func columnWidths(p reports.Part, l layout) []float64 {
	w := make([]float64, max(l.columns, 1))
	least, sentences := leastWidth, float64(sentenceWidth)
	if l.columns > manyColumns { // or the print would be tiny
		least, sentences = leastOfMany, sentenceOfMany
	}
	for i := range w {
		w[i] = least
	}
	for _, t := range p.Tables {
		for j, c := range t.Columns {
			if c.Wide {
				w[j] = math.Max(w[j], math.Min(wideColumn(t, j), math.Max(sentences, 104*caseColumn(t))))
				continue
			}
			for _, word := range splitWords(headText(c)) {
				w[j] = math.Max(w[j], wide(word)*1.1+1.2)
			}
			most := mostWidth
			if numeric(c) {
				most = 30 // a text among numbers wraps
			}
			for i := range t.Rows {
				limit := most
				if c.Key == "name" && l.columns > manyColumns {
					limit = 24
				}
				if t.Rows[i].Cells[j].Kind == reports.TextCell && numeric(c) && c.Key != "value" {
					limit = 15
				}
				w[j] = math.Max(w[j], math.Min(limit, wide(t.Shown(i, j))+2.5))
			}
		}
	}
	return w
}

// wideColumn is the width of a column of sentences: what it needs, within bounds.
func wideColumn(t *reports.Table, j int) float64 {
	w := wide(t.Columns[j].Head) + 3
	for i := range t.Rows {
		w = math.Max(w, wide(t.Shown(i, j))+2)
	}
	if t.ID == "case_text" || t.ID == "rerun" {
		return 104
	}
	if t.ID == "inputs" {
		return math.Min(w, 46) // three such columns on a page
	}
	return math.Min(w, sentenceWidth)
}

func splitWords(s string) []string {
	var out []string
	start := 0
	for i := 0; i <= len(s); i++ {
		if i == len(s) || s[i] == ' ' || s[i] == '\n' {
			if i > start {
				out = append(out, s[start:i])
			}
			start = i + 1
		}
	}
	return out
}

// caseColumn is 1 for the tables that hold the case itself, else 0.
func caseColumn(t *reports.Table) float64 {
	if t.ID == "case_text" || t.ID == "rerun" || t.ID == "inputs" {
		return 1
	}
	return 0
}

// writePart writes any part but the answer.
func (b *book) writePart(p reports.Part, l layout) {
	sheet := p.Name
	widths := columnWidths(p, l)
	if len(p.Sections) > 0 && len(p.Tables) == 0 {
		widths = []float64{118}
	}
	total := 0.0
	for j, w := range widths {
		b.try(b.f.SetColWidth(sheet, columnName(j+1), columnName(j+1), w))
		total += w
	}
	// Beside narrow tables a chart stands to the right, else below.
	beside := len(p.Charts) > 0 && total < 75
	across, span := l.columns, total
	if beside {
		across, span = l.columns+besideColumns, total+besideColumns*9
	}
	if !p.Bare {
		b.partHead(p, across, span)
	}
	title := 0
	for _, t := range p.Tables {
		b.table(b.places[t.ID], widths)
		if t.Main {
			title = l.tables[t.ID]
		}
	}
	if title > 0 {
		b.freeze(sheet, title, len(p.Tables[0].Columns) > 8 || p.Bare)
		if p.Bare {
			b.filter(p.Tables[0])
		}
	}
	for i, c := range p.Charts {
		at := cellName(1, l.chartAt+i*(chartRows+1))
		if beside {
			at = cellName(len(widths)+2, 4+i*(chartRows+1))
		}
		b.chart(c, sheet, at, chartWidth, chartHeight)
	}
	last, blocks := b.sections(p.Sections, sheet, l.textAt, total, len(widths))
	last = max(last, l.last)
	if len(p.Charts) > 0 && !beside {
		last = max(last, l.chartAt+chartRows)
	}
	b.page(sheet, absolute(sheet, sheet, 1, 1, 0)+":"+absolute(sheet, sheet, b.printColumns(p, across), last, 0), title)
	for i, t := range p.Tables {
		head := l.tables[t.ID]
		first := head
		for _, s := range []string{t.Title, t.Note} {
			if s != "" {
				first--
			}
		}
		if i > 0 {
			blocks = append(blocks, block{first, head + min(2, len(t.Rows))})
		}
	}
	for i := range p.Charts {
		if at := l.chartAt + i*(chartRows+1); !beside {
			blocks = append(blocks, block{at, at + chartRows - 2}) // without the gap below
		}
	}
	b.breakBefore(sheet, blocks, last, span, title)
	no := false
	if len(p.Tables) == 0 {
		b.try(b.f.SetSheetView(sheet, 0, &excelize.ViewOptions{ShowGridLines: &no}))
	}
}

// printColumns is the last column that is printed: wide enough for the charts.
func (b *book) printColumns(p reports.Part, columns int) int {
	if len(p.Charts) > 0 {
		return max(columns, 8)
	}
	return columns
}

// filter puts a filter on a table's heading, so that a reviewer can choose rows.
func (b *book) filter(t *reports.Table) {
	p := b.places[t.ID]
	b.try(b.f.AutoFilter(p.sheet, p.at(-1, 0)+":"+p.at(len(t.Rows)-1, len(t.Columns)-1), nil))
}

// partHead writes a part's title, what it shows and the way back.
func (b *book) partHead(p reports.Part, columns int, total float64) {
	sheet := p.Name
	b.say(sheet, "A1", p.Name, styleKey{bold: true, size: 15, colour: blue})
	b.try(b.f.SetRowHeight(sheet, 1, 24))
	b.say(sheet, "A2", p.Lead, styleKey{wrap: true, colour: grey})
	if columns > 1 {
		b.try(b.f.MergeCell(sheet, "A2", cellName(columns, 2)))
	}
	b.try(b.f.SetRowHeight(sheet, 2, float64(lines(p.Lead, total*0.97))*lineHeight+2))
	b.say(sheet, "A3", "Back to Answer", styleKey{link: true})
	b.link(sheet, "A3", reports.PartAnswer, "A1", "Back to the first sheet")
}

// freeze keeps everything down to the heading in view, and the first column of
// broad tables.
func (b *book) freeze(sheet string, head int, firstColumn bool) {
	x := 0
	pane := "bottomLeft"
	if firstColumn {
		x, pane = 1, "bottomRight"
	}
	b.try(b.f.SetPanes(sheet, &excelize.Panes{Freeze: true, XSplit: x, YSplit: head, TopLeftCell: cellName(x+1, head+1), ActivePane: pane}))
}

// sections writes headings and paragraphs down the first columns and gives the
// last row used and the headings with their first paragraphs. Beside tables a paragraph runs over the columns of the widest.
func (b *book) sections(list []reports.Section, sheet string, row int, total float64, columns int) (int, []block) {
	var blocks []block
	for _, s := range list {
		b.say(sheet, cellName(1, row), s.Heading, styleKey{bold: true, size: 11, colour: blue})
		b.try(b.f.SetRowHeight(sheet, row, 20))
		blocks = append(blocks, block{row, row + min(2, len(s.Paragraphs))})
		row++
		for _, p := range s.Paragraphs {
			row = b.paragraph(p, sheet, row, total, columns)
		}
		row++
	}
	return row - 1, blocks
}

func (b *book) paragraph(p reports.Paragraph, sheet string, row int, total float64, columns int) int {
	k := styleKey{wrap: true}
	width := total * 1.04
	switch p.Kind {
	case reports.Formula:
		k.mono, k.indent, k.ground = true, 2, "F5F5F5"
		width *= 0.84
	case reports.Reference:
		k.colour = grey
	}
	cell := cellName(1, row)
	b.say(sheet, cell, p.Text, k)
	if columns > 1 {
		b.try(b.f.MergeCell(sheet, cell, cellName(columns, row)))
	}
	b.try(b.f.SetRowHeight(sheet, row, math.Min(409, float64(lines(p.Text, width))*lineHeight+3)))
	return row + 1
}
