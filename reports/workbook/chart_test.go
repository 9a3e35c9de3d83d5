package workbook

import (
	"encoding/xml"
	"math"
	"strconv"
	"strings"
	"testing"

	"github.com/xuri/excelize/v2"

	"ebbline/pva"
	"ebbline/reports"
	"ebbline/reports/internal/invented"
)

// series is one series of a chart part, as a reader of the file sees it.
type series struct {
	Name string `xml:"tx>v"`
	Cat  struct {
		Ref    string  `xml:"f"`
		Points []point `xml:"strCache>pt"`
	} `xml:"cat>strRef"`
	Val  numbers   `xml:"val>numRef"`
	Errs []numbers `xml:"errBars>plus>numRef"`
	Line struct {
		Dash struct {
			Val string `xml:"val,attr"`
		} `xml:"prstDash"`
		Colour struct {
			Val string `xml:"val,attr"`
		} `xml:"solidFill>srgbClr"`
	} `xml:"spPr>ln"`
}

type numbers struct {
	Ref    string  `xml:"f"`
	Points []point `xml:"numCache>pt"`
}

type point struct {
	At    int    `xml:"idx,attr"`
	Value string `xml:"v"`
}

type chartPart struct {
	Title string   `xml:"chart>title>tx>rich>p>r>t"`
	Area  []series `xml:"chart>plotArea>areaChart>ser"`
	Bar   []series `xml:"chart>plotArea>barChart>ser"`
	Line  []series `xml:"chart>plotArea>lineChart>ser"`
}

func chartParts(t *testing.T, parts map[string]string) []chartPart {
	t.Helper()
	var out []chartPart
	for i := 1; ; i++ {
		text, ok := parts["xl/charts/chart"+strconv.Itoa(i)+".xml"]
		if !ok {
			return out
		}
		var c chartPart
		if err := xml.Unmarshal([]byte(text), &c); err != nil {
			t.Fatalf("chart %d: %v", i, err)
		}
		out = append(out, c)
	}
}

// TestChartsShowTheirCells follows every reference of every chart: the cells
// exist and hold the values that the chart carries.
func TestChartsShowTheirCells(t *testing.T) {
	r := report()
	data := bytesOf(t, r)
	f := open(t, data)
	parts := chartParts(t, unzip(t, data))
	var titles []string
	for _, c := range parts {
		titles = append(titles, c.Title)
	}
	want := "Risk of having fallen to 20 or fewer,Count of adult females,When replicates fall,The options side by side,When replicates fall,The options side by side,The risk with one thing taken out"
	if got := strings.Join(titles, ","); got != want {
		t.Errorf("the charts are %s", got)
	}
	checked := 0
	for _, c := range parts {
		for _, s := range append(append(append([]series(nil), c.Area...), c.Bar...), c.Line...) {
			for _, n := range append([]numbers{s.Val}, s.Errs...) {
				cells := cellsOf(t, f, n.Ref)
				if len(n.Points) != len(cells) || len(cells) < 3 {
					t.Errorf("chart %q, series %q: %d points for %d cells of %s", c.Title, s.Name, len(n.Points), len(cells), n.Ref)
				}
				for _, p := range n.Points {
					if cells[p.At] != p.Value {
						t.Errorf("chart %q, series %q: point %d is %s, its cell holds %q", c.Title, s.Name, p.At, p.Value, cells[p.At])
					}
					checked++
				}
			}
			labels := cellsOf(t, f, s.Cat.Ref)
			for _, p := range s.Cat.Points {
				if labels[p.At] != p.Value {
					t.Errorf("chart %q: label %d is %q, its cell holds %q", c.Title, p.At, p.Value, labels[p.At])
				}
			}
		}
	}
	if checked < 500 {
		t.Errorf("only %d points checked", checked)
	}
}

// cellsOf reads the cells of a reference such as 'Risk by year'!$B$9:$B$58.
func cellsOf(t *testing.T, f *excelize.File, ref string) []string {
	t.Helper()
	sheet, span, ok := strings.Cut(strings.ReplaceAll(ref, "$", ""), "!")
	from, to, both := strings.Cut(span, ":")
	if !ok || !both {
		t.Fatalf("%q is no range", ref)
	}
	sheet = strings.Trim(sheet, "'")
	column, first, err := excelize.CellNameToCoordinates(from)
	if err != nil {
		t.Fatal(err)
	}
	_, last, err := excelize.CellNameToCoordinates(to)
	if err != nil {
		t.Fatal(err)
	}
	var out []string
	for row := first; row <= last; row++ {
		v, err := f.GetCellValue(sheet, cellName(column, row), excelize.Options{RawCellValue: true})
		if err != nil {
			t.Fatal(err)
		}
		out = append(out, v)
	}
	return out
}

