package fit

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"regexp"
	"sort"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// The limits keep a hostile file from costing more than a second.
const (
	largestFile = 1 << 20 // bytes
	mostCounts  = 1000
	mostFaults  = 50
	largest     = 1e12  // no population beyond this, as in a case
	latest      = 1e6   // no date beyond this
	tiniest     = 1e-30 // no number but 0 nearer to 0, as in a case
)

// Fault is one thing wrong with a file of counts, with its place.
type Fault struct {
	File         string
	Line, Column int    // from 1, the column in characters; 0 is the file as a whole
	Cell         string // "Counts!B7" where the counts came from a workbook
	Name         string
	Value        string
	Want, Fix    string
}

// Error is the fault on one line: place, column name, value, what is wrong, the fix.
func (f Fault) Error() string {
	var b strings.Builder
	b.WriteString(f.File)
	switch {
	case f.Cell != "":
		b.WriteString(":" + f.Cell)
	case f.Line > 0:
		fmt.Fprintf(&b, ":%d:%d", f.Line, f.Column)
	}
	b.WriteString(": ")
	if f.Name != "" {
		b.WriteString(f.Name + ": ")
	}
	if f.Value != "" {
		b.WriteString(strconv.Quote(shortened(f.Value)) + " ")
	}
	b.WriteString(f.Want)
	if f.Fix != "" {
		b.WriteString("; " + f.Fix)
	}
	return strings.Map(func(r rune) rune {
		if unicode.IsPrint(r) {
			return r
		}
		return '?'
	}, b.String())
}

// Faults is all that is wrong with a file, in its order.
type Faults []Fault

func (fs Faults) Error() string {
	lines := make([]string, 0, len(fs))
	for i, f := range fs {
		if i == mostFaults {
			lines = append(lines, fmt.Sprintf("(and %d more)", len(fs)-mostFaults))
			break
		}
		lines = append(lines, f.Error())
	}
	return strings.Join(lines, "\n")
}

func shortened(s string) string {
	if r := []rune(s); len(r) > 60 {
		return string(r[:59]) + "…"
	}
	return s
}

// columns known in a file of counts; the first of timeWords found is the date.
var (
	timeWords = []string{"year", "season", "generation", "month", "week", "day", "hour", "time"}
	otherCols = []string{"count", "se", "cv", "effort", "note"}
)

// reading is a file on its way to a series.
type reading struct {
	name   string
	lines  []string
	faults Faults
	comma  bool // decimals may be written with a comma
	semi   bool // columns are parted by semicolons, as where decimals have a comma
	at     map[string]int
}

// spot is a place in the file: a line and column, or a cell of a workbook.
type spot struct {
	line, column int
	cell         string
}

func (r *reading) fail(at spot, name, value, want, fix string) {
	r.faults = append(r.faults, Fault{r.name, at.line, at.column, at.cell, name, value, want, fix})
}

