package reports

import (
	"math"
	"strconv"
)

// Table is typed columns over rows. Rows carry an identity so that formulas and
// tests can name a cell.
type Table struct {
	ID      string
	Title   string
	Note    string
	Columns []Column
	Rows    []Row
	// Main marks the table whose heading stays in view while its rows scroll.
	Main bool
	// Shaded tables are maps: the larger the number the darker its cell, the
	// first column left out. The numbers stand in the cells all the same.
	Shaded bool
}

// Column is one column of a table.
type Column struct {
	Key    string
	Head   string
	Unit   string
	Format Format
	Wide   bool // holds sentences
}

// Row is one row: a cell for each column.
type Row struct {
	ID    string
	Cells []Cell
}

// Cell is a number, a text or nothing.
type Cell struct {
	Kind CellKind
	Num  float64
	Text string
	Flag bool
	// Format overrides the column's where it is not Inherit.
	Format Format
	// Formula says how the value follows from other cells, in the formula
	// language that spreadsheets share, without the leading "=". A cell is named
	// {key} in the same row, {table:row:key} elsewhere and {table::key} for a
	// whole column. It is given only where it yields the value held.
	Formula string
}

// CellKind is the kind of a cell.
type CellKind uint8

// The kinds of cell.
const (
	Empty CellKind = iota
	NumberCell
	TextCell
	FlagCell
)

// Format says how a number is written.
type Format struct {
	Kind   FormatKind
	Digits int // after the decimal sign
}

// FormatKind is the kind of a number format.
type FormatKind uint8

// The kinds of number format.
const (
	Inherit  FormatKind = iota
	General             // as many digits as the value needs
	Counts              // whole numbers in groups of three
	Dates               // whole numbers without grouping
	Decimal             // a fixed number of decimals, grouped
	Percents            // a fraction written as percent
	Points              // percentage points, with a sign
	Small               // a small number with its power of ten
)

// Column finds a column by key, -1 if there is none.
func (t *Table) Column(key string) int {
	for i, c := range t.Columns {
		if c.Key == key {
			return i
		}
	}
	return -1
}

// Row finds a row by identity, -1 if there is none.
func (t *Table) Row(id string) int {
	for i, r := range t.Rows {
		if r.ID == id {
			return i
		}
	}
	return -1
}

// Cell is the cell of a row and a column; it panics if there is none.
func (t *Table) Cell(row, key string) Cell {
	return t.Rows[t.Row(row)].Cells[t.Column(key)]
}

// FormatOf is the format in force for a cell.
func (t *Table) FormatOf(row, column int) Format {
	if f := t.Rows[row].Cells[column].Format; f.Kind != Inherit {
		return f
	}
	return t.Columns[column].Format
}

// Shown is the cell as a person reads it, in its format.
func (t *Table) Shown(row, column int) string {
	c := t.Rows[row].Cells[column]
	switch c.Kind {
	case TextCell:
		return c.Text
	case FlagCell:
		return strconv.FormatBool(c.Flag)
	case NumberCell:
		return t.FormatOf(row, column).Show(c.Num)
	}
	return ""
}

// num is a number cell; NaN is an empty cell and an infinite percentile, which
// lies among the outgrown replicates, is said in words.
func num(v float64) Cell {
	switch {
	case math.IsNaN(v):
		return Cell{}
	case math.IsInf(v, 1):
		return text("outgrown")
	case math.IsInf(v, -1):
		return Cell{}
	}
	return Cell{Kind: NumberCell, Num: v}
}

func text(s string) Cell { return Cell{Kind: TextCell, Text: s} }

func (c Cell) as(kind FormatKind, digits int) Cell {
	c.Format = Format{kind, digits}
	return c
}

// by attaches a formula if it yields the value to within 1e-12; a figure made
// in another way (an interval between draws, say) keeps its value alone.
func (c Cell) by(formula string, yields float64) Cell {
	if c.Kind == NumberCell && math.Abs(c.Num-yields) <= 1e-12 {
		c.Formula = formula
	}
	return c
}

// builder gathers rows without counting columns by hand.
type builder struct{ t *Table }

func newTable(id, title string) *builder { return &builder{t: &Table{ID: id, Title: title}} }

func (b *builder) column(key, head, unit string, f Format) *builder {
	b.t.Columns = append(b.t.Columns, Column{Key: key, Head: head, Unit: unit, Format: f})
	return b
}

func (b *builder) wide(key, head string) *builder {
	b.t.Columns = append(b.t.Columns, Column{Key: key, Head: head, Wide: true})
	return b
}

// row adds a row; cells for columns that the table does not have are left out.
func (b *builder) row(id string, cells map[string]Cell) {
	r := Row{ID: id, Cells: make([]Cell, len(b.t.Columns))}
	for i, c := range b.t.Columns {
		r.Cells[i] = cells[c.Key]
	}
	b.t.Rows = append(b.t.Rows, r)
}
