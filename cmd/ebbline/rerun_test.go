package main

import (
	"archive/zip"
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/pva/assess"
	"ebbline/pva/casefile"
	"ebbline/pva/casefile/examples"
	"ebbline/pva/casefile/sheet"
	"ebbline/reports"
	"ebbline/reports/workbook"
)

// pond is a small case of an invented place.
const pond = `[case]
title = "Otter pool, Nether Sallow (invented)"
counts = "adult otters"
[question]
threshold = 5
horizon = 10
limit = 0.20
[start]
abundance = 24
year = 2030
[births]
breeding = "pulse"
rate = { value = 0.4, source = "ringing 2019-2028" }
year_sd = 0.15
[deaths]
fraction = { value = 0.27, source = "assumed" }
year_sd = 0.06
[[harvest]]
name = "control"
rule = "constant"
take = 2
when = "end"
[run]
replicates = 500
seed = 7
[[option]]
name = "half the take"
set = { "harvest.control.take" = 1 }
`

// reported assesses a case file and gives the report's bytes.
func reported(t *testing.T, caseText string, args ...string) []byte {
	t.Helper()
	dir := t.TempDir()
	file := filepath.Join(dir, "pond.toml")
	if err := os.WriteFile(file, []byte(caseText), 0o666); err != nil {
		t.Fatal(err)
	}
	var errs bytes.Buffer
	if status := run(append([]string{"assess", file, "--quiet"}, args...), nil, io.Discard, &errs); status != statusDone {
		t.Fatalf("status %d: %s", status, errs.String())
	}
	data, err := os.ReadFile(filepath.Join(dir, "pond.xlsx"))
	if err != nil {
		t.Fatal(err)
	}
	return data
}

// rerunOf runs a report again; what it printed and its error.
func rerunOf(t *testing.T, data []byte) (string, error) {
	t.Helper()
	path := filepath.Join(t.TempDir(), "report.xlsx")
	if err := os.WriteFile(path, data, 0o666); err != nil {
		t.Fatal(err)
	}
	var out bytes.Buffer
	err := (&app{out: &out, errs: io.Discard}).rerun(path, 0, false)
	for _, line := range strings.Split(out.String(), "\n") {
		if len([]rune(line)) > 80 && !strings.Contains(line, path) && !strings.Contains(line, "sha256:") {
			t.Errorf("a line of %d characters: %s", len([]rune(line)), line)
		}
	}
	return out.String(), err
}

// TestRerunAgrees: reports of cases of different shapes are what their cases
// give: the built-in ones and those for tests.
func TestRerunAgrees(t *testing.T) {
	cases := map[string][]byte{}
	for _, name := range examples.Names() {
		data, err := examples.Get(name)
		if err != nil {
			t.Fatal(err)
		}
		cases[name] = data
	}
	for _, name := range []string{"events", "flow-every-key", "pulse-every-key", "same-plain"} {
		data, err := os.ReadFile(filepath.Join("..", "..", "testdata", "cases", name+".toml"))
		if err != nil {
			t.Fatal(err)
		}
		cases[name] = data
	}
	if len(cases) < 10 {
		t.Fatalf("only %d cases", len(cases))
	}
	for name, text := range cases {
		t.Run(name, func(t *testing.T) {
			out, err := rerunOf(t, reported(t, string(text), "--replicates", "130", "--no-exact"))
			if err != nil || !strings.Contains(out, "cells agree.") || strings.Contains(out, "differ") {
				t.Errorf("%v\n%s", err, out)
			}
		})
	}
}

