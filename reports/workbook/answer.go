package workbook

import (
	"strings"

	"github.com/xuri/excelize/v2"

	"ebbline/pva"
	"ebbline/reports"
)

// The answer's own columns: a label, five numbers, a remark.
var answerWidths = []float64{39, 13, 13, 13, 13, 13, 62}

const answerTotal = 39 + 5*13 + 62

// Sizes of charts: two stand side by side on the answer.
const (
	chartRows        = 17 // rows of a chart, at the height rows have by default
	chartWidth       = 640
	chartHeight      = 320
	answerChartWidth = 585
	// On the first page the charts fill what the page has left; on the second
	// they leave room for the text under them.
	firstChartRows, firstChartHeight = 20, 385
	laterChartRows, laterChartHeight = 13, 250
	// The text under the charts takes all columns but the last, which holds the
	// list of sheets.
	answerText = answerTotal - 62
)

// Rows of the answer above its tables.
const (
	rowTitle    = 1
	rowWho      = 2
	rowQuestion = 3
	rowBig      = 5
	rowVerdict  = 6
	rowFigures  = 9
)

// placeAnswer puts the risk and the first two charts on the first page, the
// numbers beside it and the other charts after them.
func (b *book) placeAnswer(p reports.Part) layout {
	l := layout{tables: map[string]int{}, columns: len(answerWidths), chartAt: rowFigures}
	row := rowFigures
	for i, t := range p.Tables {
		l.tables[t.ID] = row
		b.places[t.ID] = place{t: t, sheet: p.Name, head: row, left: 1, helpers: map[string]int{}}
		row += len(t.Rows) + 3
		if i == 0 {
			l.chartAt = row - 1
			row += firstChartRows
		}
	}
	l.textAt = row
	if len(p.Charts) > 2 {
		l.textAt += (len(p.Charts) - 1) / 2 * (laterChartRows + 1)
	}
	l.last = l.textAt
	return l
}

// writeAnswer writes the first sheet: the question, the figure, the verdict, the
// charts, what matters, what was assumed, and what to bear in mind.
func (b *book) writeAnswer(p reports.Part, l layout) {
	sheet := p.Name
	for j, w := range answerWidths {
		b.try(b.f.SetColWidth(sheet, columnName(j+1), columnName(j+1), w))
	}
	b.answerHead(sheet)
	for i, t := range p.Tables {
		q := b.places[t.ID]
		title := *t
		title.Title, title.Note = "", ""
		q.t = &title
		b.answerTable(q, t, i)
	}
	for i, c := range p.Charts {
		column := 1
		if i%2 == 1 {
			column = 6
		}
		row, height := l.chartAt, uint(firstChartHeight)
		if i > 1 {
			height = laterChartHeight
			row = l.tables["numbers"] + len(b.places["numbers"].t.Rows) + 2 + (i-2)/2*(laterChartRows+1)
		}
		b.chart(c, sheet, cellName(column, row), answerChartWidth, height)
	}
	last := b.answerText(sheet, l.textAt)
	b.page(sheet, "$A$1:"+absolute(sheet, sheet, len(answerWidths), last, 0), 0)
	b.try(b.f.InsertPageBreak(sheet, cellName(1, l.tables["numbers"])))
	no := false
	b.try(b.f.SetSheetView(sheet, 0, &excelize.ViewOptions{ShowGridLines: &no}))
}

// sheetList writes the list of sheets in the last column from a row on, but not
// into gaps, and gives the row after it.
func (b *book) sheetList(sheet string, row int, gaps map[int]bool) int {
	column := len(answerWidths)
	b.say(sheet, cellName(column, row), "In this workbook", styleKey{bold: true, size: 11, colour: blue, indent: 2})
	for _, p := range b.r.Parts[1:] {
		for row++; gaps[row]; row++ {
		}
		b.say(sheet, cellName(column, row), p.Name, styleKey{link: true, indent: 2})
		b.link(sheet, cellName(column, row), p.Name, "A1", "Go to "+p.Name)
	}
	return row + 1
}

