package figure

import (
	"bytes"
	"encoding/xml"
	"errors"
	"image/color"
	"image/png"
	"io"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"ebbline/pva"
	"ebbline/reports"
	"ebbline/reports/internal/invented"
)

func report(c *pva.Case) *reports.Report {
	a := invented.Assessment(c, 400)
	return reports.Build(a, reports.Meta{Version: "0.0.0", Command: "ebbline assess x.toml", CaseText: "x", CaseFile: "x.toml"})
}

func written(t *testing.T, r *reports.Report, dir string) map[string][]byte {
	t.Helper()
	if err := Write(r, dir); err != nil {
		t.Fatal(err)
	}
	out := map[string][]byte{}
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		if out[e.Name()], err = os.ReadFile(filepath.Join(dir, e.Name())); err != nil {
			t.Fatal(err)
		}
	}
	return out
}

// TestWrite: each chart as two sound files, always the same bytes, all of them
// announced, and nothing else in the folder.
func TestWrite(t *testing.T) {
	dir := t.TempDir()
	if look := os.Getenv("EBBLINE_LOOK"); look != "" { // to be looked at
		dir = look
	}
	announced := map[string]bool{}
	for _, n := range Names() {
		announced[n] = true
	}
	for name, c := range map[string]*pva.Case{"full": invented.Case(), "plain": invented.Plain()} {
		r := report(c)
		first := written(t, r, filepath.Join(dir, "a", name))
		charts := map[string]bool{}
		for _, p := range r.Parts {
			for _, ch := range p.Charts {
				charts[ch.ID] = true
			}
		}
		if len(charts) < 3 || len(first) != 2*len(charts) {
			t.Errorf("%s: %d files for %d charts", name, len(first), len(charts))
		}
		for file, data := range first {
			if !announced[file] {
				t.Errorf("%s is not announced", file)
			}
			if strings.HasSuffix(file, ".png") {
				img, err := png.Decode(bytes.NewReader(data))
				if err != nil || img.Bounds().Dx() < 1800 {
					t.Errorf("%s: %v", file, err)
				}
				continue
			}
			wellFormed(t, file, data)
		}
		if name == "full" {
			again := written(t, r, filepath.Join(dir, "b", name))
			for file := range first {
				if !bytes.Equal(first[file], again[file]) {
					t.Errorf("%s: not the same bytes twice", file)
				}
			}
			risk := string(first["risk.svg"])
			for _, want := range []string{"<title>Risk of having fallen to 20 or fewer</title>", "<desc>Line with an interval band", ">Limit, 5 %</text>", ">2030</text>", ">0 %</text>", ">Without the take</text>"} {
				if !strings.Contains(risk, want) {
					t.Errorf("risk.svg lacks %s", want)
				}
			}
		}
	}
}

func wellFormed(t *testing.T, name string, data []byte) {
	t.Helper()
	d := xml.NewDecoder(bytes.NewReader(data))
	for {
		_, err := d.Token()
		if errors.Is(err, io.EOF) {
			return
		}
		if err != nil {
			t.Errorf("%s: %v", name, err)
			return
		}
	}
}

// table is a table of two columns of numbers, in no order, and one of names.
func table(x reports.Format) *reports.Table {
	t := &reports.Table{ID: "t", Columns: []reports.Column{{Key: "x", Format: x}, {Key: "y"}, {Key: "z"}, {Key: "name"}}}
	for _, v := range [][3]float64{{0.15, -0.3, 0.5}, {0.05, 0.2, 0.1}, {0.10, -0.7, 0.3}} {
		n := func(v float64) reports.Cell { return reports.Cell{Kind: reports.NumberCell, Num: v} }
		t.Rows = append(t.Rows, reports.Row{Cells: []reports.Cell{n(v[0]), n(v[1]), n(v[2]), {Kind: reports.TextCell, Text: "births.rate"}}})
	}
	return t
}

// TestShapes: axes that are no dates, values below zero, and bars side by side.
func TestShapes(t *testing.T) {
	draws := func(c reports.Chart, tab *reports.Table, want ...string) {
		t.Helper()
		img, v, err := drawn(c, tab)
		if err != nil {
			t.Fatal(err)
		}
		if look := os.Getenv("EBBLINE_LOOK"); look != "" {
			if err := os.WriteFile(filepath.Join(look, c.ID+".png"), img, 0o666); err != nil {
				t.Fatal(err)
			}
		}
		for _, w := range want {
			if !strings.Contains(string(v), w) {
				t.Errorf("%s lacks %s", c.ID, w)
			}
		}
	}
	line := reports.Series{Name: "Risk", Role: reports.Main, Value: "z"}
	draws(reports.Chart{ID: "levels", X: "x", Percent: true, Series: []reports.Series{line}}, table(reports.Format{Kind: reports.General}), ">0.06</text>", ">0.15</text>", ">50 %</text>")
	draws(reports.Chart{ID: "shares", X: "x", Series: []reports.Series{line}}, table(reports.Format{Kind: reports.Percents}), ">15 %</text>", ">0.5</text>")
	sets := []reports.Series{{Name: "Less", Role: reports.Compared, Value: "y"}, {Name: "More", Role: reports.Main, Value: "z", Low: "y", High: "z"}}
	draws(reports.Chart{ID: "sets", X: "name", Bars: true, Series: sets}, table(reports.Format{}), ">-0.75</text>", ">0.00</text>", ">births.rate</text>", ">Less</text>")
	s := newSheet(reports.Chart{ID: "order", X: "x", Series: []reports.Series{line}}, table(reports.Format{}))
	if s.plot.X.Min != 0.05 || s.plot.X.Max != 0.15 {
		t.Errorf("the axis runs from %v to %v", s.plot.X.Min, s.plot.X.Max)
	}
}

