package casefile

import (
	"fmt"
	"strings"
	"testing"

	"ebbline/pva"
)

// TestRowsKeepTheCase: each case as rows of a sheet is read as the same case.
func TestRowsKeepTheCase(t *testing.T) {
	for name, data := range goodCases(t) {
		t.Run(name, func(t *testing.T) {
			c := mustRead(t, name, data)
			rows := ToRows(c)
			again, errs := FromRows("case.xlsx", rows)
			if len(errs) > 0 {
				t.Fatal(errs)
			}
			sameCase(t, c, again)
		})
	}
}

// sheet makes rows from lines of key | value | source; a value in quotes is a
// text cell, true and false are flags, all else is a number cell if it can be.
func sheet(text string) []Row {
	var rows []Row
	for i, line := range strings.Split(strings.TrimSpace(text), "\n") {
		parts := strings.SplitN(line+"||", "|", 4)
		row := Row{Sheet: "Inputs", Row: i + 2, Key: strings.TrimSpace(parts[0]), Source: strings.TrimSpace(parts[2])}
		switch v := strings.TrimSpace(parts[1]); {
		case strings.HasPrefix(v, `"`):
			row.Value = pva.Text(strings.Trim(v, `"`))
		case v == "true" || v == "false":
			row.Value = pva.Flag(v == "true")
		default:
			if n, ok := parseNumber(v); ok {
				row.Value = pva.Num(n)
			} else {
				row.Value = pva.Text(v)
			}
		}
		rows = append(rows, row)
	}
	return rows
}

const smallSheet = `question.threshold | 20
question.horizon | 50
start.abundance | 180 | Assumed
births.breeding | pulse
births.rate | "0.45" | a survey
deaths.fraction | 0.27
harvest.control.take | 8
harvest.control.rule | constant
harvest.control.when | end
harvest.control.years | 5
run.baseline | "TRUE"
| |
option.half.set.harvest.control.take | 4
option.half.set.births.by_year | (list)
option.half.set.births.by_year.1 | 1
option.half.set.births.by_year.2 | 0.9
`

func TestFromRows(t *testing.T) {
	c, errs := FromRows("heron.xlsx", sheet(smallSheet))
	if len(errs) > 0 {
		t.Fatal(errs)
	}
	same := mustRead(t, "same", []byte(`[question]
threshold = 20
horizon = 50
[start]
abundance = { value = 180, source = "assumed" }
[births]
breeding = "pulse"
rate = { value = 0.45, source = "a survey" }
[deaths]
fraction = 0.27
[[harvest]]
name = "control"
rule = "constant"
take = 8
when = "end"
years = 5
[run]
baseline = true
[[option]]
name = "half"
set = { "harvest.control.take" = 4, "births.by_year" = [1, 0.9] }
`))
	sameCase(t, same, c)
}

// TestRowFaults: what is wrong with a sheet is named by cell, all at once.
func TestRowFaults(t *testing.T) {
	change := func(from, to string) []Row {
		if !strings.Contains(smallSheet, from) {
			t.Fatalf("no %q in the sheet", from)
		}
		return sheet(strings.Replace(smallSheet, from, to, 1))
	}
	for _, c := range []struct {
		rows []Row
		want string
	}{
		{change(`"0.45"`, "-0.4"), "heron.xlsx:Inputs!B6: births.rate: -0.4 is below 0; give a number, 0 or more: births per head (or per 100, 1000) a year"},
		{change(`"0.45"`, `"0,45"`), `heron.xlsx:Inputs!B6: births.rate: "0,45" is not a number; write a point for the decimal comma`},
		{change(`"0.45"`, `"much"`), `heron.xlsx:Inputs!B6: births.rate: "much" is not a number; give a number, 0 or more: births per head (or per 100, 1000) a year`},
		{change(`"0.45"`, `""`), "heron.xlsx:Inputs!B6: births.rate: has no value; fill the cell or remove the row"},
		{change("births.rate |", "births.rat |"), "heron.xlsx:Inputs!A6: births.rat: is not a key of a case; did you mean births.rate?"},
		{change("births.rate |", " |"), `heron.xlsx:Inputs!A5: births.rate: is missing; give a number, 0 or more: births per head (or per 100, 1000) a year` + "\n" + `heron.xlsx:Inputs!A6: 0.45 has no key; name the key in column A`},
		{change("births.rate | \"0.45\" | a survey\n", ""), "heron.xlsx:Inputs!A5: births.rate: is missing; give a number, 0 or more: births per head (or per 100, 1000) a year"},
		{change("deaths.fraction | 0.27\n", "deaths.fraction | 0.27\nDEATHS.fraction | 0.3\n"), "heron.xlsx:Inputs!A8: DEATHS: is not a table of a case; did you mean [deaths]?"},
		{change("deaths.fraction | 0.27\n", "deaths.fraction | 0.27\ndeaths.fraction | 0.3\n"), "heron.xlsx:Inputs!A8: deaths.fraction: 0.3 is given twice (also as 0.27); keep one of them"},
		// Row 1 and the row named control are two rows.
		{change("harvest.control.rule |", "harvest.1.rule |"), `heron.xlsx:Inputs!A8: harvest.control.rule: is missing; give "constant", "fraction", "above", "ladder" or "by_year": how the take is set` + "\n" +
			`heron.xlsx:Inputs!A9: harvest.1.when: is missing; give "start", "end" or "through": when in the year` + "\n" + `heron.xlsx:Inputs!A9: harvest.1.take: is missing; rule = "constant" needs it`},
		{change("harvest.control.rule |", "harvest.3.rule |"), "heron.xlsx:Inputs!A8: harvest.1: is missing; number them 1, 2, 3 without gaps: the case has harvest.3.rule"},
		{change("option.half.set.births.by_year.1 | 1\n", ""), "heron.xlsx:Inputs!A15: option.half.set: births.by_year.1: is missing; number them 1, 2, 3 without gaps: the case has births.by_year.2"},
		{change("births.breeding | pulse", "births.breeding | true"), `heron.xlsx:Inputs!B5: births.breeding: true is not a text; give "pulse" or "flow": births once a year (pulse) or through the year (flow)`},
		{nil, "question.threshold"},
	} {
		_, errs := FromRows("heron.xlsx", c.rows)
		got := errs.Error()
		if c.rows == nil {
			if len(errs) != 6 || !strings.HasPrefix(got, "heron.xlsx: question.threshold: is missing") {
				t.Errorf("no rows give %s", got)
			}
			continue
		}
		if got != c.want {
			t.Errorf("got  %s\nwant %s", got, c.want)
		}
	}
}

// TestRowErrorsAreCapped: 51 faults print 50 and say that there is one more.
func TestRowErrorsAreCapped(t *testing.T) {
	rows := sheet(smallSheet)
	for i := range 51 {
		rows = append(rows, Row{Sheet: "Inputs", Row: 30 + i, Key: fmt.Sprintf("nonsense%d.x", i), Value: pva.Num(1)})
	}
	_, errs := FromRows("heron.xlsx", rows)
	lines := strings.Split(errs.Error(), "\n")
	if len(errs) != 51 || len(lines) != 51 || lines[50] != "(and 1 more)" {
		t.Errorf("%d errors in %d lines, the last %q", len(errs), len(lines), lines[len(lines)-1])
	}
}