// across writes a sentence over all columns of the answer.
func (b *book) across(sheet string, row int, s string, k styleKey) {
	b.over(sheet, row, len(answerWidths), answerTotal, s, k)
}

// over writes a sentence over the first columns, which are so wide together.
func (b *book) over(sheet string, row, columns int, total float64, s string, k styleKey) {
	k.wrap = true
	b.say(sheet, cellName(1, row), s, k)
	last := cellName(columns, row)
	b.try(b.f.MergeCell(sheet, cellName(1, row), last))
	b.try(b.f.SetCellStyle(sheet, cellName(1, row), last, b.style(k)))
	size := k.size
	if size == 0 {
		size = 10
	}
	n := lines(s, total*0.95*10/size)
	b.try(b.f.SetRowHeight(sheet, row, float64(n)*lineHeight*size/10+3))
}

func (b *book) answerHead(sheet string) {
	r := b.r
	b.across(sheet, rowTitle, r.Title, styleKey{bold: true, size: 18, colour: blue})
	var who []string
	if r.Purpose != "" {
		who = append(who, r.Purpose)
	}
	if r.Prepared != "" {
		who = append(who, "prepared by "+r.Prepared)
	}
	who = append(who, reports.Program+" "+r.Version)
	b.across(sheet, rowWho, strings.Join(who, "  |  "), styleKey{colour: grey})
	b.across(sheet, rowQuestion, r.Question, styleKey{size: 13, middle: true})

	// The large figure is the one that the verdict uses.
	figures := b.places["figures"]
	lead := "risk"
	if figures.t.Row("exact") >= 0 {
		lead = "exact"
	}
	if r.Head != "" {
		b.say(sheet, cellName(1, rowBig), r.Head, styleKey{bold: true, size: 34, colour: blue, middle: true})
		b.say(sheet, cellName(2, rowBig), r.HeadBeside, styleKey{size: 13, middle: true})
	} else {
		b.bigRisk(r, figures, lead)
	}
	b.try(b.f.SetRowHeight(sheet, rowBig, 48))
	b.try(b.f.SetRowHeight(sheet, rowQuestion, b.heightOf(r.Question, 13)+10))
	if r.VerdictText != "" {
		mark := map[pva.Verdict]string{pva.Within: "\u2713", pva.AboveLimit: "\u25b2", pva.Undecided: "?"}[r.Verdict]
		b.across(sheet, rowVerdict, mark+"  "+r.VerdictText, styleKey{bold: true, size: 12, middle: true, ground: tint("verdict", string(r.Verdict))})
		b.try(b.f.SetRowHeight(sheet, rowVerdict, b.heightOf(r.VerdictText, 12)+10))
	} else {
		b.across(sheet, rowVerdict, "The case states no limit, so there is no verdict.", styleKey{colour: grey})
	}
}

// bigRisk writes the risk that the verdict rests on as the large figure, with
// its interval and what stands behind it.
func (b *book) bigRisk(r *reports.Report, figures place, lead string) {
	sheet, risk := reports.PartAnswer, r.Figures[0]
	cell := figures.t.Cell(lead, "estimate")
	b.put(sheet, cellName(1, rowBig), cell,
		b.style(styleKey{bold: true, size: 34, colour: blue, middle: true, format: numberFormat(figures.t.FormatOf(figures.t.Row(lead), figures.t.Column("estimate")), cell.Num)}))
	b.formula(sheet, cellName(1, rowBig), b.fixed(sheet, "{figures:"+lead+":estimate}"))
	beside := risk.Beside
	if beside == "" {
		beside = risk.Interval
	}
	b.say(sheet, cellName(2, rowBig), beside+"   "+risk.Note, styleKey{size: 13, middle: true})
}

func (b *book) heightOf(s string, size float64) float64 {
	return float64(lines(s, answerTotal*0.95*10/size)) * lineHeight * size / 10
}