// TestOddReports: texts that no font has, gaps and infinities draw without a
// panic and leave sound files.
func TestOddReports(t *testing.T) {
	odd := "a\x00b <&> \xff \u4e2d " + strings.Repeat("long ", 60) + strings.Repeat("x", 200)
	nan, inf := math.NaN(), math.Inf(1)
	for name, ys := range map[string][]float64{"none": {}, "one": {0.2}, "zeros": {0, 0, 0}, "gaps": {nan, 0.1, nan, 0.2, 0.3, nan}, "all gaps": {nan, nan}, "infinite": {1, inf, 2},
		"tiny": {1e-300, 2e-300}, "huge": {1e300, 3e300}} {
		for _, bars := range []bool{false, true} {
			for _, dated := range []bool{false, true} {
				tab := &reports.Table{ID: "t", Columns: []reports.Column{{Key: "x"}, {Key: "y"}}}
				for i, y := range ys {
					x := reports.Cell{Kind: reports.TextCell, Text: odd}
					if dated {
						x = reports.Cell{Kind: reports.NumberCell, Num: float64(2000 + i)}
					}
					c := reports.Cell{Kind: reports.NumberCell, Num: y}
					if math.IsNaN(y) {
						c = reports.Cell{}
					}
					tab.Rows = append(tab.Rows, reports.Row{Cells: []reports.Cell{x, c}})
				}
				series := []reports.Series{{Name: odd, Role: reports.Main, Value: "y", Low: "y", High: "y"}, {Name: "band", Role: reports.Band, Low: "y", High: "y"}, {Name: "level", Role: reports.LimitLine, Constant: "{x}", Level: 0.05}}
				ch := reports.Chart{ID: "c", Title: odd, Alt: odd, XTitle: odd, YTitle: odd, X: "x", Bars: bars, Percent: dated, Series: series}
				v, err := vectorBytes(newSheet(ch, tab))
				if err != nil {
					t.Fatal(err)
				}
				wellFormed(t, name, described(v, ch))
			}
		}
	}
}

// TestTellApart: no two lines differ by colour alone, and the shades of bands
// stay apart from one another and from paper when colour is lost.
func TestTellApart(t *testing.T) {
	grey := func(c color.Color) float64 {
		r, g, b, _ := c.RGBA()
		return (0.299*float64(r) + 0.587*float64(g) + 0.114*float64(b)) / 0xffff // luma of Rec. ITU-R BT.601
	}
	lines := []reports.Role{reports.Main, reports.Compared, reports.LimitLine, reports.ThresholdLine}
	for i, a := range lines {
		for _, b := range lines[:i] {
			x, y := looks[a], looks[b]
			if len(x.dashes) == len(y.dashes) && (len(x.dashes) == 0 || x.dashes[0] == y.dashes[0]) {
				t.Errorf("roles %d and %d have the same pattern", a, b)
			}
		}
		if grey(looks[a].colour) > 0.55 {
			t.Errorf("role %d is too light a line", a)
		}
	}
	light, dark := grey(wideBand), grey(band)
	if 1-light < 0.06 || light-dark < 0.12 || dark-grey(blue) < 0.25 {
		t.Errorf("shades %.2f and %.2f and the line's %.2f lie too close", light, dark, grey(blue))
	}
}

// TestTicks: round marks that a reader can tell apart.
func TestTicks(t *testing.T) {
	labels := func(m marks, min, max float64) string {
		var out []string
		for _, k := range m.Ticks(min, max) {
			out = append(out, k.Label)
		}
		return strings.Join(out, "|")
	}
	for _, c := range []struct {
		got, want string
	}{
		{labels(marks{step: stepFor(0.153, 6, false), percent: true}, 0, 0.2), "0 %|5 %|10 %|15 %|20 %"},
		{labels(marks{step: stepFor(0.0011, 6, false), percent: true}, 0, 0.0012), "0.00 %|0.02 %|0.04 %|0.06 %|0.08 %|0.10 %|0.12 %"},
		{labels(marks{step: stepFor(1, 6, false), percent: true}, 0, 1), "0 %|20 %|40 %|60 %|80 %|100 %"},
		{labels(marks{step: stepFor(1200, 6, false)}, 0, 1200), "0|200|400|600|800|1,000|1,200"},
		{labels(marks{step: stepFor(3, 6, false)}, 0, 3), "0.0|0.5|1.0|1.5|2.0|2.5|3.0"},
		{labels(marks{step: stepFor(49, 10, true), dates: true}, 2027, 2076), "2030|2035|2040|2045|2050|2055|2060|2065|2070|2075"},
		{labels(marks{step: stepFor(3, 10, true), dates: true}, 1, 4), "1|2|3|4"},
		{wrapped("a catastrophe that is long", 10), "a\ncatastrop-\nhe that is..."},
	} {
		if c.got != c.want {
			t.Errorf("got  %s\nwant %s", c.got, c.want)
		}
	}
}

// TestFailure: a folder that cannot be made is an error and leaves nothing.
func TestFailure(t *testing.T) {
	file := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(file, nil, 0o666); err != nil {
		t.Fatal(err)
	}
	if err := Write(report(invented.Plain()), filepath.Join(file, "figures")); err == nil {
		t.Error("no error")
	}
}
