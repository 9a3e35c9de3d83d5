package casefile

import (
	"sort"
	"strings"
	"unicode"
	"unicode/utf8"
)

// lines finds line and column of a byte offset.
type lines struct {
	data   []byte
	starts []int // offset at which line i+1 begins
}

func newLines(data []byte) *lines {
	l := &lines{data: data, starts: []int{0}}
	for i, c := range data {
		if c == '\n' {
			l.starts = append(l.starts, i+1)
		}
	}
	return l
}

// at is the line and column of an offset, from 1, the column in characters.
func (l *lines) at(offset int) (line, col int) {
	offset = min(max(offset, 0), len(l.data))
	line = sort.SearchInts(l.starts, offset+1)
	return line, utf8.RuneCount(l.data[l.starts[line-1]:offset]) + 1
}

// snippetWidth is how many characters of a long line are shown.
const snippetWidth = 100

// snippet is the line at an offset with a caret under the character there; "" for
// an empty line.
func (l *lines) snippet(offset int) string {
	line, col := l.at(offset)
	end := len(l.data)
	if line < len(l.starts) {
		end = l.starts[line] - 1
	}
	// Only a window of a very long line is looked at.
	start := l.starts[line-1]
	before, cut := l.data[start:min(offset, end)], ""
	if utf8.RuneCount(before) > snippetWidth-30 {
		runes := []rune(string(before[max(0, len(before)-4*snippetWidth):]))
		before, cut = []byte(string(runes[max(0, len(runes)-snippetWidth+30):])), "…"
		col = utf8.RuneCount(before) + 2
	}
	after := l.data[min(offset, end):end]
	rest := []rune(string(after[:min(len(after), 4*snippetWidth)]))
	rest = rest[:min(len(rest), snippetWidth-min(col, snippetWidth))]
	text := shown(cut + string(before) + string(rest))
	if strings.TrimSpace(text) == "" {
		return "" // nothing to see
	}
	var caret strings.Builder
	for i, r := range []rune(text) {
		if i == col-1 {
			break
		}
		if r == '\t' {
			caret.WriteRune(r)
		} else {
			caret.WriteByte(' ')
		}
	}
	return "    " + strings.TrimRight(text, " \t\r") + "\n    " + caret.String() + "^"
}

// shown replaces what a terminal would act on.
func shown(s string) string {
	return strings.Map(func(r rune) rune {
		if r == '\t' || unicode.IsPrint(r) {
			return r
		}
		if r == '\r' {
			return -1
		}
		return '?'
	}, s)
}
