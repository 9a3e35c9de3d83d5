package figure

import (
	"math"
	"strconv"
	"strings"

	"gonum.org/v1/plot"

	"ebbline/reports"
)

// marks are the marks of an axis, at whole steps.
type marks struct {
	step    float64
	percent bool
	dates   bool
}

// stepFor is a round step that parts a range into at most n.
func stepFor(span float64, n int, whole bool) float64 {
	if !(span > 0) || math.IsInf(span, 0) {
		return 1
	}
	for e := math.Floor(math.Log10(span/float64(n))) - 1; ; e++ {
		for _, k := range []float64{1, 2, 2.5, 5} {
			step := k * math.Pow(10, e)
			if span/step <= float64(n)+1e-9 && (!whole || step == math.Trunc(step)) {
				return step
			}
		}
	}
}

// Ticks are the marks between two ends.
func (m marks) Ticks(min, max float64) []plot.Tick {
	var out []plot.Tick
	decimals := 0
	scale := 1.0
	if m.percent {
		scale = 100
	}
	for d := m.step * scale; decimals < 12 && math.Abs(d-math.Round(d)) > 1e-9*d; d *= 10 {
		decimals++
	}
	for i := math.Ceil(min/m.step - 1e-9); i*m.step <= max+1e-9*m.step; i++ {
		v := i*m.step + 0 // no minus before a zero
		out = append(out, plot.Tick{Value: v, Label: m.label(v*scale, decimals)})
	}
	return out
}

func (m marks) label(v float64, decimals int) string {
	switch {
	case m.dates: // without groups of three
		return strconv.FormatFloat(v, 'f', 0, 64)
	case m.percent:
		return strconv.FormatFloat(v, 'f', decimals, 64) + " %"
	case decimals > 0:
		return strconv.FormatFloat(v, 'f', decimals, 64)
	case math.Abs(v) >= 1e15:
		return strconv.FormatFloat(v, 'g', 3, 64)
	}
	return reports.Grouped(int64(v))
}

// named are the marks of an axis of names, at 0, 1, 2 and so on.
type named []string

func (n named) Ticks(_, _ float64) []plot.Tick {
	out := make([]plot.Tick, len(n))
	for i, s := range n {
		out[i] = plot.Tick{Value: float64(i), Label: s}
	}
	return out
}

// wrapped breaks a text between words into lines of at most n characters, and no
// more than three lines.
func wrapped(s string, n int) string {
	var lines []string
	line := ""
	for _, word := range strings.Fields(clean(s)) {
		for len([]rune(word)) > n { // a word longer than a line
			r := []rune(word)
			if line != "" {
				lines, line = append(lines, line), ""
			}
			lines, word = append(lines, string(r[:n-1])+"-"), string(r[n-1:])
		}
		switch {
		case line == "":
			line = word
		case len([]rune(line))+1+len([]rune(word)) <= n:
			line += " " + word
		default:
			lines, line = append(lines, line), word
		}
	}
	if line != "" {
		lines = append(lines, line)
	}
	if len(lines) > 3 {
		lines = append(lines[:2], lines[2]+"...")
	}
	return strings.Join(lines, "\n")
}
