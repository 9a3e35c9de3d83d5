package fit

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"sort"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"ebbline/pva"
)

// The limits keep a hostile file from costing more than a second.
const (
	largestFile = 1 << 20 // bytes
	mostCounts  = 1000
	mostFaults  = 50
	largest     = 1e12 // no population beyond this, as in a case
	latest      = 1e6  // no date beyond this
)

// Fault is one thing wrong with a file of counts, with its place.
type Fault struct {
	File         string
	Line, Column int // from 1, the column in characters; 0 is the file as a whole
	Name         string
	Value        string
	Want, Fix    string
}

// Error is the fault on one line: place, column name, value, what is wrong, the fix.
func (f Fault) Error() string {
	var b strings.Builder
	b.WriteString(f.File)
	if f.Line > 0 {
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
	at     map[string]int
}

func (r *reading) fail(line, col int, name, value, want, fix string) {
	r.faults = append(r.faults, Fault{r.name, line, col, name, value, want, fix})
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
		return nil, Faults{{File: name, Want: "the file is a workbook or archive, not CSV text", Fix: "save its sheet of counts as CSV"}}
	case len(bytes.TrimSpace(data)) == 0:
		return nil, Faults{{File: name, Want: "the file is empty", Fix: "give a header row year,count and a row for each count"}}
	}
	text := strings.ReplaceAll(strings.ReplaceAll(string(data), "\r\n", "\n"), "\r", "\n")
	r.lines = strings.Split(text, "\n")
	p := csv.NewReader(strings.NewReader(text))
	p.FieldsPerRecord, p.TrimLeadingSpace, p.ReuseRecord = -1, true, true
	p.Comma = separator(text)
	p.Comment = '#'
	r.comma = p.Comma != ','
	s := &Series{File: name, TimeUnit: "year"}
	header := false
	rows := 0
	for {
		row, err := p.Read()
		if errors.Is(err, io.EOF) {
			break
		}
		var broken *csv.ParseError
		if errors.As(err, &broken) {
			r.fail(broken.Line, r.column(broken.Line, broken.Column), "", "", "a quote is out of place", `put a whole field in quotes or none of it`)
			break
		}
		if err != nil {
			return nil, fmt.Errorf("fit: %s: %w", name, err)
		}
		place := func(i int) (int, int) {
			line, col := p.FieldPos(i)
			return line, r.column(line, col)
		}
		if !header {
			header = true
			if !r.header(s, row, place) {
				return nil, r.faults
			}
			continue
		}
		if blank(row) {
			continue
		}
		if rows++; rows > mostCounts {
			line, _ := place(0)
			r.fail(line, 1, "", "", fmt.Sprintf("more than %d rows", mostCounts), "a series holds one count a year")
			break
		}
		r.row(s, row, place)
	}
	if !header {
		r.fail(0, 0, "", "", "there is no header row", "give a first row year,count")
	} else if rows == 0 && len(r.faults) == 0 {
		r.fail(0, 0, "", "", "there are no counts", "give a row for each count")
	}
	r.order(s)
	if len(r.faults) > 0 {
		return nil, r.faults
	}
	return s, nil
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

func blank(row []string) bool { return strings.TrimSpace(strings.Join(row, "")) == "" }

func (r *reading) header(s *Series, row []string, place func(int) (int, int)) bool {
	known := append(append([]string{}, timeWords...), otherCols...)
	date := ""
	for i, cell := range row {
		name := strings.ToLower(strings.TrimSpace(cell))
		line, col := place(i)
		isTime := contains(timeWords, name)
		switch {
		case name == "":
			continue
		case !isTime && !contains(otherCols, name):
			fix := "name it year, count, se, cv or effort, or note if it is not to be read"
			if near := pva.Nearest(name, known); near != "" {
				fix = "did you mean " + near + "?"
			}
			r.fail(line, col, "", cell, "is no column of a series of counts", fix)
		case isTime && date != "":
			r.fail(line, col, "", cell, "is a second column of dates beside "+date, "keep one of them")
		case r.has(name):
			r.fail(line, col, "", cell, "is a column given twice", "keep one of them")
		default:
			if isTime {
				date, s.TimeUnit = name, name
				if name == "time" {
					s.TimeUnit = "year"
				}
				name = "year"
			}
			r.at[name] = i
		}
	}
	line, _ := place(0)
	switch {
	case len(r.faults) > 0:
	case !r.has("year"):
		r.fail(line, 1, "", "", "there is no column year", "give a first row year,count")
	case !r.has("count"):
		r.fail(line, 1, "", "", "there is no column count", "give a first row year,count")
	case r.has("se") && r.has("cv"):
		l, c := place(r.at["cv"])
		r.fail(l, c, "", "cv", "is given beside se", "keep one of them")
	}
	s.Errors = r.has("se") || r.has("cv")
	s.Effort = r.has("effort")
	return len(r.faults) == 0
}

func (r *reading) has(name string) bool { _, ok := r.at[name]; return ok }

func (r *reading) row(s *Series, row []string, place func(int) (int, int)) {
	before := len(r.faults)
	cell := func(name string) (text string, line, col int) {
		i, ok := r.at[name]
		if !ok || i >= len(row) {
			line, _ = place(0)
			return "", line, utf8.RuneCountInString(r.lines[line-1]) + 1
		}
		line, col = place(i)
		return strings.TrimSpace(row[i]), line, col
	}
	if len(row) > 0 {
		for i := range row {
			if strings.TrimSpace(row[i]) != "" && !r.named(i) {
				line, col := place(i)
				r.fail(line, col, "", row[i], "stands under no column", "give a decimal number with a point, and as many cells as the header has")
				return
			}
		}
	}
	number := func(name string, low, high float64, want string) float64 {
		text, line, col := cell(name)
		if text == "" {
			r.fail(line, col, name, "", "is missing", "give "+want)
			return math.NaN()
		}
		v, err := r.number(text)
		switch {
		case err != nil:
			r.fail(line, col, name, text, "is not a number", "give "+want)
		case !(v >= low && v <= high):
			r.fail(line, col, name, text, fmt.Sprintf("is not between %g and %g", low, high), "give "+want)
		}
		return v
	}
	c := Count{Year: number("year", -latest, latest, "the date of the count")}
	if text, _, _ := cell("count"); text == "" || strings.EqualFold(text, "na") || text == "-" {
		if len(r.faults) == before {
			s.NotCounted++
		}
		return
	}
	c.Count = number("count", 0, largest, "a count of 0 or more, or leave it empty if nobody counted")
	switch {
	case r.has("cv"):
		c.CV = number("cv", 0, 10, "the coefficient of variation of the count, 0.2 for 20 %")
	case r.has("se"):
		if se := number("se", 0, largest, "the standard error of the count"); c.Count > 0 {
			c.CV = se / c.Count
		}
	}
	if r.has("effort") {
		c.Effort = number("effort", 1e-9, largest, "the effort of the count, above 0")
	}
	if len(r.faults) == before {
		s.Counts = append(s.Counts, c)
	}
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
			r.fail(0, 0, "year", dateText(s.Counts[i].Year), "is given twice", "keep one count a date, or join counts of parts into one")
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
