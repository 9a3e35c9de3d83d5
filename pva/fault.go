package pva

import (
	"strings"
	"unicode"
)

// Fault is one thing wrong with a case: the key, the value as written, what was
// expected and, where there is one, the fix. Only package casefile knows the
// file, line and column.
type Fault struct {
	Key   string // by name where the table has one; "" for the case as a whole
	Path  string // by position, so that a reader can find the place
	Value string
	Want  string
	Fix   string
	// OfKey says that the key itself is at fault, not its value: it is unknown,
	// or should not stand there at all.
	OfKey bool
	// Missing says that the key is not there and should be.
	Missing bool
	// Meant is the path of the known key that an unknown one was probably meant
	// to be; a Missing fault about that key would only say the same again.
	Meant string
	// unused marks a key that the chosen rule or form has no use for; an
	// override that changes the rule drops such keys instead of failing.
	unused bool
}

// Error is the fault on one line: key, value and what is wrong, then the fix.
func (f Fault) Error() string {
	var b strings.Builder
	if f.Key != "" {
		b.WriteString(f.Key + ": ")
	}
	if f.Value != "" {
		b.WriteString(f.Value + " ")
	}
	b.WriteString(f.Want)
	if f.Fix != "" {
		b.WriteString("; " + f.Fix)
	}
	return printable(b.String())
}

// printable replaces what a terminal would act on: names and texts of a case
// come from outside.
func printable(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsPrint(r) {
			return r
		}
		return '?'
	}, s)
}

// Faults is all that is wrong with a case, in the order of the file.
type Faults []Fault

func (fs Faults) Error() string {
	lines := make([]string, len(fs))
	for i, f := range fs {
		lines[i] = f.Error()
	}
	return strings.Join(lines, "\n")
}

// WithoutEchoes is the faults less those that only repeat another: a key that
// is missing because it was misspelt, or because what stands there is no value.
func (fs Faults) WithoutEchoes() Faults {
	said := map[string]bool{}
	below := map[string]bool{} // paths under which something is faulted
	for _, f := range fs {
		if f.Meant != "" {
			said[f.Meant] = true
		}
		if !f.Missing {
			said[f.Path] = true
			for at := strings.LastIndexByte(f.Path, '.'); at > 0; at = strings.LastIndexByte(f.Path[:at], '.') {
				below[f.Path[:at]] = true
			}
		}
	}
	kept := fs[:0:0]
	for _, f := range fs {
		if f.Missing && (below[f.Path] || echoes(f.Path, said)) {
			continue
		}
		kept = append(kept, f)
	}
	return kept
}

// echoes says whether a missing key, its rival, or a table around it has been
// faulted already.
func echoes(path string, said map[string]bool) bool {
	if said[path] {
		return true
	}
	for _, rival := range rivalsOf(path) {
		if said[rival] {
			return true
		}
	}
	for at := strings.LastIndexByte(path, '.'); at > 0; at = strings.LastIndexByte(path[:at], '.') {
		if said[path[:at]] {
			return true
		}
	}
	return false
}

// Warning is a doubt that a reviewer would raise. It is no error: it travels
// with the result and is printed wherever the result is.
type Warning struct {
	Key  string
	Text string
}

func (w Warning) String() string {
	if w.Key == "" {
		return w.Text
	}
	return w.Key + ": " + w.Text
}
