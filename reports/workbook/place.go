package workbook

import (
	"fmt"
	"strings"

	"github.com/xuri/excelize/v2"

	"ebbline/reports"
)

// place is where a table stands: its heading's row and its first column, both
// counted from 1. Rows of the table follow the heading without a gap.
type place struct {
	t         *reports.Table
	sheet     string
	head      int
	left      int
	helpers   map[string]int // columns added for the charts, by name
	lastRight int            // last column used, helpers included
}

// layout is how a part stands on its sheet.
type layout struct {
	tables  map[string]int // table id -> heading row
	chartAt int            // first row under the tables, for charts
	textAt  int            // first row of the sections
	last    int            // last row of tables
	columns int            // columns of the widest table
}

func cellName(column, row int) string {
	name, err := excelize.CoordinatesToCellName(column, row)
	if err != nil {
		panic("workbook: " + err.Error()) // only positions made here get here
	}
	return name
}

func columnName(column int) string {
	name, err := excelize.ColumnNumberToName(column)
	if err != nil {
		panic("workbook: " + err.Error())
	}
	return name
}

// at is the cell of a table's row and column, both counted from 0.
func (p place) at(row, column int) string { return cellName(p.left+column, p.head+1+row) }

// absolute is a cell or range of a sheet as formulas write it, with the sheet's
// name where they stand elsewhere.
func absolute(sheet, from string, column, first, last int) string {
	ref := fmt.Sprintf("$%s$%d", columnName(column), first)
	if last > first {
		ref += fmt.Sprintf(":$%s$%d", columnName(column), last)
	}
	if sheet != from {
		ref = quoted(sheet) + "!" + ref
	}
	return ref
}

// column is the range of a table's whole column as formulas write it from sheet
// "from"; an empty from always names the sheet, as charts need.
func (p place) column(key, from string) string {
	c := p.t.Column(key)
	if c < 0 {
		panic("workbook: no column " + key + " in table " + p.t.ID)
	}
	return absolute(p.sheet, from, p.left+c, p.head+1, p.head+len(p.t.Rows))
}

// resolve turns a report's formula into one of this workbook: {key},
// {table:row:key} and {table::key} become cells.
func (b *book) resolve(p place, row int, formula string) string {
	var out strings.Builder
	for {
		open := strings.IndexByte(formula, '{')
		if open < 0 {
			break
		}
		end := strings.IndexByte(formula[open:], '}')
		if end < 0 {
			panic("workbook: formula with an open brace in table " + p.t.ID)
		}
		out.WriteString(formula[:open])
		out.WriteString(b.reference(p, row, formula[open+1:open+end]))
		formula = formula[open+end+1:]
	}
	out.WriteString(formula)
	return out.String()
}

func (b *book) reference(p place, row int, name string) string {
	parts := strings.Split(name, ":")
	if len(parts) == 1 {
		c := p.t.Column(name)
		if c < 0 {
			panic("workbook: no column " + name + " in table " + p.t.ID)
		}
		return p.at(row, c)
	}
	q, ok := b.places[parts[0]]
	if !ok || len(parts) != 3 {
		panic("workbook: no table for {" + name + "} in table " + p.t.ID)
	}
	if parts[1] == "" {
		return q.column(parts[2], p.sheet)
	}
	r, c := q.t.Row(parts[1]), q.t.Column(parts[2])
	if r < 0 || c < 0 {
		panic("workbook: no cell {" + name + "} for table " + p.t.ID)
	}
	return absolute(q.sheet, p.sheet, q.left+c, q.head+1+r, 0)
}

// fixed is a single cell outside any table's row, such as a chart's level.
func (b *book) fixed(from, formula string) string {
	return b.resolve(place{t: &reports.Table{}, sheet: from}, 0, formula)
}

// placePart gives the tables of a part their rows.
func (b *book) placePart(p reports.Part) layout {
	l := layout{tables: map[string]int{}}
	row := 1
	if !p.Bare {
		row = 5 // title, lead, link, gap
	}
	for i, t := range p.Tables {
		if i > 0 {
			row += 2
		}
		if t.Title != "" {
			row++
		}
		if t.Note != "" {
			row++
		}
		l.tables[t.ID] = row
		b.places[t.ID] = place{t: t, sheet: p.Name, head: row, left: 1, helpers: map[string]int{}}
		row += len(t.Rows)
		l.last = row
		l.columns = max(l.columns, len(t.Columns))
	}
	l.chartAt = row + 2
	l.textAt = row + 2
	if len(p.Charts) > 0 {
		l.textAt = l.chartAt + chartRows + 1
	}
	if len(p.Tables) == 0 {
		l.textAt, l.columns = 5, 1
	}
	return l
}
