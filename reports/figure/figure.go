// Package figure draws a report's charts as PNG and SVG files for a permit
// document: readable in grey and by readers of any colour vision, because lines
// differ by pattern and marks and bands by shade, not by colour alone.
//
// It decides nothing about content and reads no clock: one report always gives
// the same bytes. It refuses nothing that a report can hold; gaps in the figures
// are gaps in the curves. It is called by the commands.
package figure

import (
	"bytes"
	"fmt"
	"html"
	"os"
	"path/filepath"
	"strings"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/vgimg"
	"gonum.org/v1/plot/vg/vgsvg"

	"ebbline/reports"
)

// Size of a figure and how finely the PNG is drawn: the width of a column of
// text, and what printers ask for.
const (
	width  = 16 * vg.Centimeter
	height = 10.5 * vg.Centimeter
	dpi    = 300
)

// charts are the identities of all charts that a report may have.
var charts = []string{"risk", "abundance", "fall", "options", "drivers", "risk_law", "uncertain_inputs", "cells", "trace", "trade_off", "influences"}

// Names are the names of all files that Write may make.
func Names() []string {
	var out []string
	for _, id := range charts {
		out = append(out, id+".png", id+".svg")
	}
	return out
}

// Write draws every chart of a report into a folder, made if it is not there,
// as ID.png and ID.svg. Each file is written whole or not at all; files of the
// same names are replaced.
func Write(r *reports.Report, dir string) error {
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return fmt.Errorf("the figures: %w", err)
	}
	done := map[string]bool{}
	for _, p := range r.Parts {
		for _, c := range p.Charts {
			if done[c.ID] {
				continue
			}
			done[c.ID] = true
			t := r.Table(c.Table)
			if t == nil {
				panic("figure: chart " + c.ID + " without a table " + c.Table)
			}
			png, svg, err := drawn(c, t)
			if err != nil {
				return fmt.Errorf("the figure %s: %w", c.ID, err)
			}
			for name, data := range map[string][]byte{c.ID + ".png": png, c.ID + ".svg": svg} {
				if err := reports.Save(filepath.Join(dir, name), data); err != nil {
					return err
				}
			}
		}
	}
	return nil
}

// drawn is one chart in both forms.
func drawn(c reports.Chart, t *reports.Table) (png, svg []byte, err error) {
	s := newSheet(c, t)
	raster := vgimg.PngCanvas{Canvas: vgimg.NewWith(vgimg.UseWH(width, height), vgimg.UseDPI(dpi))}
	s.draw(draw.New(raster))
	var b bytes.Buffer
	if _, err := raster.WriteTo(&b); err != nil {
		return nil, nil, err
	}
	v, err := vectorBytes(s)
	return b.Bytes(), described(v, c), err
}

// described puts the chart's title and its description in words into an SVG,
// for readers that speak, and names fonts that stand in where the one it was
// measured in is missing.
func described(svg []byte, c reports.Chart) []byte {
	text := string(svg)
	text = strings.ReplaceAll(text, "font-family:Liberation Sans;", "font-family:'Liberation Sans',Arial,Helvetica,sans-serif;")
	open := strings.Index(text, "<svg")
	if open < 0 {
		return svg
	}
	end := open + strings.IndexByte(text[open:], '>') + 1
	words := "\n<title>" + html.EscapeString(clean(c.Title)) + "</title>\n<desc>" + html.EscapeString(clean(c.Alt)) + "</desc>"
	return []byte(text[:end] + words + text[end:])
}

// clean is a text without characters that XML forbids and fonts do not have.
func clean(s string) string {
	return strings.Map(func(r rune) rune {
		switch {
		case r == '\n' || r == '\t' || r == '\r':
			return ' '
		case r < 0x20 || r == 0xfffe || r == 0xffff || r >= 0xd800 && r < 0xe000:
			return -1
		}
		return r
	}, strings.ToValidUTF8(s, "\ufffd"))
}

// vectorBytes is a laid-out figure as an SVG.
func vectorBytes(s *sheet) ([]byte, error) {
	vector := vgsvg.New(width, height)
	s.draw(draw.New(vector))
	var v bytes.Buffer
	_, err := vector.WriteTo(&v)
	return v.Bytes(), err
}
