package workbook

// Printable size of a landscape A4 page within the margins of page, in points.
const (
	printWidth  = 11.69*72 - 72
	printHeight = 8.27*72 - 1.5*72
)

// block is a heading with what must stand on the same page: its rows, counted
// from 1, both included.
type block struct{ first, last int }

// breakBefore puts a page break before every block that would else be split from
// its heading at the foot of a page. Rows are as high as they were set; total is
// the width of the printed columns in characters and repeated the last row of a
// heading that is printed on every page, 0 without one.
func (b *book) breakBefore(sheet string, blocks []block, last int, total float64, repeated int) {
	scale := min(1, printWidth/(total*5.25+4*5)) // a character is 7 pixels of 0.75 points
	room := printHeight / scale * 0.96
	height := func(row int) float64 {
		h, err := b.f.GetRowHeight(sheet, row)
		b.try(err)
		return h
	}
	starts := map[int]int{}
	for _, x := range blocks {
		starts[x.first] = x.last
	}
	used := 0.0
	for row := 1; row <= last; row++ {
		h := height(row)
		if end, ok := starts[row]; ok && row > 1 {
			need := 0.0
			for r := row; r <= end; r++ {
				need += height(r)
			}
			if used > 0 && used+need > room && need <= room {
				b.try(b.f.InsertPageBreak(sheet, cellName(1, row)))
				used = 0
			}
		}
		if used+h > room {
			used = 0
			if repeated > 0 && row > repeated {
				used = height(repeated)
			}
		}
		used += h
	}
}
