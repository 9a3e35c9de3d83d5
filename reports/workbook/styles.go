package workbook

import (
	"strconv"
	"strings"

	"github.com/xuri/excelize/v2"

	"ebbline/reports"
)

// Arial has the same widths as the free Liberation Sans, so that columns fit
// wherever the workbook is opened.
const fontName = "Arial"

// The palette of Okabe & Ito (2008, Color Universal Design), which people with
// any colour vision can tell apart, and a few greys and tints for grounds.
const (
	black         = "000000"
	skyBlue       = "56B4E9"
	blue          = "0072B2"
	vermillion    = "D55E00"
	grey          = "595959"
	lightGrey     = "D9D9D9"
	headGround    = "DCE9F3"
	withinTint    = "DDEFF9"
	aboveTint     = "FBE3D5"
	undecidedTint = "EDEDED"
	white         = "FFFFFF"
)

// styleKey names a cell style by what it looks like.
type styleKey struct {
	size         float64
	bold, italic bool
	colour       string
	ground       string
	format       string
	wrap, right  bool
	middle       bool
	line         bool // a hair line below
	head         bool // a column's heading, set off from the one before
	link         bool
	mono         bool
	indent       int
}

// style is the number of a style, made when first asked for.
func (b *book) style(k styleKey) int {
	if id, ok := b.ids[k]; ok {
		return id
	}
	font := &excelize.Font{Family: fontName, Size: 10, Bold: k.bold, Italic: k.italic, Color: black}
	if k.size > 0 {
		font.Size = k.size
	}
	if k.colour != "" {
		font.Color = k.colour
	}
	if k.mono {
		font.Family = "Courier New"
	}
	if k.link {
		font.Color, font.Underline = blue, "single"
	}
	s := &excelize.Style{Font: font, Alignment: &excelize.Alignment{Vertical: "top", WrapText: k.wrap, Indent: k.indent}}
	if k.middle {
		s.Alignment.Vertical = "center"
	}
	switch {
	case k.right:
		s.Alignment.Horizontal = "right"
	default:
		s.Alignment.Horizontal = "left"
	}
	if k.format != "" {
		s.CustomNumFmt = &k.format
	}
	if k.ground != "" {
		s.Fill = excelize.Fill{Type: "pattern", Pattern: 1, Color: []string{k.ground}}
	}
	if k.line {
		s.Border = []excelize.Border{{Type: "bottom", Color: lightGrey, Style: 1}}
	}
	if k.head {
		s.Border = []excelize.Border{{Type: "left", Color: white, Style: 5}}
	}
	id, err := b.f.NewStyle(s)
	b.try(err)
	b.ids[k] = id
	return id
}

// numberFormat is a report's format as spreadsheets write it for a value; the
// value looks in it as reports.Format.Show writes it.
func numberFormat(f reports.Format, v float64) string {
	if s := f.TooSmall(v); s != "" {
		return `"` + s + `"`
	}
	f = f.For(v)
	decimals := func(n int) string {
		if n == 0 {
			return "0"
		}
		return "0." + strings.Repeat("0", n)
	}
	switch f.Kind {
	case reports.Counts:
		return "#,##0"
	case reports.Dates:
		return "0"
	case reports.Decimal:
		return "#,##" + decimals(f.Digits)
	case reports.Percents:
		return `[=0]0\ %;[=1]0\ %;` + decimals(f.Digits) + `\ %`
	case reports.Small:
		return decimals(f.Digits) + "E+00"
	case reports.Points:
		d := decimals(f.Digits)
		// What rounds to nothing is 0, without a sign.
		least := "0." + strings.Repeat("0", f.Digits) + "5"
		return "[>=" + least + "]+" + d + ";[<=-" + least + "]-" + d + ";0"
	}
	return "General"
}

// exact is a number with all its digits, as the workbook stores it.
func exact(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