// Read reads a series of counts from CSV: a header row with year and count, and
// optionally se or cv (the count's own error, in the count's units or as a
// fraction), effort and note; one row a count. Columns are parted by commas,
// semicolons or tabs (a decimal comma is read beside the latter two). An empty
// count, or NA, is a year without a count. In place of year the date may be a
// season, month or other unit. All faults come together.
func Read(name string, data []byte) (*Series, error) {
	r := &reading{name: name, at: map[string]int{}}
	data = bytes.TrimPrefix(data, []byte("\xef\xbb\xbf"))
	switch {
	case len(data) > largestFile:
		return nil, Faults{{File: name, Want: fmt.Sprintf("the file is larger than %d MB", largestFile>>20), Fix: "a series of counts is a few thousand bytes"}}
	case bytes.HasPrefix(data, []byte("\xff\xfe")) || bytes.HasPrefix(data, []byte("\xfe\xff")) || !utf8.Valid(data):
		return nil, Faults{{File: name, Want: "the file is not UTF-8 text", Fix: "save it as CSV in UTF-8"}}
	case bytes.HasPrefix(data, []byte("PK\x03\x04")):
		return nil, Faults{{File: name, Want: "the file is a workbook or archive, not CSV text", Fix: "give it a name that ends in .xlsx, or save its sheet of counts as CSV"}}
	case len(bytes.TrimSpace(data)) == 0:
		return nil, Faults{{File: name, Want: "the file is empty", Fix: "give a header row year,count and a row for each count"}}
	}
	text := strings.ReplaceAll(strings.ReplaceAll(string(data), "\r\n", "\n"), "\r", "\n")
	r.lines = strings.Split(text, "\n")
	p := csv.NewReader(strings.NewReader(text))
	p.FieldsPerRecord, p.TrimLeadingSpace, p.ReuseRecord = -1, true, true
	p.Comma = separator(text)
	p.Comment = '#'
	r.comma, r.semi = p.Comma != ',', p.Comma == ';'
	s := &Series{File: name, TimeUnit: "year"}
	t := table{r: r, s: s}
	for {
		row, err := p.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		var broken *csv.ParseError
		if errors.As(err, &broken) {
			r.fail(spot{line: broken.Line, column: r.column(broken.Line, broken.Column)}, "", "", "a quote is out of place", `put a whole field in quotes or none of it`)
			break
		}
		if err != nil {
			return nil, fmt.Errorf("fit: %s: %w", name, err)
		}
		cells := make([]Cell, len(row))
		for i := range row {
			cells[i].Text = row[i]
		}
		more := t.take(cells, func(i int) spot {
			if i >= len(row) { // the end of the line
				line, _ := p.FieldPos(0)
				return spot{line: line, column: utf8.RuneCountInString(r.lines[line-1]) + 1}
			}
			line, col := p.FieldPos(i)
			return spot{line: line, column: r.column(line, col)}
		})
		if !more {
			break
		}
	}
	return t.series()
}

// separator is what parts the columns of the header.
func separator(text string) rune {
	for _, line := range strings.Split(text, "\n") {
		if strings.HasPrefix(line, "#") || strings.TrimSpace(line) == "" {
			continue
		}
		switch {
		case strings.Contains(line, ";"):
			return ';'
		case strings.Contains(line, "\t"):
			return '\t'
		}
		return ','
	}
	return ','
}

// column turns a place in bytes into one in characters.
func (r *reading) column(line, col int) int {
	if line < 1 || line > len(r.lines) {
		return max(col, 1)
	}
	s := r.lines[line-1]
	return utf8.RuneCountInString(s[:min(max(col-1, 0), len(s))]) + 1
}

// named says whether column i of the header has a name that is known.
func (r *reading) named(i int) bool {
	for _, at := range r.at {
		if at == i {
			return true
		}
	}
	return false
}

// grouped is a number in groups of three, as 1.200 is where decimals have a comma.
var grouped = regexp.MustCompile(`^[1-9][0-9]{0,2}(\.[0-9]{3})+$`)

// decimalComma is a number with one.
var decimalComma = regexp.MustCompile(`^[0-9]+,[0-9]+$`)

// number reads a decimal number; nothing else that a parser would take.
func (r *reading) number(s string) (float64, error) {
	if r.comma && strings.Count(s, ",") == 1 && !strings.Contains(s, ".") {
		s = strings.Replace(s, ",", ".", 1)
	}
	if s == "" || strings.Trim(s, "0123456789.+-eE") != "" || len(s) > 40 {
		return 0, strconv.ErrSyntax
	}
	v, err := strconv.ParseFloat(s, 64)
	if err != nil {
		return 0, err
	}
	return v, nil
}

// order sorts by date and faults dates that are given twice or lie too close.
func (r *reading) order(s *Series) {
	sort.SliceStable(s.Counts, func(i, j int) bool { return s.Counts[i].Year < s.Counts[j].Year })
	for i := 1; i < len(s.Counts); i++ {
		if s.Counts[i].Year-s.Counts[i-1].Year < 1e-3 {
			r.fail(spot{}, "year", dateText(s.Counts[i].Year), "is given twice", "keep one count a date, or join counts of parts into one")
		}
	}
}

func contains(list []string, s string) bool {
	for _, x := range list {
		if x == s {
			return true
		}
	}
	return false
}
