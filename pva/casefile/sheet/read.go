package sheet

import (
	"errors"
	"math"
	"sort"
	"strconv"
	"strings"

	"ebbline/pva"
	"ebbline/pva/casefile"
)

// InputsSheet is the sheet that holds a case.
const InputsSheet = "Inputs"

// headings are those of the first columns; what stands to the right of them is
// for people, but for the heading Status.
var headings = []string{"Key", "Value", "Unit", "Source", "Note"}

const (
	largestInputs = 16 << 20 // bytes of the sheet, unzipped
	inputColumns  = 64       // columns looked at
	mostRows      = 100_000
)

// Read reads and checks the case that a workbook holds on its sheet Inputs. The
// name is the file's, for the errors. Cells with formulas are read by their
// stored value. A row whose Status is "default" is left out while its value is
// the key's default: a report lists those that nobody gave.
func Read(name string, data []byte) (*pva.Case, casefile.Errors) {
	w, err := Open(name, data)
	if err != nil {
		return nil, asErrors(name, err)
	}
	sheet := ""
	for _, s := range w.names {
		if strings.EqualFold(strings.TrimSpace(s), InputsSheet) {
			sheet = s
		}
	}
	if sheet == "" {
		return nil, asErrors(name, refuse("`ebbline new FILE.xlsx` writes one to begin from", "has no sheet %q", InputsSheet))
	}
	cells, merges, err := w.cells(sheet, largestInputs, inputColumns)
	if err != nil {
		return nil, asErrors(name, err)
	}
	g := grid{sheet: sheet, cells: cells, first: map[int]int{}}
	last := 0
	for i, c := range cells {
		if c.Row != last {
			g.first[c.Row], last = i, c.Row
		}
	}
	if len(g.first) > mostRows {
		return nil, asErrors(name, refuse("a case has a row for each of its numbers and words", "has %d rows on its sheet %q", len(g.first), sheet))
	}
	if err := g.heading(); err != nil {
		return nil, asErrors(name, err)
	}
	for _, m := range merges {
		if m.left <= max(len(headings), g.status) && m.top <= last {
			g.fail(refuseCell(sheet, m.ref, "unmerge them: a row has one key and one value", "are merged cells"), m.top, "")
		}
	}
	var rows []casefile.Row
	for i, c := range cells {
		if c.Row == 1 || g.first[c.Row] != i {
			continue
		}
		if row, ok := g.row(c.Row); ok {
			rows = append(rows, row)
		}
	}
	c, faults := casefile.FromRows(name, rows)
	if len(g.errs) == 0 && len(faults) == 0 {
		return c, nil
	}
	return nil, g.with(name, faults)
}

// asErrors is a single error as a list.
func asErrors(name string, err error) casefile.Errors {
	var e casefile.Error
	if !errors.As(err, &e) {
		e.Fault = pva.Fault{Want: err.Error()}
	}
	e.File = name
	return casefile.Errors{e}
}

// grid is the Inputs sheet with its cells by row and column.
type grid struct {
	sheet  string
	cells  []Cell
	first  map[int]int // row -> index of its first cell
	status int         // column of the statuses, 0 if there is none
	errs   []located
}

// located is a fault of a cell with its row, and the key of that row.
type located struct {
	err casefile.Error
	row int
	key string
}

func (g *grid) fail(err error, row int, key string) {
	g.errs = append(g.errs, located{err.(casefile.Error), row, key})
}

// at is the cell of a row and column; not ok if it is blank.
func (g *grid) at(row, column int) (Cell, bool) {
	i, ok := g.first[row]
	for ; ok && i < len(g.cells) && g.cells[i].Row == row; i++ {
		if g.cells[i].Column == column {
			return g.cells[i], true
		}
	}
	return Cell{}, false
}

// heading checks the first row and looks for the statuses.
func (g *grid) heading() error {
	for i, want := range headings {
		c, _ := g.at(1, i+1)
		if c.Kind != Text || !strings.EqualFold(strings.TrimSpace(c.Text), want) {
			return refuseCell(g.sheet, columnName(i+1)+"1", "row 1 holds the headings "+strings.Join(headings, ", "), "is not the heading %q", want)
		}
	}
	for col := len(headings) + 1; col <= inputColumns; col++ {
		if c, _ := g.at(1, col); c.Kind == Text && strings.EqualFold(strings.TrimSpace(c.Text), "Status") {
			if g.status > 0 {
				return refuseCell(g.sheet, c.Ref(), "keep one of them", "is a second heading \"Status\"")
			}
			g.status = col
		}
	}
	return nil
}

