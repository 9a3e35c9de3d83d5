package figure

import (
	"image/color"
	"math"
	"sort"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"ebbline/reports"
)

// sheet is one figure: its plot, and what its legend lists.
type sheet struct {
	plot   *plot.Plot
	title  string
	legend []entry
}

// entry is one line of the legend.
type entry struct {
	name string
	role reports.Role
	bar  *columns // nil for lines and bands
}

// newSheet lays out a chart: bands first, the grid over them, then bars, lines
// and marks.
func newSheet(c reports.Chart, t *reports.Table) *sheet {
	s := &sheet{plot: plot.New(), title: wrapped(c.Title, 84)}
	xs, names, t := along(c, t)
	p := s.plot
	p.X.Label.Text, p.Y.Label.Text = clean(c.XTitle), clean(c.YTitle)
	for _, a := range []*plot.Axis{&p.X, &p.Y} {
		a.Label.TextStyle = lettering(10, false)
		a.Label.Padding = 4
		a.Tick.Label = lettering(9, false)
		a.Tick.Color, a.Color = axisGrey, axisGrey
		a.Tick.Width, a.Width = 0.6, 0.6
		a.Tick.Length, a.Padding = 3, 0
	}
	p.X.Tick.Label.XAlign, p.X.Tick.Label.YAlign = draw.XCenter, draw.YTop
	p.Y.Tick.Label.XAlign, p.Y.Tick.Label.YAlign = draw.XRight, draw.YCenter

	top, bottom := 0.0, 0.0
	reach := func(vs []float64) {
		for _, v := range vs {
			if finite(v) {
				top, bottom = math.Max(top, v), math.Min(bottom, v)
			}
		}
	}
	sets := 0 // of bars, side by side
	for _, x := range c.Series {
		if c.Bars && x.Constant == "" && x.Value != "" {
			sets++
		}
	}
	var bars, bands, curves, over []plot.Plotter
	for _, x := range c.Series {
		switch {
		case x.Constant != "":
			curves = append(curves, &level{at: x.Level, look: looks[x.Role]})
			reach([]float64{x.Level})
			s.legend = append(s.legend, entry{name: x.Name, role: x.Role})
		case x.Value == "":
			low, high := values(t, x.Low), values(t, x.High)
			bands = append(bands, &area{xs: xs, low: low, high: high, look: looks[x.Role]})
			reach(high)
			s.legend = append(s.legend, entry{name: x.Name, role: x.Role})
		default:
			v := values(t, x.Value)
			reach(v)
			e := entry{name: x.Name, role: x.Role}
			if c.Bars {
				b := &columns{xs: xs, values: v, look: looks[x.Role], set: len(bars), sets: sets}
				e.bar = b
				if x.Low != "" {
					b.low, b.high = values(t, x.Low), values(t, x.High)
					reach(b.high)
					reach(b.low)
					over = append(over, &whiskers{b})
				}
				bars = append(bars, b)
			} else {
				curves = append(curves, &curve{xs: xs, values: v, look: looks[x.Role], shift: len(curves)})
			}
			s.legend = append(s.legend, e)
		}
	}
	p.Add(bands...)
	p.Add(&levelGrid{})
	p.Add(bars...)
	p.Add(curves...)
	p.Add(over...)
	s.axes(c, t, xs, names, bottom, top)
	return s
}

// axes fixes the ends of both axes and their marks.
func (s *sheet) axes(c reports.Chart, t *reports.Table, xs []float64, names []string, bottom, top float64) {
	p := s.plot
	if top == 0 && bottom == 0 {
		top = 1
		if c.Percent {
			top = 0.01
		}
	}
	step := stepFor(1.04*(top-bottom), 6, false)
	p.Y.Min, p.Y.Max = -step*math.Ceil(-1.04*bottom/step), step*math.Ceil(1.04*top/step)
	if c.Percent && top <= 1 {
		p.Y.Max = math.Min(p.Y.Max, math.Max(1, 1.01*top))
	}
	p.Y.Tick.Marker = marks{step: step, percent: c.Percent}
	if len(xs) == 0 {
		p.X.Min, p.X.Max = 0, 1
		p.X.Tick.Marker = named(nil)
		return
	}
	p.X.Min, p.X.Max = xs[0], xs[0]
	for _, x := range xs {
		p.X.Min, p.X.Max = math.Min(p.X.Min, x), math.Max(p.X.Max, x)
	}
	if names != nil {
		per := max(7, 84/len(names))
		labels := make(named, len(names))
		for i, n := range names {
			labels[i] = wrapped(n, per)
		}
		p.X.Tick.Marker = labels
		p.X.Tick.Length = 0
		p.X.Min, p.X.Max = p.X.Min-0.6, p.X.Max+0.6
		return
	}
	format := t.Columns[t.Column(c.X)].Format.Kind
	dates := format == reports.Dates
	p.X.Tick.Marker = marks{step: stepFor(p.X.Max-p.X.Min, 10, dates), dates: dates, percent: format == reports.Percents}
	if c.Bars {
		p.X.Min, p.X.Max = p.X.Min-0.7, p.X.Max+0.7
	} else if p.X.Min == p.X.Max {
		p.X.Min, p.X.Max = p.X.Min-0.5, p.X.Max+0.5
	}
}

