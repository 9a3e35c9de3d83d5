package workbook

import (
	"math"
	"regexp"
	"strings"
	"unicode"
	"unicode/utf8"
)

// longestText is how many UTF-16 units of a text go into one cell; a cell holds
// 32,767 and cuts the rest without a word.
const longestText = 32700

// clean makes a text fit for a cell: no characters that XML forbids, no carriage
// returns, and not longer than a cell holds; what is cut off says so.
func clean(s string) string {
	ok := func(r rune) bool {
		return r == '\t' || r == '\n' || r >= 0x20 && r != utf8.RuneError && r != 0xfffe && r != 0xffff
	}
	fine := utf8.ValidString(s)
	for _, r := range s {
		fine = fine && ok(r)
	}
	if !fine {
		var b strings.Builder
		for _, r := range s {
			switch {
			case ok(r):
				b.WriteRune(r)
			case r == utf8.RuneError:
				b.WriteRune(r) // the sign for a broken character, which XML allows
			}
		}
		s = b.String()
	}
	if units(s) > longestText {
		s = cut(s, longestText-60) + " [cut here: the whole text is under Run again]"
	}
	return s
}

var escapeLike = regexp.MustCompile(`^_x[0-9A-Fa-f]{4}_`)

// cellText is a clean text as a cell stores it: spreadsheets read _x0041_ as the
// letter A, so that an underscore which would start such a sign is itself
// written as one. The library leaves this out for shared texts.
func cellText(s string) string {
	s = clean(s)
	if !strings.Contains(s, "_x") {
		return s
	}
	var b strings.Builder
	for i := range len(s) {
		if s[i] == '_' && escapeLike.MatchString(s[i:]) {
			b.WriteString("_x005F_")
			continue
		}
		b.WriteByte(s[i])
	}
	return b.String()
}

// units is the length of a text as spreadsheets count it, in UTF-16 units.
func units(s string) int {
	n := 0
	for _, r := range s {
		n++
		if r > 0xffff {
			n++
		}
	}
	return n
}

// cut keeps the first n UTF-16 units of a text, between characters.
func cut(s string, n int) string {
	for i, r := range s {
		size := 1
		if r > 0xffff {
			size = 2
		}
		if n < size {
			return s[:i]
		}
		n -= size
	}
	return s
}

// headerText is a text inside a page header, where an ampersand is a command.
func headerText(s string) string {
	s = strings.ReplaceAll(s, "\n", " ")
	// A digit right after a section's mark would be read as a font size.
	if s != "" && unicode.IsDigit(rune(s[0])) {
		s = " " + s
	}
	return strings.ReplaceAll(s, "&", "&&")
}

// quoted is a sheet's name as formulas write it.
func quoted(sheet string) string { return "'" + strings.ReplaceAll(sheet, "'", "''") + "'" }

// spaceWidth is the width of a space in widths of a digit.
const spaceWidth = 0.52

// monoLines is how many lines a text in a typewriter face takes in a column so
// many digits of the text face wide. Such a face has one width, 0.6 of the size,
// and the face of the columns 0.556.
func monoLines(s string, width float64) int {
	per := max(1, int(width*0.556/0.6))
	n, at := 1, 0
	for i, word := range strings.Split(s, " ") {
		w := 0
		for _, r := range word {
			w++
			if r > 0x2e80 {
				w++
			}
		}
		switch {
		case i > 0 && at+1+w > per:
			n++
			at = w
		case i > 0:
			at += 1 + w
		default:
			at = w
		}
		if at > per {
			n += (at - 1) / per
			at = (at-1)%per + 1
		}
	}
	return n
}

// lines is how many lines a text takes in a column so many characters wide,
// counted word by word as a spreadsheet wraps it.
func lines(s string, width float64) int {
	n := 0
	for _, line := range strings.Split(s, "\n") {
		at := 0.0
		n++
		for _, word := range strings.Fields(line) {
			w := wide(word)
			switch {
			case at == 0:
				at = w
			case at+spaceWidth+w > width:
				n++
				at = w
			default:
				at += spaceWidth + w
			}
			if at > width {
				n += int(math.Ceil(at/width)) - 1
				at = math.Mod(at, width)
			}
		}
	}
	return max(1, n)
}

// wide is the width of a text in widths of a digit, from the widths of Arial and
// its like, where a digit is 0.556 of the size.
func wide(s string) float64 {
	w := 0.0
	for _, r := range s {
		switch {
		case r > 0x2e80: // characters drawn two columns wide
			w += 2
		case strings.ContainsRune("ijl'|", r):
			w += 0.42
		case strings.ContainsRune("ft.,;:!/ []", r):
			w += 0.52
		case strings.ContainsRune("r()-", r):
			w += 0.62
		case strings.ContainsRune("cksvxyz", r):
			w += 0.92
		case strings.ContainsRune("mMW%@", r):
			w += 1.6
		case unicode.IsUpper(r) || r == 'w':
			w += 1.3
		default:
			w += 1.01
		}
	}
	return w
}
