package casefile

import (
	"fmt"
	"strconv"
	"strings"

	"ebbline/pva"
)

// Row is one row of an Inputs sheet. Value is as read from the cell: a number, a
// text or true and false. Unit is for people and is not read.
type Row struct {
	Sheet  string // the sheet's name, for the errors
	Row    int    // its row, from 1, for the errors
	Key    string // by name ("harvest.control.take") or position ("harvest.1.take")
	Value  pva.Value
	Unit   string
	Source string
	Note   string
}

// listMark stands as the value of a list that an option gives anew as a whole;
// the rows of its elements follow.
const listMark = "(list)"

// FromRows reads and checks a case that came as rows of a sheet. The name is the
// workbook's, for the errors, which name the cell. Columns are Key, Value, Unit,
// Source and Note, from A. A row without key and value is passed over.
func FromRows(name string, rows []Row) (*pva.Case, Errors) {
	s := sheetReader{name: name, rowOf: map[string]int{}}
	if len(rows) > mostValues {
		s.fail(Row{}, 'A', pva.Fault{Want: fmt.Sprintf("the sheet has %d rows", len(rows)), Fix: fmt.Sprintf("%d are the most that can be read", mostValues)})
		return nil, s.errs
	}
	var entries []pva.Entry
	var kept []int // entry -> row
	options := map[string]bool{}
	for i, row := range rows {
		e, ok := s.entry(row)
		if !ok {
			continue
		}
		if strings.HasPrefix(e.Path, "option.") {
			options[strings.SplitN(e.Path, ".", 3)[1]] = true
		}
		entries, kept = append(entries, e), append(kept, i)
	}
	if len(entries)*(len(options)+1) > mostTrials {
		s.fail(Row{}, 'A', pva.Fault{Want: "the case has too many options for its length", Fix: "split it into several cases"})
		return nil, s.errs
	}
	placed, from, _ := pva.Resolve(entries)
	for i, e := range placed {
		s.rowOf[e.Path] = kept[from[i]] // of a key given twice the second is at fault
	}
	c, faults := pva.Build(entries)
	if len(faults) == 0 && len(s.errs) == 0 {
		faults = solvable(c)
	}
	all := make(pva.Faults, 0, len(s.errs)+len(faults))
	for _, e := range s.errs {
		all = append(all, e.Fault)
	}
	for i, f := range append(all, faults...).WithoutEchoes()[len(all):] {
		row := Row{}
		if i <= mostShown { // looking for the nearest row costs all rows
			row = s.row(f.Path, rows)
		}
		s.fail(row, column(f), f)
	}
	if len(s.errs) > 0 {
		s.errs.sort()
		return nil, s.errs
	}
	return c, nil
}

// sheetReader puts cells to faults.
type sheetReader struct {
	name  string
	rowOf map[string]int // path by position -> index of its row
	errs  Errors
}

// row is the row of a path, or the nearest one that shares its table.
func (s *sheetReader) row(path string, rows []Row) Row {
	if i, ok := s.rowOf[path]; ok {
		return rows[i]
	}
	for at, ok := path, true; ok; at, _, ok = cutLast(at) {
		best := -1
		for p, i := range s.rowOf {
			if strings.HasPrefix(p, at+".") && (best < 0 || i < best) {
				best = i
			}
		}
		if best >= 0 {
			return rows[best]
		}
	}
	return Row{}
}

func column(f pva.Fault) byte {
	if f.OfKey || f.Missing {
		return 'A'
	}
	return 'B'
}

func (s *sheetReader) fail(row Row, col byte, f pva.Fault) {
	e := Error{File: s.name, Fault: f, offset: row.Row}
	if row.Row > 0 {
		e.Cell = row.Sheet + "!" + string(col) + strconv.Itoa(row.Row)
	}
	if len(s.errs) < mostFaults {
		s.errs = append(s.errs, e)
	}
}

// entry turns a row into an entry; what the cell's own kind blurs (a year typed
// as a number, a number typed as text) is settled by the key.
func (s *sheetReader) entry(row Row) (pva.Entry, bool) {
	key := strings.TrimSpace(row.Key)
	v := row.Value
	blank := v.Kind == pva.TextKind && strings.TrimSpace(v.Text) == ""
	switch {
	case key == "" && blank:
		return pva.Entry{}, false
	case key == "":
		s.fail(row, 'A', pva.Fault{Value: v.String(), Want: "has no key", Fix: "name the key in column A"})
		return pva.Entry{}, false
	case len(key) > longestKey:
		s.fail(row, 'A', pva.Fault{Want: "the key is too long", Fix: fmt.Sprintf("keys have at most %d characters", longestKey)})
		return pva.Entry{}, false
	}
	n := nodeAt(key)
	if blank && !(n != nil && n.key != nil && !n.number) {
		s.fail(row, 'B', pva.Fault{Key: key, Path: key, Want: "has no value", Fix: "fill the cell or remove the row"})
		return pva.Entry{}, false
	}
	e := pva.Entry{Path: key, Value: v, Source: sourceText(plainBreaks([]byte(row.Source))), Note: strings.TrimSpace(plainBreaks([]byte(row.Note))), Origin: pva.FromCase}
	if n == nil {
		return e, true
	}
	text := strings.TrimSpace(v.Text)
	switch {
	case n.elem != nil && v.Kind == pva.TextKind && text == listMark:
		e.Value = pva.Value{Kind: pva.ListKind}
	case n.key == nil:
	case n.number && v.Kind == pva.TextKind:
		if num, ok := tomlNumber(text); ok {
			e.Value = pva.Value{Kind: pva.NumberKind, Num: num, Text: text}
		} else if _, ok := tomlNumber(strings.Replace(text, ",", ".", 1)); ok {
			s.fail(row, 'B', pva.Fault{Key: key, Path: key, Value: strconv.Quote(text), Want: "is not a number", Fix: "write a point for the decimal comma"})
			return pva.Entry{}, false
		}
	case n.number:
	case v.Kind == pva.NumberKind:
		e.Value = pva.Text(v.Text)
	case v.Kind == pva.TextKind && isFlag(n):
		if strings.EqualFold(text, "true") || strings.EqualFold(text, "false") {
			e.Value = pva.Flag(strings.EqualFold(text, "true"))
		}
	}
	return e, true
}

func isFlag(n *node) bool {
	_, ok := n.key.At(new(pva.Case), 0, 0, 0).(*bool)
	return ok
}

// ToRows is every key that the case gives as a row of an Inputs sheet, in the
// order of the key table, with keys by name where their row has one. Rows count
// from 2, below the headings.
func ToRows(c *pva.Case) []Row {
	entries := pva.Ordered(c.Entries())
	rows := make([]Row, len(entries))
	for i, e := range entries {
		key := c.Display(e.Path)
		if strings.HasSuffix(e.Path, ".name") && strings.Count(e.Path, ".") == 2 {
			key = e.Path // the name itself can only be given by position
		}
		row := Row{Sheet: "Inputs", Row: i + 2, Key: key, Value: e.Value, Source: e.Source, Note: e.Note}
		if e.Value.Kind == pva.ListKind {
			row.Value = pva.Text(listMark)
		}
		if n := nodeAt(e.Path); n != nil && n.key != nil {
			row.Unit = n.key.Unit
		}
		rows[i] = row
	}
	return rows
}
