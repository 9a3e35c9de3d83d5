package workbook

import (
	"encoding/xml"
	"fmt"
	"math"
	"strings"

	"ebbline/reports"
)

// look is how a role is drawn: colour, opacity in percent, width in points and
// the pattern of its line, so that no two differ by colour alone.
type look struct {
	colour string
	alpha  int
	width  float64
	dash   string
}

var looks = map[reports.Role]look{
	reports.Main:          {blue, 100, 2.5, "solid"},
	reports.Band:          {skyBlue, 55, 0, ""},
	reports.WideBand:      {skyBlue, 25, 0, ""},
	reports.Compared:      {vermillion, 100, 2, "sysDash"},
	reports.LimitLine:     {black, 100, 1.5, "lgDash"},
	reports.ThresholdLine: {black, 100, 1.5, "sysDot"},
}

const (
	axisFont  = 900 // in hundredths of a point
	titleFont = 1200
	emu       = 12700 // a point in the unit of drawings
)

// xml is the whole chart part.
func (d drawing) xml() string {
	var b strings.Builder
	b.WriteString(`<?xml version="1.0" encoding="UTF-8" standalone="yes"?>` + "\n")
	b.WriteString(`<c:chartSpace xmlns:c="http://schemas.openxmlformats.org/drawingml/2006/chart" xmlns:a="http://schemas.openxmlformats.org/drawingml/2006/main" xmlns:r="http://schemas.openxmlformats.org/officeDocument/2006/relationships">`)
	b.WriteString(`<c:date1904 val="0"/><c:roundedCorners val="0"/><c:chart>`)
	b.WriteString(titleXML(d.chart.Title, titleFont, true, 0))
	b.WriteString(`<c:autoTitleDeleted val="0"/><c:plotArea><c:layout/>`)
	index := 0
	d.areasXML(&b, &index)
	d.barsXML(&b, &index)
	d.linesXML(&b, &index)
	d.axesXML(&b)
	b.WriteString(`<c:spPr><a:noFill/><a:ln><a:noFill/></a:ln></c:spPr></c:plotArea>`)
	d.legendXML(&b)
	b.WriteString(`<c:plotVisOnly val="0"/><c:dispBlanksAs val="gap"/></c:chart>`)
	b.WriteString(`<c:spPr><a:solidFill><a:srgbClr val="` + white + `"/></a:solidFill><a:ln><a:noFill/></a:ln></c:spPr>`)
	b.WriteString(fontXML("c:txPr", axisFont, false, 0) + `</c:chartSpace>`)
	return b.String()
}

// escaped is a text inside the XML.
func escaped(s string) string {
	var b strings.Builder
	_ = xml.EscapeText(&b, []byte(clean(s))) // a Builder does not fail
	return b.String()
}

// titleXML is the title of the chart or an axis.
func titleXML(s string, size int, bold bool, rotation int) string {
	if s == "" {
		return ""
	}
	return `<c:title><c:tx><c:rich><a:bodyPr` + rotated(rotation) + `/><a:p><a:pPr>` + runXML("a:defRPr", size, bold) + `</a:pPr><a:r>` +
		runXML("a:rPr", size, bold) + `<a:t>` + escaped(s) + `</a:t></a:r></a:p></c:rich></c:tx><c:overlay val="0"/></c:title>`
}

func rotated(rotation int) string {
	if rotation == 0 {
		return ""
	}
	return fmt.Sprintf(` rot="%d" vert="horz"`, rotation)
}

func runXML(tag string, size int, bold bool) string {
	b := 0
	if bold {
		b = 1
	}
	lang := ""
	if tag == "a:rPr" {
		lang = ` lang="en"`
	}
	return fmt.Sprintf(`<%s%s sz="%d" b="%d"><a:solidFill><a:srgbClr val="262626"/></a:solidFill><a:latin typeface="%s"/></%s>`, tag, lang, size, b, fontName, tag)
}

func fontXML(tag string, size int, bold bool, rotation int) string {
	return `<` + tag + `><a:bodyPr` + rotated(rotation) + `/><a:p><a:pPr>` + runXML("a:defRPr", size, bold) + `</a:pPr><a:endParaRPr lang="en"/></a:p></` + tag + `>`
}

func fillXML(l look) string {
	if l.alpha == 100 {
		return `<a:solidFill><a:srgbClr val="` + l.colour + `"/></a:solidFill>`
	}
	return fmt.Sprintf(`<a:solidFill><a:srgbClr val="%s"><a:alpha val="%d"/></a:srgbClr></a:solidFill>`, l.colour, l.alpha*1000)
}

