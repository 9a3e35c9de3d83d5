package workbook

import (
	"math"
	"strconv"

	"github.com/xuri/excelize/v2"

	"ebbline/reports"
)

func defaultsWords(n int) string {
	switch n {
	case 0:
		return ""
	case 1:
		return "; 1 number not given and left at its default"
	}
	return "; " + strconv.Itoa(n) + " numbers not given and left at their defaults"
}

func seedText(r *reports.Report) string { return strconv.FormatUint(r.Seed, 10) }

// chart puts a chart on a sheet. The library keeps its place and its alt text;
// the chart itself is drawn by this package (chartxml.go) and put in by seal,
// because bands, gaps in a legend and intervals are beyond the library.
func (b *book) chart(c reports.Chart, sheet, cell string, width, height uint) {
	d := b.drawing(c)
	no := false
	b.try(b.f.AddChart(sheet, cell, &excelize.Chart{
		Type:       excelize.Line,
		Series:     []excelize.ChartSeries{{Name: d.label, Categories: d.label, Values: d.label}},
		VaryColors: &no,
		Dimension:  excelize.ChartDimension{Width: width, Height: height},
		Format:     excelize.GraphicOptions{AltText: cut(clean(c.Alt), 1000), Name: c.Title, Positioning: "oneCell"},
	}))
	b.charts = append(b.charts, d.xml())
}

// drawing is a chart with its cells found: what the XML is made of.
type drawing struct {
	chart  reports.Chart
	label  string   // range of the labels along the axis
	labels []string // and their texts
	skip   int      // a mark on the axis every so many labels
	areas  []drawn  // stacked from below; the first is not seen
	lines  []drawn
	bars   []drawn
}

// drawn is one series of a drawing.
type drawn struct {
	name        string
	nameRef     string
	ref         string
	values      []float64 // NaN is a gap
	role        reports.Role
	hidden      bool // no fill, no place in the legend
	unlisted    bool // drawn and not in the legend
	minus, plus string
	down, up    []float64
}

// drawing finds the cells of a chart and adds, to the right of its table, the
// columns that a chart needs and a table does not have.
func (b *book) drawing(c reports.Chart) drawing {
	p := b.places[c.Table]
	d := drawing{chart: c, skip: 1}
	n := len(p.t.Rows)
	x := p.t.Column(c.X)
	d.labels = make([]string, n)
	for i := range d.labels {
		d.labels[i] = cut(clean(p.t.Shown(i, x)), 255)
	}
	d.label = p.column(c.X, "")
	if p.t.Columns[x].Format.Kind == reports.Dates && n > 12 {
		d.label, d.labels, d.skip = b.sparseLabels(p, x)
	}
	for _, s := range c.Series {
		switch {
		case s.Constant != "":
			d.lines = append(d.lines, b.level(p, s))
		case s.Value == "":
			b.band(&d, p, s)
		default:
			v := drawn{name: s.Name, ref: p.column(s.Value, ""), values: values(p.t, s.Value), role: s.Role}
			if c.Bars {
				if s.Low != "" {
					v.minus, v.down = b.spread(p, s.Value, s.Low, s.Value, "below")
					v.plus, v.up = b.spread(p, s.High, s.Value, s.Value, "above")
				}
				d.bars = append(d.bars, v)
			} else {
				d.lines = append(d.lines, v)
			}
		}
	}
	return d
}

// values is a column as numbers; what is no number is NaN, a gap.
func values(t *reports.Table, key string) []float64 {
	c := t.Column(key)
	out := make([]float64, len(t.Rows))
	for i, r := range t.Rows {
		out[i] = math.NaN()
		if r.Cells[c].Kind == reports.NumberCell {
			out[i] = r.Cells[c].Num
		}
	}
	return out
}

