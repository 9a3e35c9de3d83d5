package fit

import (
	"fmt"
	"math"
	"strings"

	"ebbline/pva"
)

// Cell is one cell of a table of counts.
type Cell struct {
	Text string // what it holds; "" is blank
	// Want says what is wrong with a cell that holds nothing to be read (a
	// date, a formula without a value), Fix what to do; "" if nothing is.
	Want, Fix string
}

// ReadRows reads a series of counts from a table whose columns are those of
// Read: the first row that is not blank is the header. Numbers have a decimal
// point. Cell (row, column), both from 0, is called place(row, column) in the
// faults, which come together. What a column note holds is not looked at.
func ReadRows(name string, rows [][]Cell, place func(row, column int) string) (*Series, error) {
	r := &reading{name: name, at: map[string]int{}}
	t := table{r: r, s: &Series{File: name, TimeUnit: "year"}}
	for i, row := range rows {
		if !t.take(row, func(col int) spot { return spot{cell: place(i, col)} }) {
			break
		}
	}
	return t.series()
}

// table is a header with its rows on their way to a series.
type table struct {
	r      *reading
	s      *Series
	header bool
	broken bool // the header cannot be read, and so nothing below it
	rows   int
}

// take reads the next row; place is where its columns stand, and where one
// would stand that it lacks. It says whether the next row is to be read.
func (t *table) take(row []Cell, place func(int) spot) bool {
	if blank(row) {
		return true
	}
	if !t.header {
		t.header = true
		t.broken = !t.r.header(t.s, row, place)
		return !t.broken
	}
	if t.rows++; t.rows > mostCounts {
		t.r.fail(place(0), "", "", fmt.Sprintf("more than %d rows", mostCounts), "a series holds one count a year")
		return false
	}
	t.r.row(t.s, row, place)
	return true
}

// series is what was read, or all that is wrong with it.
func (t *table) series() (*Series, error) {
	switch {
	case t.broken:
		return nil, t.r.faults
	case len(t.r.faults) > 0:
	case !t.header:
		t.r.fail(spot{}, "", "", "there is no header row", "give a first row year,count")
	case t.rows == 0:
		t.r.fail(spot{}, "", "", "there are no counts", "give a row for each count")
	}
	t.r.order(t.s)
	if len(t.r.faults) > 0 {
		return nil, t.r.faults
	}
	return t.s, nil
}

func (c Cell) blank() bool { return c.Want == "" && strings.TrimSpace(c.Text) == "" }

func blank(row []Cell) bool {
	for _, c := range row {
		if !c.blank() {
			return false
		}
	}
	return true
}

func (r *reading) header(s *Series, row []Cell, place func(int) spot) bool {
	known := append(append([]string{}, timeWords...), otherCols...)
	date := ""
	for i, cell := range row {
		name := strings.ToLower(strings.TrimSpace(cell.Text))
		isTime := contains(timeWords, name)
		switch {
		case cell.Want != "":
			r.fail(place(i), "", cell.Text, cell.Want, cell.Fix)
		case name == "":
			continue
		case !isTime && !contains(otherCols, name):
			fix := "name it year, count, se, cv or effort, or note if it is not to be read"
			if near := pva.Nearest(name, known); near != "" {
				fix = "did you mean " + near + "?"
			}
			r.fail(place(i), "", cell.Text, "is no column of a series of counts", fix)
		case isTime && date != "":
			r.fail(place(i), "", cell.Text, "is a second column of dates beside "+date, "keep one of them")
		case r.has(name):
			r.fail(place(i), "", cell.Text, "is a column given twice", "keep one of them")
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
	switch {
	case len(r.faults) > 0:
	case !r.has("year"):
		r.fail(place(0), "", "", "there is no column year", "give a first row year,count")
	case !r.has("count"):
		r.fail(place(0), "", "", "there is no column count", "give a first row year,count")
	case r.has("se") && r.has("cv"):
		r.fail(place(r.at["cv"]), "", "cv", "is given beside se", "keep one of them")
	}
	s.Errors = r.has("se") || r.has("cv")
	s.Effort = r.has("effort")
	return len(r.faults) == 0
}

func (r *reading) has(name string) bool { _, ok := r.at[name]; return ok }

func (r *reading) row(s *Series, row []Cell, place func(int) spot) {
	before := len(r.faults)
	for i, c := range row {
		if !c.blank() && !r.named(i) {
			r.fail(place(i), "", c.Text, "stands under no column", "give a decimal number with a point, and as many cells as the header has")
			return
		}
	}
	cell := func(name string) (Cell, spot) {
		i := r.at[name]
		if i >= len(row) {
			return Cell{}, place(i)
		}
		c := row[i]
		c.Text = strings.TrimSpace(c.Text)
		return c, place(i)
	}
	number := func(name string, low, high float64, want string) float64 {
		c, at := cell(name)
		switch {
		case c.Want != "":
			r.fail(at, name, c.Text, c.Want, c.Fix)
			return math.NaN()
		case c.Text == "":
			r.fail(at, name, "", "is missing", "give "+want)
			return math.NaN()
		}
		v, err := r.number(c.Text)
		switch {
		case r.semi && grouped.MatchString(c.Text):
			r.fail(at, name, c.Text, "may be in thousands or a decimal number", "write "+strings.ReplaceAll(c.Text, ".", "")+", or "+strings.Replace(c.Text, ".", ",", 1)+" with a decimal comma")
		case err != nil && !r.comma && decimalComma.MatchString(c.Text):
			r.fail(at, name, c.Text, "is not a number here", "write it with a decimal point, or part the columns by semicolons: beside those a decimal comma is read")
		case err != nil:
			r.fail(at, name, c.Text, "is not a number", "give "+want)
		case !(v >= low && v <= high):
			r.fail(at, name, c.Text, fmt.Sprintf("is not between %g and %g", low, high), "give "+want)
		case v != 0 && math.Abs(v) < tiniest:
			r.fail(at, name, c.Text, fmt.Sprintf("is nearer to 0 than %g", tiniest), "give "+want)
		}
		return v
	}
	c := Count{Year: number("year", -latest, latest, "the date of the count")}
	if counted, _ := cell("count"); counted.blank() || strings.EqualFold(counted.Text, "na") || counted.Text == "-" {
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
