package figure

import (
	"image/color"

	xfont "golang.org/x/image/font"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"

	"ebbline/reports"
)

// look is how a role is drawn. In grey the two blues of the bands are two light
// shades, and lines keep their patterns and marks.
type look struct {
	colour color.Color
	width  vg.Length
	dashes []vg.Length
	mark   draw.GlyphDrawer
	size   vg.Length
}

// The palette of Okabe & Ito (2008, Color Universal Design).
var (
	black      = color.NRGBA{0, 0, 0, 255}
	blue       = color.NRGBA{0x00, 0x72, 0xB2, 255}
	vermillion = color.NRGBA{0xD5, 0x5E, 0x00, 255}
	band       = color.NRGBA{0x9F, 0xD2, 0xF0, 255} // sky blue on white, darker
	wideBand   = color.NRGBA{0xD8, 0xEE, 0xFA, 255} // and lighter
	edge       = color.NRGBA{0x6E, 0x8E, 0xA3, 255}
	grid       = color.NRGBA{0, 0, 0, 0x22}
	axisGrey   = color.NRGBA{0x40, 0x40, 0x40, 255}
)

var looks = map[reports.Role]look{
	reports.Main:          {colour: blue, width: 1.8, mark: draw.CircleGlyph{}, size: 2.4},
	reports.Band:          {colour: band},
	reports.WideBand:      {colour: wideBand},
	reports.Compared:      {colour: vermillion, width: 1.5, dashes: []vg.Length{5, 3}, mark: triangle{}, size: 3},
	reports.LimitLine:     {colour: black, width: 1.2, dashes: []vg.Length{12, 4}},
	reports.ThresholdLine: {colour: black, width: 1.2, dashes: []vg.Length{1.2, 3}},
}

func (l look) line() draw.LineStyle {
	return draw.LineStyle{Color: l.colour, Width: l.width, Dashes: l.dashes}
}

func (l look) glyph() draw.GlyphStyle {
	return draw.GlyphStyle{Color: l.colour, Radius: l.size, Shape: l.mark}
}

// triangle is a hollow triangle with a white ground, told from a dot at a glance.
type triangle struct{}

func (triangle) DrawGlyph(c *draw.Canvas, s draw.GlyphStyle, at vg.Point) {
	r := s.Radius
	pts := []vg.Point{{X: at.X, Y: at.Y + 1.1*r}, {X: at.X + r, Y: at.Y - 0.7*r}, {X: at.X - r, Y: at.Y - 0.7*r}}
	c.FillPolygon(color.White, pts)
	c.StrokeLines(draw.LineStyle{Color: s.Color, Width: 1}, append(pts, pts[0], pts[1]))
}

// lettering is the style of texts of a size in points.
func lettering(size vg.Length, bold bool) text.Style {
	f := font.Font{Typeface: "Liberation", Variant: "Sans"}
	if bold {
		f.Weight = xfont.WeightBold
	}
	return text.Style{Color: black, Font: font.From(f, size), Handler: text.Plain{Fonts: font.DefaultCache}}
}