// answerTable writes a table of the answer with its title in the heading's first
// cell; remarks run over the free columns to the right.
func (b *book) answerTable(q place, t *reports.Table, i int) {
	q.t.Columns = append([]reports.Column(nil), t.Columns...)
	q.t.Columns[0].Head = t.Title
	last := len(answerWidths)
	widths := append([]float64(nil), answerWidths...)
	for j, c := range t.Columns {
		if c.Wide && j < last-1 {
			widths[j] = answerTotal // runs on over empty cells
		}
	}
	b.table(q, widths)
	for j := len(t.Columns); j < last; j++ {
		b.say(q.sheet, cellName(j+1, q.head), "", styleKey{ground: headGround})
	}
	// Remarks do not wrap where they have room to run on.
	for row := range t.Rows {
		for j, c := range t.Columns {
			if c.Wide && j < last-1 {
				b.put(q.sheet, q.at(row, j), t.Rows[row].Cells[j], b.style(styleKey{line: true, indent: 1}))
				for k := j + 1; k < last; k++ {
					b.try(b.f.SetCellStyle(q.sheet, cellName(k+1, q.head+1+row), cellName(k+1, q.head+1+row), b.style(styleKey{line: true})))
				}
			}
			if c.Key == "estimate" || c.Key == "label" {
				k := styleKey{line: true, bold: true, right: c.Key == "estimate"}
				if c.Key == "estimate" {
					k.format = numberFormat(t.FormatOf(row, j), t.Rows[row].Cells[j].Num)
				}
				b.try(b.f.SetCellStyle(q.sheet, q.at(row, j), q.at(row, j), b.style(k)))
			}
			if c.Key == "note" && t.Rows[row].ID == "limit" {
				b.try(b.f.SetCellStyle(q.sheet, q.at(row, j), q.at(row, j), b.style(styleKey{line: true, bold: true, indent: 1, ground: tint("verdict", t.Rows[row].Cells[j].Text)})))
			}
		}
	}
	if t.Note != "" {
		b.say(q.sheet, cellName(1, q.head+len(t.Rows)+1), t.Note, styleKey{colour: grey, italic: true})
	}
}

// answerText writes what stands under the charts, the list of sheets beside it,
// and gives the last row.
func (b *book) answerText(sheet string, row int) int {
	r := b.r
	first, gaps := row, map[int]bool{}
	head := func(s, part string) {
		b.say(sheet, cellName(1, row), s, styleKey{bold: true, size: 11, colour: blue})
		if part != "" {
			b.say(sheet, cellName(2, row), "see "+part, styleKey{link: true})
			b.link(sheet, cellName(2, row), part, "A1", "Go to "+part)
		}
		b.try(b.f.SetRowHeight(sheet, row, 20))
		row++
	}
	line := func(s string) {
		b.over(sheet, row, len(answerWidths)-1, answerText, s, styleKey{})
		row++
	}
	gap := func() { // half a line
		b.try(b.f.SetRowHeight(sheet, row, 7))
		gaps[row] = true
		row++
	}
	head("What it rests on", reports.PartInputs)
	line(r.Provenance.Short() + defaultsWords(r.Provenance.Defaults) + ".")
	if n := len(r.Provenance.Assumed); n > 0 {
		line("Assumed: " + strings.Join(r.Provenance.Assumed, ", ") + ".")
	}
	if n := len(r.Provenance.Unsourced); n > 0 {
		line("Without a source: " + strings.Join(r.Provenance.Unsourced, ", ") + ".")
	}
	gap()
	if len(r.Warnings) > 0 {
		head("Warnings", reports.PartCautions)
		for _, w := range r.Warnings {
			line("\u26a0  " + w)
		}
		gap()
	}
	head("Bear in mind", reports.PartCautions)
	for _, c := range r.ShortCautions {
		line("\u2022  " + c.Short)
	}
	row = max(row, b.sheetList(sheet, first, gaps)) + 1
	b.say(sheet, cellName(1, row), "Seed "+seedText(r)+", "+r.Digest, styleKey{colour: grey, size: 9})
	return row
}