// TestBandsStackToTheirEdges: the areas of a fan, added from below, end at the
// edges that the table states.
func TestBandsStackToTheirEdges(t *testing.T) {
	r := report()
	parts := chartParts(t, unzip(t, bytesOf(t, r)))
	edges := map[int][]string{0: {"years", "low", "high"}, 1: {"abundance", "p05", "p25", "p75", "p95"}}
	for chart, names := range edges {
		table := r.Table(names[0])
		sums := make([]float64, len(table.Rows))
		if len(parts[chart].Area) != len(names)-1 {
			t.Fatalf("chart %d has %d areas", chart, len(parts[chart].Area))
		}
		for k, area := range parts[chart].Area {
			for _, p := range area.Val.Points {
				v, err := strconv.ParseFloat(p.Value, 64)
				if err != nil {
					t.Fatal(err)
				}
				sums[p.At] += v
			}
			for i, row := range table.Rows {
				if want := row.Cells[table.Column(names[k+1])].Num; math.Abs(sums[i]-want) > 1e-12*(1+want) {
					t.Errorf("chart %d, row %d: area %d ends at %v, the table says %v", chart, i, k, sums[i], want)
				}
			}
		}
	}
}

// TestNoMeaningByColourAlone: no two lines of a chart share colour and dashes,
// nor differ by colour only.
func TestNoMeaningByColourAlone(t *testing.T) {
	data := bytesOf(t, report())
	for _, c := range chartParts(t, unzip(t, data)) {
		seen := map[string]string{}
		for _, s := range c.Line {
			if other, twice := seen[s.Line.Dash.Val]; twice {
				t.Errorf("chart %q: %q and %q are both drawn %q", c.Title, s.Name, other, s.Line.Dash.Val)
			}
			seen[s.Line.Dash.Val] = s.Name
		}
	}
}

// TestChartsCarryAltText: every chart says in words what it shows.
func TestChartsCarryAltText(t *testing.T) {
	parts := unzip(t, bytesOf(t, report()))
	drawings, described := 0, 0
	for name, text := range parts {
		if !strings.HasPrefix(name, "xl/drawings/drawing") {
			continue
		}
		drawings += strings.Count(text, "<xdr:graphicFrame")
		described += strings.Count(text, ` descr="Line with an interval band: the risk`) + strings.Count(text, ` descr="Fan of the yearly count`) + strings.Count(text, ` descr="Bars`)
	}
	if drawings != 7 || described != drawings {
		t.Errorf("%d of %d charts are described", described, drawings)
	}
}

// TestOutgrownIsAGap: a percentile among the outgrown is a word in its cell and
// a gap in the chart, not a zero.
func TestOutgrownIsAGap(t *testing.T) {
	a := invented.Assessment(invented.Case(), 200)
	years := a.Outcome.Years
	years[49].Abundance = pva.Percentiles{P05: 10, P25: 20, P50: 30, P75: math.Inf(1), P95: math.Inf(1)}
	years[48].Mean = math.NaN()
	r := reports.Build(a, reports.Meta{CaseText: caseText})
	data := bytesOf(t, r)
	f := open(t, data)
	p := placesOf(r)["abundance"]
	for key, want := range map[string]string{"p95": "outgrown", "p75": "outgrown", "p50": "30"} {
		if got, _ := f.GetCellValue(p.sheet, p.at(49, p.t.Column(key))); got != want {
			t.Errorf("%s of the last year reads %q", key, got)
		}
	}
	if got, _ := f.GetCellValue(p.sheet, p.at(48, p.t.Column("mean"))); got != "" {
		t.Errorf("an unknown mean reads %q", got)
	}
	fan := chartParts(t, unzip(t, data))[1]
	if n := len(fan.Area[3].Val.Points); n != 49 {
		t.Errorf("the upper band has %d points, not 49 and a gap", n)
	}
}