// TestRerunRepeatsTheCommand: overrides, lists, quotes, a seed of 64 bits and
// the wish for an exact answer are found in the command line.
func TestRerunRepeatsTheCommand(t *testing.T) {
	data := reported(t, pond, "--set", "births.by_year=[1, 0.9]", "--set", "case.title=The keeper's pool, \"old\" & new", "--set", "harvest.control.years=2031-2033",
		"--seed", "18446744073709551615", "--replicates", "200", "--exact")
	out, err := rerunOf(t, data)
	if err != nil || !strings.Contains(out, "seed 18446744073709551615, 200 replicates") {
		t.Errorf("%v\n%s", err, out)
	}
	for _, line := range []string{"ebbline", "", "other assess x", "ebbline assess x 'y", "ebbline assess x --set", "ebbline assess x --seed -1", "ebbline assess x --what"} {
		if _, err := repeated(line); err == nil {
			t.Errorf("%q is read", line)
		}
	}
	if _, err := repeated("ebbline sweep x.toml"); err == nil || !strings.Contains(err.Error(), "rerun cannot repeat yet") {
		t.Error(err)
	}
	for _, s := range []string{"plain", "two words", "it's", `a"b\c`, "$x;`y`", "line\nbreak", "'", "''"} {
		words, ok := splitArgs("x " + quoteArg(s) + " y")
		if !ok || len(words) != 3 || words[1] != s {
			t.Errorf("%q comes back as %q", s, words)
		}
	}
}

// TestRerunInterrupted: a report of what was complete agrees with that part.
func TestRerunInterrupted(t *testing.T) {
	c, faults := casefile.Read("pond.toml", []byte(pond))
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	ctx, cancel := context.WithCancel(context.Background())
	result, err := assess.Run(ctx, c, assess.Options{Workers: 1, Progress: func(done int64) {
		if done >= 128 {
			cancel()
		}
	}})
	if err == nil || result.Replicates >= result.Asked {
		t.Fatalf("not interrupted: %v", err)
	}
	data, err := workbook.Bytes(reports.Build(result, meta(c, "pond.toml", "assess", "")))
	if err != nil {
		t.Fatal(err)
	}
	if out, err := rerunOf(t, data); err != nil {
		t.Errorf("%v\n%s", err, out)
	}
}