// along is where the rows stand on the horizontal axis: at their numbers, from
// left to right, or at 0, 1, 2 and so on under their names. The table comes back
// in that order.
func along(c reports.Chart, t *reports.Table) (xs []float64, names []string, ordered *reports.Table) {
	col := t.Column(c.X)
	if col < 0 {
		panic("figure: no column " + c.X + " in table " + t.ID)
	}
	numbers := true
	for _, r := range t.Rows {
		numbers = numbers && r.Cells[col].Kind == reports.NumberCell
	}
	out := *t
	out.Rows = append([]reports.Row(nil), t.Rows...)
	if numbers {
		sort.SliceStable(out.Rows, func(i, j int) bool { return out.Rows[i].Cells[col].Num < out.Rows[j].Cells[col].Num })
	}
	for i, r := range out.Rows {
		if numbers {
			xs = append(xs, r.Cells[col].Num)
			continue
		}
		xs, names = append(xs, float64(i)), append(names, t.Shown(i, col))
	}
	return xs, names, &out
}

// values is a column as numbers; what is no number is NaN, a gap.
func values(t *reports.Table, key string) []float64 {
	col := t.Column(key)
	if col < 0 {
		panic("figure: no column " + key + " in table " + t.ID)
	}
	out := make([]float64, len(t.Rows))
	for i, r := range t.Rows {
		out[i] = math.NaN()
		if r.Cells[col].Kind == reports.NumberCell {
			out[i] = r.Cells[col].Num
		}
	}
	return out
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }

// draw puts the title above, the legend below and the plot between.
func (s *sheet) draw(c draw.Canvas) {
	c.FillPolygon(color.White, []vg.Point{{X: c.Min.X, Y: c.Min.Y}, {X: c.Max.X, Y: c.Min.Y}, {X: c.Max.X, Y: c.Max.Y}, {X: c.Min.X, Y: c.Max.Y}})
	c = draw.Crop(c, 8, -12, 6, -8)
	title := lettering(12, true)
	title.YAlign = draw.YTop
	c.FillText(title, vg.Point{X: c.Min.X, Y: c.Max.Y}, s.title)
	c = draw.Crop(c, 0, 0, 0, -title.Height(s.title)-8)
	c = draw.Crop(c, 0, 0, s.listed(c), 0)
	s.plot.Draw(c)
}

// listed draws the legend, two entries a line, and gives the height it took.
func (s *sheet) listed(c draw.Canvas) vg.Length {
	if len(s.legend) < 2 {
		return 0
	}
	const line, sample = vg.Length(14), vg.Length(34)
	style := lettering(9, false)
	style.YAlign = draw.YCenter
	lines := (len(s.legend) + 1) / 2
	half := (c.Max.X - c.Min.X) / 2
	for i, e := range s.legend {
		x := c.Min.X + 6 + vg.Length(i%2)*half
		y := c.Min.Y + line*vg.Length(lines-i/2) - line/2
		l := looks[e.role]
		box := []vg.Point{{X: x, Y: y - 4}, {X: x + sample, Y: y - 4}, {X: x + sample, Y: y + 4}, {X: x, Y: y + 4}}
		switch {
		case e.bar != nil:
			e.bar.box(&c, box)
		case l.width == 0:
			c.FillPolygon(l.colour, box)
			c.StrokeLines(draw.LineStyle{Color: edge, Width: 0.5}, append(box, box[0]))
		default:
			c.StrokeLine2(l.line(), x, y, x+sample, y)
			if l.mark != nil {
				c.DrawGlyph(l.glyph(), vg.Point{X: x + sample/2, Y: y})
			}
		}
		c.FillText(style, vg.Point{X: x + sample + 6, Y: y}, clean(e.name))
	}
	return line*vg.Length(lines) + 6
}