// helper adds a column beside a table for the charts alone; the same one is not
// added twice. Cells give the value and the formula of a row.
func (b *book) helper(p place, name string, cell func(i int) (reports.Cell, string)) (ref string, vals []float64) {
	q := b.places[p.t.ID]
	column, known := q.helpers[name]
	if !known {
		if q.lastRight == 0 {
			q.lastRight = max(p.left+len(p.t.Columns)-1, 8) + 1 // a gap, beyond what is printed
		}
		q.lastRight++
		column = q.lastRight
		q.helpers[name] = column
		b.places[p.t.ID] = q
		b.say(p.sheet, cellName(column, p.head), "for the charts:\n"+name, styleKey{italic: true, colour: grey, wrap: true, right: true})
		b.try(b.f.SetColWidth(p.sheet, columnName(column), columnName(column), 15))
	}
	vals = make([]float64, len(p.t.Rows))
	for i := range vals {
		c, f := cell(i)
		vals[i] = math.NaN()
		if c.Kind == reports.NumberCell {
			vals[i] = c.Num
		}
		if known {
			continue
		}
		at := cellName(column, p.head+1+i)
		b.put(p.sheet, at, c, b.style(styleKey{colour: grey, right: true, format: numberFormat(c.Format, c.Num)}))
		if f != "" && c.Kind != reports.Empty {
			b.formula(p.sheet, at, f)
		}
	}
	return absolute(p.sheet, "", column, p.head+1, p.head+len(p.t.Rows)), vals
}

// sparseLabels is a column of labels with most of them blank, so that those left
// have room: programs differ in how they thin out crowded labels.
func (b *book) sparseLabels(p place, x int) (string, []string, int) {
	n := len(p.t.Rows)
	skip := 1
	for _, s := range []int{2, 5, 10, 20, 25, 50, 100, 200, 500, 1000} {
		if n/skip > 11 {
			skip = s
		}
	}
	texts := make([]string, n)
	ref, _ := b.helper(p, "labels", func(i int) (reports.Cell, string) {
		t := p.t.Shown(i, x)
		if int(p.t.Rows[i].Cells[x].Num)%skip != 0 {
			return reports.Cell{}, ""
		}
		texts[i] = t
		return reports.Cell{Kind: reports.TextCell, Text: t}, ""
	})
	return ref, texts, skip
}

// level is a line at one height.
func (b *book) level(p place, s reports.Series) drawn {
	ref, vals := b.helper(p, s.Name, func(int) (reports.Cell, string) {
		return reports.Cell{Kind: reports.NumberCell, Num: s.Level}, b.fixed(p.sheet, s.Constant)
	})
	return drawn{name: s.Name, ref: ref, values: vals, role: s.Role}
}

// spread is the distance between two columns, as a bar's interval needs it.
func (b *book) spread(p place, upper, lower, of, word string) (string, []float64) {
	u, l := p.t.Column(upper), p.t.Column(lower)
	return b.helper(p, "interval "+word, func(i int) (reports.Cell, string) {
		return b.gap(p, i, u, l)
	})
}

func (b *book) gap(p place, i, u, l int) (reports.Cell, string) {
	hi, lo := p.t.Rows[i].Cells[u], p.t.Rows[i].Cells[l]
	if hi.Kind != reports.NumberCell || lo.Kind != reports.NumberCell {
		return reports.Cell{}, ""
	}
	return reports.Cell{Kind: reports.NumberCell, Num: hi.Num - lo.Num, Format: p.t.FormatOf(i, u)}, p.at(i, u) + "-" + p.at(i, l)
}

// band adds a range to the stack of areas. A darker band inside a wider one cuts
// the wider one in two.
func (b *book) band(d *drawing, p place, s reports.Series) {
	add := func(upper, lower, name string, role reports.Role, unlisted bool) {
		u, l := p.t.Column(upper), p.t.Column(lower)
		ref, vals := b.helper(p, lower+" to "+upper, func(i int) (reports.Cell, string) { return b.gap(p, i, u, l) })
		d.areas = append(d.areas, drawn{name: name, ref: ref, values: vals, role: role, unlisted: unlisted})
	}
	inner := reports.Series{}
	for _, t := range d.chart.Series {
		if s.Role == reports.WideBand && t.Role == reports.Band {
			inner = t
		}
	}
	switch {
	case s.Role == reports.Band && len(d.areas) > 0:
		return // already inside the wider band
	case inner.Low != "":
		d.areas = append(d.areas, drawn{name: "base", ref: p.column(s.Low, ""), values: values(p.t, s.Low), hidden: true})
		add(inner.Low, s.Low, s.Name, reports.WideBand, false)
		add(inner.High, inner.Low, inner.Name, reports.Band, false)
		add(s.High, inner.High, s.Name, reports.WideBand, true)
	default:
		d.areas = append(d.areas, drawn{name: "base", ref: p.column(s.Low, ""), values: values(p.t, s.Low), hidden: true})
		add(s.High, s.Low, s.Name, reports.Band, false)
	}
}