// edited is a workbook with the text of one part changed.
func edited(t *testing.T, data []byte, part string, change func(text string) string) []byte {
	t.Helper()
	z, err := zip.NewReader(bytes.NewReader(data), int64(len(data)))
	if err != nil {
		t.Fatal(err)
	}
	var b bytes.Buffer
	w := zip.NewWriter(&b)
	done := false
	for _, e := range z.File {
		r, err := e.Open()
		if err != nil {
			t.Fatal(err)
		}
		text, err := io.ReadAll(r)
		if err != nil {
			t.Fatal(err)
		}
		if e.Name == part {
			now := change(string(text))
			done = now != string(text)
			text = []byte(now)
		}
		out, err := w.Create(e.Name)
		if err == nil {
			_, err = out.Write(text)
		}
		if err != nil {
			t.Fatal(err)
		}
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	if !done {
		t.Fatalf("nothing was changed in %s", part)
	}
	return b.Bytes()
}

func swap(from, to string) func(string) string {
	return func(s string) string { return strings.Replace(s, from, to, 1) }
}

// TestRerunFindsEdits: whatever is changed in a report is found and named.
func TestRerunFindsEdits(t *testing.T) {
	data := reported(t, pond, "--no-exact")
	book, err := sheet.Open("pond.xlsx", data)
	if err != nil {
		t.Fatal(err)
	}
	const years = reports.PartRisk
	cells, err := book.Cells(years)
	if err != nil {
		t.Fatal(err)
	}
	part := book.SheetPart(years)
	var count, share, formula sheet.Cell
	for _, c := range cells {
		switch {
		case c.Kind != sheet.Number:
		case c.IsFormula && c.Num > 0 && c.Num < 1 && formula.Row == 0:
			formula = c
		case c.IsFormula && c.Num > 0 && c.Num < 1 && c.Row > formula.Row:
			share = c
		case !c.IsFormula && c.Num == float64(int64(c.Num)) && c.Num > 10 && c.Num < 400 && c.Row > 8:
			count = c
		}
	}
	if count.Row == 0 || share.Row == 0 || formula.Row == 0 {
		t.Fatalf("no cells to edit: %v %v %v", count, share, formula)
	}
	// valueTo puts another value into a cell.
	valueTo := func(c sheet.Cell, value string) func(string) string {
		return func(text string) string {
			return regexp.MustCompile(`(<c r="`+c.Ref()+`"[^>]*>(?:<f>[^<]*</f>)?<v>)[^<]*`).ReplaceAllString(text, "${1}"+value)
		}
	}
	digits := func(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
	named := func(c sheet.Cell) string { return years + "!" + c.Ref() + ": reported " }
	for _, e := range []struct {
		what, part string
		change     func(string) string
		want       string // "": agrees
	}{
		{"a count", part, valueTo(count, digits(count.Num+1)), named(count) + digits(count.Num+1) + ", run again " + digits(count.Num)},
		{"a count by a little", part, valueTo(count, digits(count.Num+1e-8)), named(count)},
		{"an interval", part, valueTo(share, digits(share.Num*(1+1e-8))), years + "!" + share.Ref()},
		{"an interval, as another processor gives it", part, valueTo(share, digits(share.Num*(1+1e-11))), ""},
		{"the value of a formula", part, valueTo(formula, digits(formula.Num/2)), years + "!" + formula.Ref()},
		{"a value taken out", part, func(s string) string {
			return regexp.MustCompile(`<c r="`+count.Ref()+`"[^>]*><v>[^<]*</v></c>`).ReplaceAllString(s, "")
		}, named(count) + "(nothing)"},
		{"a formula", part, func(s string) string {
			return regexp.MustCompile(`(<c r="`+formula.Ref()+`"[^>]*><f>)`).ReplaceAllString(s, "${1}0*")
		}, years + "!" + formula.Ref()},
		{"a formula made a value", part, func(s string) string {
			return regexp.MustCompile(`(<c r="`+formula.Ref()+`"[^>]*>)<f>[^<]*</f>`).ReplaceAllString(s, "${1}")
		}, years + "!" + formula.Ref()},
		{"a cell added", part, swap("</row></sheetData>", `<c r="ZZ99"><v>1</v></c></row></sheetData>`), ""},
		{"a hidden row", part, swap(`<row r="9"`, `<row r="9" hidden="1"`), "hidden parts of the sheet " + years},
		{"a text", "xl/sharedStrings.xml", swap("half the take", "half the takes"), `reported "half the takes"`},
		{"a number format", "xl/styles.xml", swap(`formatCode="#,##0"`, `formatCode="&quot;0&quot;"`), ""},
		{"a chart", "xl/charts/chart1.xml", swap("<c:v>0.2</c:v>", "<c:v>0.9</c:v>"), "a chart (xl/charts/chart1.xml)"},
		{"the name of a sheet", "xl/workbook.xml", swap(`name="Cautions"`, `name="Remarks"`), "no such sheet"},
		{"a line of the case", "xl/sharedStrings.xml", swap("take = 2", "take = 1"), "SHA-256"},
		{"the digest", "xl/sharedStrings.xml", swap(">sha256:", ">sha256:0"), "another digest than the one stated"},
		{"the seed", "xl/sharedStrings.xml", swap("<t>7</t>", "<t>8</t>"), "states seed 8, and carries a case of seed 7"},
	} {
		if e.what == "a cell added" { // its row must be the last one's
			last := cells[len(cells)-1]
			e.change, e.want = swap("</row></sheetData>", `<c r="ZZ`+strconv.Itoa(last.Row)+`"><v>1</v></c></row></sheetData>`), years+"!ZZ"+strconv.Itoa(last.Row)+": reported 1, run again (nothing)"
		}
		if e.what == "a number format" {
			e.change, e.want = func(s string) string {
				return regexp.MustCompile(`formatCode="[^"]*"`).ReplaceAllString(s, `formatCode="&quot;0&quot;"`)
			}, "the part xl/styles.xml"
		}
		out, err := rerunOf(t, edited(t, data, e.part, e.change))
		switch {
		case e.want == "" && err != nil:
			t.Errorf("%s: %v\n%s", e.what, err, out)
		case e.want != "" && (!errors.Is(err, errDisagrees) || !strings.Contains(out, e.want)):
			t.Errorf("%s: %v, want %q\n%s", e.what, err, e.want, out)
		}
	}
}

// TestRerunFindsAnotherCase: a case put in with a checksum that fits is found by
// its digest, and one with a digest that fits by every number.
func TestRerunFindsAnotherCase(t *testing.T) {
	data := reported(t, pond, "--no-exact")
	book, err := sheet.Open("pond.xlsx", data)
	if err != nil {
		t.Fatal(err)
	}
	said, err := sheet.Embedded(book)
	if err != nil {
		t.Fatal(err)
	}
	sum := func(s string) string {
		h := sha256.Sum256([]byte(strings.TrimSuffix(s, "\n")))
		return hex.EncodeToString(h[:])
	}
	lesser := strings.Replace(said.CaseText, "take = 2", "take = 1", 1)
	forge := func(s string) string {
		s = strings.Replace(s, "take = 2", "take = 1", 1)
		return strings.Replace(s, sum(said.CaseText), sum(lesser), 1)
	}
	out, err := rerunOf(t, edited(t, data, "xl/sharedStrings.xml", forge))
	if !errors.Is(err, errDisagrees) || !strings.Contains(out, "another digest") {
		t.Errorf("%v\n%s", err, out)
	}
	c, faults := casefile.Read("x", []byte(lesser))
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	out, err = rerunOf(t, edited(t, data, "xl/sharedStrings.xml", func(s string) string {
		return strings.ReplaceAll(forge(s), said.Digest, c.Digest())
	}))
	if !errors.Is(err, errDisagrees) || !strings.Contains(out, "Inputs!B") || !strings.Contains(out, "Answer!") || !strings.Contains(out, " more\n") {
		t.Errorf("%v\n%s", err, out)
	}
}

// TestRerunOtherVersion: a report of another version says so, and its numbers
// are compared all the same.
func TestRerunOtherVersion(t *testing.T) {
	c, faults := casefile.Read("pond.toml", []byte(pond))
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	result, err := assess.Run(context.Background(), c, assess.Options{Exact: assess.ExactNever})
	if err != nil {
		t.Fatal(err)
	}
	about := meta(c, "pond.toml", "assess", "")
	about.Version = "0.0.9"
	about.Command += exactFlag(assess.ExactNever)
	data, err := workbook.Bytes(reports.Build(result, about))
	if err != nil {
		t.Fatal(err)
	}
	out, err := rerunOf(t, data)
	if err != nil || !strings.Contains(out, "This is version "+pva.Version) || !strings.Contains(out, "ebbline 0.0.9") {
		t.Errorf("%v\n%s", err, out)
	}
}

// TestRerunRefuses: what is no report is bad input, not disagreement.
func TestRerunRefuses(t *testing.T) {
	starter, err := sheet.Starter()
	if err != nil {
		t.Fatal(err)
	}
	for want, data := range map[string][]byte{"is not a workbook": []byte("x"), `has no sheet "Run again"`: starter} {
		_, err := rerunOf(t, data)
		if bad := (badInput{}); !errors.As(err, &bad) || !strings.Contains(err.Error(), want) {
			t.Errorf("%v, want %q", err, want)
		}
	}
	if err := (&app{out: io.Discard}).rerun("pond.toml", 0, false); err == nil || !strings.Contains(err.Error(), "reports end in .xlsx") {
		t.Error(err)
	}
}

// TestReportIsACase: the Inputs sheet of a report is the report's case, whatever
// its shape; changed, it is the changed case.
func TestReportIsACase(t *testing.T) {
	for _, name := range examples.Names() {
		text, err := examples.Get(name)
		if err != nil {
			t.Fatal(err)
		}
		want, faults := casefile.Read(name, text)
		if len(faults) > 0 {
			t.Fatal(faults)
		}
		got, faults := sheet.Read(name+".xlsx", reported(t, string(text), "--set", "run.replicates="+fmt.Sprint(64), "--no-exact"))
		if len(faults) > 0 {
			t.Errorf("%s: %v", name, faults)
		} else if got.Digest() != want.Digest() || got.Run.Replicates != 64 || got.Run.Seed != want.Run.Seed {
			t.Errorf("%s: comes back as another case:\n%s\n%s", name, casefile.Write(got), casefile.Write(want))
		}
	}
	data := reported(t, pond, "--no-exact")
	book, err := sheet.Open("pond.xlsx", data)
	if err != nil {
		t.Fatal(err)
	}
	part := book.SheetPart(sheet.InputsSheet)
	c, faults := sheet.Read("pond.xlsx", edited(t, data, part, func(s string) string {
		return regexp.MustCompile(`(<c r="B[0-9]+"[^>]*><v>)0\.4(</v>)`).ReplaceAllString(s, "${1}0.6${2}")
	}))
	if len(faults) > 0 || c.Births.Rate != 0.6 {
		t.Errorf("%v", faults)
	}
}