// head opens a series: its order, name and shape.
func (s drawn) head(index int, shape string) string {
	return fmt.Sprintf(`<c:ser><c:idx val="%d"/><c:order val="%d"/><c:tx><c:v>%s</c:v></c:tx><c:spPr>%s</c:spPr>`, index, index, escaped(s.name), shape)
}

// data is a series' labels and values, with the values as they stand now.
func (d drawing) data(s drawn) string {
	var b strings.Builder
	fmt.Fprintf(&b, `<c:cat><c:strRef><c:f>%s</c:f><c:strCache><c:ptCount val="%d"/>`, escaped(d.label), len(d.labels))
	for i, t := range d.labels {
		if t != "" {
			fmt.Fprintf(&b, `<c:pt idx="%d"><c:v>%s</c:v></c:pt>`, i, escaped(t))
		}
	}
	b.WriteString(`</c:strCache></c:strRef></c:cat><c:val>` + numbersXML(s.ref, s.values) + `</c:val>`)
	return b.String()
}

func numbersXML(ref string, values []float64) string {
	var b strings.Builder
	fmt.Fprintf(&b, `<c:numRef><c:f>%s</c:f><c:numCache><c:formatCode>General</c:formatCode><c:ptCount val="%d"/>`, escaped(ref), len(values))
	for i, v := range values {
		if !math.IsNaN(v) {
			fmt.Fprintf(&b, `<c:pt idx="%d"><c:v>%s</c:v></c:pt>`, i, exact(v))
		}
	}
	b.WriteString(`</c:numCache></c:numRef>`)
	return b.String()
}

const axisIDs = `<c:axId val="111111111"/><c:axId val="222222222"/>`

func (d drawing) areasXML(b *strings.Builder, index *int) {
	if len(d.areas) == 0 {
		return
	}
	b.WriteString(`<c:areaChart><c:grouping val="stacked"/><c:varyColors val="0"/>`)
	for _, s := range d.areas {
		shape := `<a:noFill/><a:ln><a:noFill/></a:ln>`
		if !s.hidden {
			shape = fillXML(looks[s.role]) + `<a:ln><a:noFill/></a:ln>`
		}
		b.WriteString(s.head(*index, shape) + d.data(s) + `</c:ser>`)
		*index++
	}
	b.WriteString(axisIDs + `</c:areaChart>`)
}

func (d drawing) barsXML(b *strings.Builder, index *int) {
	if len(d.bars) == 0 {
		return
	}
	direction, overlap := "col", ""
	if d.chart.Across {
		direction, overlap = "bar", `<c:overlap val="100"/>`
	}
	b.WriteString(`<c:barChart><c:barDir val="` + direction + `"/><c:grouping val="clustered"/><c:varyColors val="0"/>`)
	for _, s := range d.bars {
		b.WriteString(s.head(*index, fillXML(looks[s.role])+`<a:ln><a:noFill/></a:ln>`) + `<c:invertIfNegative val="0"/>`)
		if s.plus != "" {
			b.WriteString(`<c:errBars><c:errBarType val="both"/><c:errValType val="cust"/><c:noEndCap val="0"/><c:plus>` + numbersXML(s.plus, s.up) +
				`</c:plus><c:minus>` + numbersXML(s.minus, s.down) + `</c:minus><c:spPr><a:ln w="15875"><a:solidFill><a:srgbClr val="` + black + `"/></a:solidFill></a:ln></c:spPr></c:errBars>`)
		}
		b.WriteString(d.data(s) + `</c:ser>`)
		*index++
	}
	gap := 80
	if len(d.labels) > 20 {
		gap = 30
	}
	fmt.Fprintf(b, `<c:gapWidth val="%d"/>%s%s</c:barChart>`, gap, overlap, axisIDs)
}

func (d drawing) linesXML(b *strings.Builder, index *int) {
	if len(d.lines) == 0 {
		return
	}
	b.WriteString(`<c:lineChart><c:grouping val="standard"/><c:varyColors val="0"/>`)
	for _, s := range d.lines {
		l := looks[s.role]
		shape := fmt.Sprintf(`<a:ln w="%d" cap="rnd">%s<a:prstDash val="%s"/><a:round/></a:ln>`, int(l.width*emu), fillXML(l), l.dash)
		b.WriteString(s.head(*index, shape) + `<c:marker><c:symbol val="none"/></c:marker>` + d.data(s) + `<c:smooth val="0"/></c:ser>`)
		*index++
	}
	b.WriteString(`<c:marker val="1"/>` + axisIDs + `</c:lineChart>`)
}