// row reads one row; not ok if there is nothing to be taken from it.
func (g *grid) row(at int) (casefile.Row, bool) {
	row := casefile.Row{Sheet: g.sheet, Row: at}
	n := len(g.errs)
	row.Key = g.text(at, 1, "")
	row.Source, row.Note = g.text(at, 4, row.Key), g.text(at, 5, row.Key)
	status := ""
	if g.status > 0 {
		status = g.text(at, g.status, row.Key)
	}
	row.Value = g.value(at, row.Key)
	if len(g.errs) > n {
		return row, false
	}
	untouched := strings.EqualFold(strings.TrimSpace(status), "default") && strings.TrimSpace(row.Source+row.Note) == ""
	if untouched && isDefault(row.Key, row.Value) {
		return row, false
	}
	return row, true
}

// readable refuses cells that hold nothing to be read.
func (g *grid) readable(c Cell, key string) bool {
	switch {
	case c.Kind == Nothing && c.IsFormula:
		g.fail(refuseCell(g.sheet, c.Ref(), "open the workbook in a spreadsheet program and save it, or write the value itself", "holds a formula without a stored value"), c.Row, key)
	case c.Kind == Failure:
		g.fail(refuseCell(g.sheet, c.Ref(), "mend its formula, or write the value itself", "holds the error %.20s", c.Text), c.Row, key)
	case c.Date:
		g.fail(refuseCell(g.sheet, c.Ref(), "format the cell as a number, or as text, and write it again", "holds a date or time"), c.Row, key)
	default:
		return true
	}
	return false
}

// text is a cell of a column of texts.
func (g *grid) text(row, column int, key string) string {
	c, ok := g.at(row, column)
	if !ok || !g.readable(c, key) {
		return ""
	}
	return c.Text
}

// value is the cell of the value: a number, a text or true and false.
func (g *grid) value(row int, key string) pva.Value {
	c, ok := g.at(row, 2)
	if !ok || !g.readable(c, key) {
		return pva.Text("")
	}
	switch c.Kind {
	case Flag:
		return pva.Flag(c.Text == "true")
	case Text:
		return pva.Text(c.Text)
	}
	// A spreadsheet rounds whole numbers beyond this without a word.
	if math.Abs(c.Num) >= 1<<53 {
		g.fail(refuseCell(g.sheet, c.Ref(), "format the cell as text and write all its digits", "holds %.30s, which is longer than a spreadsheet's numbers can be", c.Text), row, key)
	}
	if k := caseKey(key); k != nil && (c.Num == 0 || c.Num == 1) {
		if _, flag := k.Default.(bool); flag {
			return pva.Flag(c.Num == 1) // some programs save true and false as numbers
		}
	}
	v := pva.Num(c.Num)
	if c.Num == math.Trunc(c.Num) && math.Abs(c.Num) < 1e15 {
		v.Text = strconv.FormatFloat(c.Num, 'f', -1, 64) // not 1e+06, however it is stored
	}
	return v
}

// caseKey is the key of a row, by name or position, or the one that an option
// sets; nil if there is none.
func caseKey(path string) *pva.Key {
	parts := strings.Split(strings.TrimSpace(path), ".")
	if len(parts) > 3 && parts[0] == "option" && parts[2] == "set" {
		return caseKey(strings.Join(parts[3:], "."))
	}
	if len(parts) > 1 && pva.IsArrayTable(parts[0]) {
		parts[1] = "1" // rows may stand by name
	}
	k, _ := pva.Find(strings.Join(parts, "."))
	return k
}

// isDefault says whether a value is what holds where the key is not given.
func isDefault(key string, v pva.Value) bool {
	k := caseKey(key)
	if k == nil || strings.HasPrefix(key, "option.") {
		return false
	}
	switch d := k.Default.(type) {
	case float64:
		return v.Kind == pva.NumberKind && v.Num == d
	case bool:
		return v.Kind == pva.FlagKind && v.Flag == d
	case string:
		return v.Kind == pva.TextKind && v.Text == d
	}
	return false
}

// with joins the faults of cells with those of the case, in the order of the
// rows. That a key is missing says nothing new where its row is at fault.
func (g *grid) with(name string, faults casefile.Errors) casefile.Errors {
	type item struct {
		err casefile.Error
		row int
	}
	var all []item
	spoilt := map[string]bool{}
	for _, e := range g.errs {
		e.err.File = name
		if key := strings.TrimSpace(e.key); key != "" {
			spoilt[key] = true
			e.err.Fault.Key = key
		}
		all = append(all, item{e.err, e.row})
	}
	for _, e := range faults {
		if e.Fault.Missing && (spoilt[e.Fault.Key] || spoilt[e.Fault.Path]) {
			continue
		}
		row := 0
		if _, ref, ok := strings.Cut(e.Cell, "!"); ok {
			_, row, _ = place(ref)
		}
		all = append(all, item{e, row})
	}
	sort.SliceStable(all, func(i, j int) bool { return all[i].row < all[j].row })
	out := make(casefile.Errors, len(all))
	for i, x := range all {
		out[i] = x.err
	}
	return out
}
