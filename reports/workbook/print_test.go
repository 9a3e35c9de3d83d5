package workbook

import (
	"strings"
	"testing"

	"github.com/xuri/excelize/v2"

	"ebbline/reports"
	"ebbline/reports/internal/invented"
)

// TestLargeFigureIsTheVerdicts: with an exact answer the large figure is that.
func TestLargeFigureIsTheVerdicts(t *testing.T) {
	for _, exact := range []bool{true, false} {
		a := invented.Assessment(invented.Case(), 1000)
		want := a.Outcome.Risk.Estimate
		if exact {
			invented.Exact(a)
			want = a.Exact.Risk
		}
		f := open(t, bytesOf(t, reports.Build(a, reports.Meta{Version: "0.1.0", CaseText: "x = 1\n"})))
		got, err := f.GetCellValue(reports.PartAnswer, cellName(1, rowBig), excelize.Options{RawCellValue: true})
		if err != nil || got != exactText(want) {
			t.Errorf("exact %v: the large figure is %s, not %v", exact, got, want)
		}
	}
}

func exactText(v float64) string { return exact(v) }

// TestPercentFormats: numbers look in a cell as Show writes them.
func TestPercentFormats(t *testing.T) {
	pct, pts := reports.Format{Kind: reports.Percents, Digits: 1}, reports.Format{Kind: reports.Points, Digits: 3}
	for _, c := range []struct {
		f    reports.Format
		v    float64
		want string
	}{
		{pct, 0.0712, `[=0]0\ %;[=1]0\ %;0.0\ %`}, {pct, 0.0005, `[=0]0\ %;[=1]0\ %;0.00\ %`},
		{pct, 0.00456, `[=0]0\ %;[=1]0\ %;0.00\ %`}, {pct, 1e-12, `"<0.000001 %"`},
		{pts, -0.0002, "[>=0.0005]+0.000;[<=-0.0005]-0.000;0"},
	} {
		if got := numberFormat(c.f, c.v); got != c.want {
			t.Errorf("%v is written by %s, not %s", c.v, got, c.want)
		}
	}
}

// TestCaseLinesAreWhole: the row of a long line of the case is as high as its
// text, whose face has one width: 0.6 of the size (Courier), so that 100 digits
// of 0.556 hold 92 characters.
func TestCaseLinesAreWhole(t *testing.T) {
	for _, c := range []struct {
		n, want int
	}{{10, 1}, {92, 1}, {93, 2}, {2400, 27}} {
		if got := monoLines(strings.Repeat("x", c.n), 100); got != c.want {
			t.Errorf("%d characters take %d lines, not %d", c.n, got, c.want)
		}
	}
	if got := monoLines(strings.Repeat("x", 60)+" "+strings.Repeat("y", 60), 100); got != 2 {
		t.Errorf("two words take %d lines", got)
	}
	a := invented.Assessment(invented.Case(), 100)
	r := reports.Build(a, reports.Meta{Version: "0.1.0", CaseText: "short = 1\nlong = \"" + strings.Repeat("abc ", 500) + "\"\n"})
	f := open(t, bytesOf(t, r))
	p := placesOf(r)["case_text"]
	short, _ := f.GetRowHeight(p.sheet, p.head+1)
	long, _ := f.GetRowHeight(p.sheet, p.head+2)
	if lines := (long - 1.8) / lineHeight; short > 1.5*lineHeight || lines < 2006.0/92 || long > 409 {
		t.Errorf("the rows are %v and %v high", short, long)
	}
}

// TestHeadingsStayWithTheirText: a heading that would stand alone at the foot of
// a page gets a break before it, one that has room does not.
func TestHeadingsStayWithTheirText(t *testing.T) {
	broken := func(heading int) bool {
		f := excelize.NewFile()
		defer f.Close()
		b := &book{f: f}
		b.breakBefore("Sheet1", []block{{heading, heading + 2}}, 60, 100, 0)
		if b.err != nil {
			t.Fatal(b.err)
		}
		data, err := f.WriteToBuffer()
		if err != nil {
			t.Fatal(err)
		}
		return strings.Contains(unzip(t, data.Bytes())["xl/worksheets/sheet1.xml"], "<rowBreaks")
	}
	// Rows are 15 points high and a page takes 487 points: 32 rows, or 31 to be
	// on the safe side.
	for heading, want := range map[int]bool{10: false, 28: false, 30: true, 31: true, 32: true, 33: false, 40: false} {
		if got := broken(heading); got != want {
			t.Errorf("a break before a heading in row %d: %v", heading, got)
		}
	}
}
