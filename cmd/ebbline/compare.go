package main

import (
	"bytes"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode"

	"ebbline/pva/casefile/sheet"
	"ebbline/reports"
)

// agreement is what the comparison of two workbooks found.
type agreement struct {
	sheets []sheetAgreement
	// looks are parts that differ though every cell agrees: charts, formats,
	// what is hidden. otherProgram names a program that saved the report since,
	// and changed all of that; looks are not compared then.
	looks        []string
	otherProgram string
}

// sheetAgreement is the cells of one sheet.
type sheetAgreement struct {
	name           string
	numbers, texts int
	different      []difference
}

// difference is one cell that is not as the run gives it.
type difference struct{ cell, reported, again string }

func (a agreement) differ() bool {
	for _, s := range a.sheets {
		if len(s.different) > 0 {
			return true
		}
	}
	return len(a.looks) > 0
}

// closeEnough is how far a number may be off: floating point differs in the last
// digits between families of processors.
const closeEnough = 1e-9

// sameNumber compares a reported number with the one run again. A whole number
// may be a count, and counts agree exactly: no count differs by so little.
func sameNumber(reported, again float64) bool {
	allowed := closeEnough * math.Max(math.Abs(reported), math.Abs(again))
	if again == math.Trunc(again) {
		allowed = math.Min(allowed, closeEnough)
	}
	// Zero stands for what cancels to nothing on one processor only.
	return math.Abs(reported-again) <= math.Max(allowed, 1e-15)
}

// compare holds every cell of a report against the report as run again.
func compare(reported, again *sheet.Workbook) (agreement, error) {
	var a agreement
	has := map[string]bool{}
	for _, name := range reported.Sheets() {
		has[name] = true
	}
	for _, name := range again.Sheets() {
		s := sheetAgreement{name: name}
		if !has[name] {
			s.different = []difference{{name, "(no such sheet)", "a sheet"}}
			a.sheets = append(a.sheets, s)
			continue
		}
		delete(has, name)
		old, err := reported.Cells(name)
		if err != nil {
			return a, err
		}
		fresh, err := again.Cells(name)
		if err != nil {
			return a, err
		}
		s.compare(old, fresh)
		a.sheets = append(a.sheets, s)
	}
	for _, name := range reported.Sheets() {
		if has[name] {
			a.sheets = append(a.sheets, sheetAgreement{name: name, different: []difference{{name, "a sheet", "(no such sheet)"}}})
		}
	}
	if p := reported.Program(); p != reports.Program {
		a.otherProgram = p
		return a, nil
	}
	return a, a.compareLooks(reported, again)
}

func (s *sheetAgreement) compare(old, fresh []sheet.Cell) {
	at := make(map[[2]int]sheet.Cell, len(old))
	for _, c := range old {
		at[[2]int{c.Row, c.Column}] = c
	}
	for _, c := range fresh {
		key := [2]int{c.Row, c.Column}
		o, ok := at[key]
		delete(at, key)
		if c.Kind == sheet.Number {
			s.numbers++
		} else if c.Text != "" {
			s.texts++
		}
		switch {
		case !ok && c.Text == "" && c.Kind == sheet.Text:
		case !ok:
			s.add(c, "(nothing)", shownCell(c))
		case !sameValue(o, c):
			s.add(c, shownCell(o), shownCell(c))
		case c.IsFormula && !o.IsFormula:
			s.add(c, "the value alone", "the formula "+c.Formula)
		case c.IsFormula && o.Formula != "" && plainFormula(o.Formula) != plainFormula(c.Formula):
			s.add(c, "the formula "+o.Formula, "the formula "+c.Formula)
		case c.Kind == sheet.Flag && plainFormula(o.Formula) == strings.ToUpper(c.Text)+"()":
		case o.IsFormula && !c.IsFormula:
			s.add(c, "the formula "+o.Formula, "the value alone")
		}
	}
	for _, c := range old { // what the report has and the run does not give
		if o, left := at[[2]int{c.Row, c.Column}]; left && (o.Kind != sheet.Text || o.Text != "") {
			s.add(o, shownCell(o), "(nothing)")
		}
	}
}

func (s *sheetAgreement) add(c sheet.Cell, reported, again string) {
	s.different = append(s.different, difference{s.name + "!" + c.Ref(), reported, again})
}

func sameValue(o, c sheet.Cell) bool {
	if c.Kind == sheet.Flag && o.Kind == sheet.Number { // as some programs save it
		return o.Num == 1 && c.Text == "true" || o.Num == 0 && c.Text == "false"
	}
	if o.Kind != c.Kind {
		return false
	}
	if c.Kind == sheet.Number {
		return sameNumber(o.Num, c.Num)
	}
	return strings.ReplaceAll(o.Text, "\r\n", "\n") == strings.ReplaceAll(c.Text, "\r\n", "\n")
}

// plainFormula is a formula without what programs write in their own ways:
// spaces, quotes around sheets, the case of names.
func plainFormula(f string) string {
	return strings.ToUpper(strings.Map(func(r rune) rune {
		if r == '\'' || unicode.IsSpace(r) {
			return -1
		}
		return r
	}, strings.ReplaceAll(f, "_xlfn.", "")))
}

func shownCell(c sheet.Cell) string {
	switch c.Kind {
	case sheet.Nothing:
		return "(a formula without its value)"
	case sheet.Text:
		return strconv.Quote(c.Text)
	case sheet.Number:
		return strconv.FormatFloat(c.Num, 'g', -1, 64)
	}
	return c.Text
}

