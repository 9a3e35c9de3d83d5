// Package text renders a report for a terminal: few lines, in a person's
// reading order, at most 80 columns wide. It writes human text only; programs
// read the JSON of package tidy.
package text

import (
	"strings"
	"unicode/utf8"
)

// Width is the number of columns that text is wrapped to.
const Width = 80

// wrap breaks text into lines of at most Width columns, each begun with indent;
// lines after the first are indented by hang more.
func wrap(text, indent string, hang int) string { return wrapIn(text, indent, hang, Width) }

// wrapTo breaks text into lines of at most width columns.
func wrapTo(text string, width int) string { return wrapIn(text, "", 0, width) }

func wrapIn(text, indent string, hang, width int) string {
	var out strings.Builder
	line := indent
	used := 0
	for _, word := range words(text) {
		n := utf8.RuneCountInString(word)
		if used > 0 && utf8.RuneCountInString(line)+1+n > width {
			out.WriteString(strings.TrimRight(line, " ") + "\n")
			line = indent + strings.Repeat(" ", hang)
			used = 0
		}
		if used > 0 {
			line += " "
		}
		line += word
		used++
	}
	if used > 0 {
		out.WriteString(strings.TrimRight(line, " ") + "\n")
	}
	return out.String()
}

// words are the parts of a text between which a line may break: not between a
// number and its percent sign.
func words(text string) []string {
	var out []string
	for _, w := range strings.Fields(text) {
		if n := len(out); n > 0 && strings.HasPrefix(w, "%") && endsInDigit(out[n-1]) {
			out[n-1] += " " + w
			continue
		}
		out = append(out, w)
	}
	return out
}

func endsInDigit(s string) bool { return s != "" && s[len(s)-1] >= '0' && s[len(s)-1] <= '9' }

// columns lays rows out in columns as wide as their widest cell, two spaces
// apart; right says which columns are set flush right.
func columns(rows [][]string, indent string, right ...bool) string {
	var widths []int
	for _, r := range rows {
		for i, cell := range r {
			if i >= len(widths) {
				widths = append(widths, 0)
			}
			widths[i] = max(widths[i], utf8.RuneCountInString(cell))
		}
	}
	var out strings.Builder
	for _, r := range rows {
		line := indent
		for i, cell := range r {
			pad := strings.Repeat(" ", widths[i]-utf8.RuneCountInString(cell))
			if i < len(right) && right[i] {
				line += pad + cell
			} else {
				line += cell + pad
			}
			line += "  "
		}
		out.WriteString(strings.TrimRight(line, " ") + "\n")
	}
	return out.String()
}