func (d drawing) axesXML(b *strings.Builder) {
	axisLine := `<c:spPr><a:ln w="9525"><a:solidFill><a:srgbClr val="7F7F7F"/></a:solidFill></a:ln></c:spPr>`
	// Bars across: the first row on top, the values along the foot.
	order, labels, foot, rotation, least, meets := "minMax", "b", "l", -5400000, `<c:min val="0"/>`, "autoZero"
	if d.chart.Across {
		order, labels, foot, rotation, least, meets = "maxMin", "l", "b", 0, "", "max"
	}
	fmt.Fprintf(b, `<c:catAx><c:axId val="111111111"/><c:scaling><c:orientation val="%s"/></c:scaling><c:delete val="0"/><c:axPos val="%s"/>`, order, labels)
	b.WriteString(titleXML(d.chart.XTitle, axisFont, false, 0))
	b.WriteString(`<c:numFmt formatCode="General" sourceLinked="0"/><c:majorTickMark val="none"/><c:minorTickMark val="none"/><c:tickLblPos val="low"/>`)
	b.WriteString(axisLine + fontXML("c:txPr", axisFont, false, 0))
	b.WriteString(`<c:crossAx val="222222222"/><c:crosses val="autoZero"/><c:auto val="0"/><c:lblAlgn val="ctr"/><c:lblOffset val="100"/><c:tickLblSkip val="1"/><c:noMultiLvlLbl val="1"/></c:catAx>`)
	between := "between"
	if len(d.bars) == 0 {
		between = "midCat"
	}
	b.WriteString(`<c:valAx><c:axId val="222222222"/><c:scaling><c:orientation val="minMax"/>` + d.maximum() + least + `</c:scaling><c:delete val="0"/><c:axPos val="` + foot + `"/>`)
	b.WriteString(`<c:majorGridlines><c:spPr><a:ln w="6350"><a:solidFill><a:srgbClr val="` + lightGrey + `"/></a:solidFill></a:ln></c:spPr></c:majorGridlines>`)
	b.WriteString(titleXML(d.chart.YTitle, axisFont, false, rotation))
	fmt.Fprintf(b, `<c:numFmt formatCode="%s" sourceLinked="0"/><c:majorTickMark val="out"/><c:minorTickMark val="none"/><c:tickLblPos val="nextTo"/>`, escaped(d.valueFormat()))
	b.WriteString(axisLine + fontXML("c:txPr", axisFont, false, 0))
	fmt.Fprintf(b, `<c:crossAx val="111111111"/><c:crosses val="%s"/><c:crossBetween val="%s"/></c:valAx>`, meets, between)
}

// top is the highest point of the lines and bars, intervals included.
func (d drawing) top() float64 {
	top := 0.0
	for _, list := range [][]drawn{d.lines, d.bars} {
		for _, s := range list {
			for i, v := range s.values {
				if s.up != nil {
					v += s.up[i]
				}
				if !math.IsNaN(v) {
					top = math.Max(top, v)
				}
			}
		}
	}
	return top
}

// valueFormat gives a percent axis enough decimals that no two marks read alike.
func (d drawing) valueFormat() string {
	top := d.top()
	switch {
	case d.chart.Across:
		return "0.0"
	case !d.chart.Percent:
		return "#,##0"
	case top > 0.05 || top == 0:
		return `0\ %`
	case top > 0.005:
		return `0.0\ %`
	case top > 0.0005:
		return `0.00\ %`
	}
	return `0.000\ %`
}

// maximum fixes the end of the axis where bars carry intervals, which programs
// leave out when they choose it, and where they would go beyond 100 %.
func (d drawing) maximum() string {
	if top := d.top(); d.chart.Percent && top > 0.8 && top <= 1 {
		return `<c:max val="1"/>`
	}
	for _, s := range d.bars {
		if s.up == nil || d.top() == 0 {
			return ""
		}
	}
	if len(d.bars) == 0 {
		return ""
	}
	unit := math.Pow(10, math.Floor(math.Log10(d.top())))
	for _, k := range []float64{1.2, 1.6, 2, 2.5, 3, 4, 5, 6, 8, 10, 12} {
		if k*unit >= 1.02*d.top() {
			return `<c:max val="` + exact(math.Round(k*unit*1e12)/1e12) + `"/>`
		}
	}
	return ""
}

// legendXML lists what is drawn, without the unseen base of a band.
func (d drawing) legendXML(b *strings.Builder) {
	all := append(append(append([]drawn(nil), d.areas...), d.bars...), d.lines...)
	if len(all) < 2 {
		return
	}
	b.WriteString(`<c:legend><c:legendPos val="b"/>`)
	for i, s := range all {
		if s.hidden || s.unlisted {
			fmt.Fprintf(b, `<c:legendEntry><c:idx val="%d"/><c:delete val="1"/></c:legendEntry>`, i)
		}
	}
	b.WriteString(`<c:overlay val="0"/>` + fontXML("c:txPr", axisFont, false, 0) + `</c:legend>`)
}