// compareLooks holds the other parts against one another: the charts with the
// numbers in them, the formats by which numbers are shown, hidden rows. Sheets
// that have been found to differ are not mentioned again.
func (a *agreement) compareLooks(reported, again *sheet.Workbook) error {
	told := map[string]bool{}
	what := map[string]string{}
	anyCell := false
	for _, s := range a.sheets {
		part := again.SheetPart(s.name)
		told[part] = len(s.different) > 0
		anyCell = anyCell || told[part]
		what[part] = "the formats, widths or hidden parts of the sheet " + s.name
	}
	has := map[string]bool{}
	for _, name := range append(again.Parts(), reported.Parts()...) {
		if has[name] || told[name] || name == "xl/sharedStrings.xml" {
			continue // shared texts are compared as cells
		}
		has[name] = true
		o, err := reported.Part(name)
		if err != nil {
			return err
		}
		c, err := again.Part(name)
		if err != nil {
			return err
		}
		if bytes.Equal(o, c) || o != nil && c != nil && strings.HasSuffix(name, ".xml") && sameXML(o, c) {
			continue
		}
		if anyCell && !strings.HasPrefix(name, "xl/charts/") {
			continue // an edit to a cell moves texts and styles
		}
		switch {
		case what[name] != "":
			a.looks = append(a.looks, what[name])
		case strings.HasPrefix(name, "xl/charts/"):
			a.looks = append(a.looks, "the numbers or the form of a chart ("+name+")")
		default:
			a.looks = append(a.looks, "the part "+name)
		}
	}
	return nil
}

// sameXML walks two documents side by side: the same elements, and the same
// texts and attributes but for the last digits of numbers.
func sameXML(a, b []byte) bool {
	x, y := xml.NewDecoder(bytes.NewReader(a)), xml.NewDecoder(bytes.NewReader(b))
	for {
		s, err1 := x.Token()
		t, err2 := y.Token()
		if err1 != nil || err2 != nil {
			return errors.Is(err1, io.EOF) && errors.Is(err2, io.EOF)
		}
		switch u := s.(type) {
		case xml.CharData:
			v, ok := t.(xml.CharData)
			if !ok || !sameText(string(u), string(v)) {
				return false
			}
		case xml.StartElement:
			v, ok := t.(xml.StartElement)
			if !ok || !sameElement(u, v) {
				return false
			}
		default:
			if fmt.Sprintf("%T %v", s, s) != fmt.Sprintf("%T %v", t, t) {
				return false
			}
		}
	}
}

// sameElement compares what an element states of itself: the widths and heights
// of cells differ in the last digits between processors as their numbers do.
func sameElement(a, b xml.StartElement) bool {
	return a.Name == b.Name && slices.EqualFunc(a.Attr, b.Attr, func(x, y xml.Attr) bool {
		return x.Name == y.Name && sameText(x.Value, y.Value)
	})
}

func sameText(a, b string) bool {
	if a == b {
		return true
	}
	x, err1 := strconv.ParseFloat(a, 64)
	y, err2 := strconv.ParseFloat(b, 64)
	return err1 == nil && err2 == nil && sameNumber(x, y)
}

// mostNamed is how many cells of a sheet are named.
const mostNamed = 20

// text is the agreement sheet by sheet, in lines of at most 80 characters;
// brief leaves out what agrees.
func (a agreement) text(brief bool) string {
	var b strings.Builder
	total, wrong := 0, 0
	for _, s := range a.sheets {
		total += s.numbers + s.texts
		wrong += len(s.different)
		if brief && len(s.different) == 0 {
			continue
		}
		verdict := "agree"
		if n := len(s.different); n == 1 {
			verdict = "1 differs"
		} else if n > 1 {
			verdict = reports.Grouped(int64(n)) + " differ"
		}
		fmt.Fprintf(&b, "  %-20s %9s numbers %7s texts   %s\n", shortened(s.name, 20), reports.Grouped(int64(s.numbers)), reports.Grouped(int64(s.texts)), verdict)
		for i, d := range s.different {
			if i == mostNamed {
				fmt.Fprintf(&b, "    and %s more\n", reports.Grouped(int64(len(s.different)-mostNamed)))
				break
			}
			line := "    " + d.cell + ": reported " + shortened(d.reported, 60) + ", run again " + shortened(d.again, 60)
			if len([]rune(line)) > 80 {
				line = "    " + d.cell + "\n      reported   " + shortened(d.reported, 62) + "\n      run again  " + shortened(d.again, 62)
			}
			b.WriteString(line + "\n")
		}
	}
	switch {
	case a.otherProgram != "":
		fmt.Fprintf(&b, "  Charts and formats were not compared: %s has saved the report.\n", shortened(a.otherProgram, 30))
	case len(a.looks) > 0:
		b.WriteString("  Charts and formats differ:\n")
		for i, l := range a.looks {
			if i == mostNamed {
				fmt.Fprintf(&b, "    and %d more\n", len(a.looks)-mostNamed)
				break
			}
			b.WriteString("    " + shortened(l, 76) + "\n")
		}
	case !brief && wrong == 0:
		b.WriteString("  Charts and formats                                     agree\n")
	}
	switch {
	case wrong > 0:
		fmt.Fprintf(&b, "\n%s of %s cells: not what the case gives.\n", reports.Grouped(int64(wrong)), reports.Grouped(int64(total)))
	case len(a.looks) > 0:
		b.WriteString("\nEvery cell agrees, but it may be shown as something else.\n")
	case !brief:
		fmt.Fprintf(&b, "\nAll %s cells agree.\n", reports.Grouped(int64(total)))
	}
	return b.String()
}

// shortened is a text on one line of at most n characters, without what a
// terminal would act on.
func shortened(s string, n int) string {
	r := []rune(strings.Map(func(r rune) rune {
		if unicode.IsPrint(r) {
			return r
		}
		return ' '
	}, s))
	if len(r) > n {
		r = append(r[:n-3], '.', '.', '.')
	}
	return string(r)
}
