package figure

import (
	"image/color"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

// area is a band between two edges, each drawn as a thin line so that bands stay
// apart when the shades do not print.
type area struct {
	xs, low, high []float64
	look          look
}

// runs are the stretches of rows without a gap.
func runs(n int, ok func(i int) bool) [][2]int {
	var out [][2]int
	from := -1
	for i := 0; i <= n; i++ {
		switch {
		case i < n && ok(i):
			if from < 0 {
				from = i
			}
		case from >= 0:
			out, from = append(out, [2]int{from, i}), -1
		}
	}
	return out
}

func (a *area) Plot(c draw.Canvas, p *plot.Plot) {
	x, y := p.Transforms(&c)
	for _, r := range runs(len(a.xs), func(i int) bool { return finite(a.low[i]) && finite(a.high[i]) }) {
		var up, down []vg.Point
		for i := r[0]; i < r[1]; i++ {
			up = append(up, vg.Point{X: x(a.xs[i]), Y: y(a.high[i])})
			down = append(down, vg.Point{X: x(a.xs[i]), Y: y(a.low[i])})
		}
		outline := append([]vg.Point(nil), up...)
		for i := len(down) - 1; i >= 0; i-- {
			outline = append(outline, down[i])
		}
		c.FillPolygon(a.look.colour, outline)
		c.StrokeLines(draw.LineStyle{Color: edge, Width: 0.5}, up, down)
	}
}

// curve is a line with marks at some of its points; shift moves the marks of one
// curve against those of another.
type curve struct {
	xs, values []float64
	look       look
	shift      int
}

func (l *curve) Plot(c draw.Canvas, p *plot.Plot) {
	x, y := p.Transforms(&c)
	every := max(1, (len(l.xs)+11)/12)
	for _, r := range runs(len(l.xs), func(i int) bool { return finite(l.values[i]) }) {
		var pts []vg.Point
		for i := r[0]; i < r[1]; i++ {
			pts = append(pts, vg.Point{X: x(l.xs[i]), Y: y(l.values[i])})
		}
		c.StrokeLines(l.look.line(), pts)
		for i := r[0]; i < r[1]; i++ {
			if l.look.mark != nil && (i+l.shift*every/2)%every == every-1 || len(pts) == 1 {
				c.DrawGlyph(l.look.glyph(), pts[i-r[0]])
			}
		}
	}
}

// level is a level line across the plot.
type level struct {
	at   float64
	look look
}

func (l *level) Plot(c draw.Canvas, p *plot.Plot) {
	_, y := p.Transforms(&c)
	halo := draw.LineStyle{Color: color.White, Width: 2 * l.look.width} // keeps it in sight on bars
	c.StrokeLine2(halo, c.Min.X, y(l.at), c.Max.X, y(l.at))
	c.StrokeLine2(l.look.line(), c.Min.X, y(l.at), c.Max.X, y(l.at))
}

// levelGrid is a thin level line at each mark of the vertical axis.
type levelGrid struct{}

func (*levelGrid) Plot(c draw.Canvas, p *plot.Plot) {
	_, y := p.Transforms(&c)
	for _, t := range p.Y.Tick.Marker.Ticks(p.Y.Min, p.Y.Max) {
		c.StrokeLine2(draw.LineStyle{Color: grid, Width: 0.5}, c.Min.X, y(t.Value), c.Max.X, y(t.Value))
	}
}

// columns are bars from zero, with their intervals if they have any; where there
// are several sets they stand side by side.
type columns struct {
	xs, values, low, high []float64
	look                  look
	set, sets             int
}

// place is the middle of a row's bar and how wide bars are.
func (b *columns) place(x func(float64) vg.Length, row int) (middle, wide vg.Length) {
	gap := x(1) - x(0)
	for i := 1; i < len(b.xs); i++ {
		gap = min(gap, x(b.xs[i])-x(b.xs[i-1]))
	}
	wide = min(gap*0.72/vg.Length(b.sets), 1.8*vg.Centimeter)
	return x(b.xs[row]) + wide*(vg.Length(b.set)-vg.Length(b.sets-1)/2), wide * 0.92
}

// box is one bar: filled, or an open frame for what is compared, so that sets
// stay apart without colour.
func (b *columns) box(c *draw.Canvas, pts []vg.Point) {
	if len(b.look.dashes) == 0 {
		c.FillPolygon(b.look.colour, pts)
		return
	}
	c.FillPolygon(color.White, pts)
	c.StrokeLines(draw.LineStyle{Color: b.look.colour, Width: 1.2}, append(pts, pts[0], pts[1]))
}

func (b *columns) Plot(c draw.Canvas, p *plot.Plot) {
	x, y := p.Transforms(&c)
	for i, v := range b.values {
		if !finite(v) {
			continue
		}
		at, wide := b.place(x, i)
		left, right := at-wide/2, at+wide/2
		b.box(&c, []vg.Point{{X: left, Y: y(0)}, {X: right, Y: y(0)}, {X: right, Y: y(v)}, {X: left, Y: y(v)}})
	}
	c.StrokeLine2(draw.LineStyle{Color: axisGrey, Width: 0.6}, c.Min.X, y(0), c.Max.X, y(0))
}

// whiskers are the intervals of bars, drawn over everything else.
type whiskers struct{ bars *columns }

func (w *whiskers) Plot(c draw.Canvas, p *plot.Plot) {
	b := w.bars
	x, y := p.Transforms(&c)
	for i, v := range b.values {
		if !finite(v) || !finite(b.low[i]) || !finite(b.high[i]) {
			continue
		}
		// A white line under the black one keeps the interval in sight on the bar.
		at, wide := b.place(x, i)
		cap := wide / 6
		for _, s := range []draw.LineStyle{{Color: color.White, Width: 3.4}, {Color: black, Width: 1.2}} {
			c.StrokeLine2(s, at, y(b.low[i]), at, y(b.high[i]))
			c.StrokeLine2(s, at-cap, y(b.low[i]), at+cap, y(b.low[i]))
			c.StrokeLine2(s, at-cap, y(b.high[i]), at+cap, y(b.high[i]))
		}
	}
}
