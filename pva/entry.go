package pva

import (
	"crypto/sha256"
	"encoding/hex"
	"sort"
	"strconv"
	"strings"
)

// Kind is the kind of a Value.
type Kind uint8

// The kinds of value that a case file can hold under one key.
const (
	NumberKind Kind = iota
	TextKind
	FlagKind
	// ListKind stands only in what an option or override sets: it says that a
	// whole list is replaced, and its elements follow under positions of their own.
	ListKind
)

func (k Kind) String() string {
	return [...]string{"a number", "a text", "true or false", "a list"}[k]
}

// Value is one number, text or flag as written. A number keeps its literal, so
// that a 64-bit seed loses nothing on the way.
type Value struct {
	Kind Kind
	Num  float64
	Text string // the text, or the number's literal
	Flag bool
}

// Num makes a number value with its shortest literal.
func Num(v float64) Value {
	return Value{Kind: NumberKind, Num: v, Text: strconv.FormatFloat(v, 'g', -1, 64)}
}

// Text makes a text value.
func Text(s string) Value { return Value{Kind: TextKind, Text: s} }

// Flag makes a true-or-false value.
func Flag(b bool) Value { return Value{Kind: FlagKind, Flag: b} }

// String shows the value as a reader would write it, without quotes.
func (v Value) String() string {
	switch v.Kind {
	case FlagKind:
		return strconv.FormatBool(v.Flag)
	case ListKind:
		return "(list)"
	}
	return v.Text
}

// Origin says where a value in force comes from.
type Origin uint8

// The origins of a value, from weakest to strongest.
const (
	FromDefault  Origin = iota // nobody gave it
	FromCase                   // written in the case
	FromOverride               // set on the command line, by an option, a cell or a draw
)

// Entry is one key of a case with its value and where that value comes from.
// Path is by position ("harvest.1.take", "births.by_year.2"), counted from 1.
type Entry struct {
	Path   string
	Value  Value
	Source string // "" is unsourced, "assumed" is said openly
	Note   string
	Origin Origin
}

// Digest names what a case computes and says: the SHA-256 of its entries in
// the order of the key table, sources included, but not of the seed and the
// number of replicates, which are stated beside it.
func (c *Case) Digest() string {
	rows := make([]string, 0, len(c.entries))
	for _, e := range Ordered(c.entries) {
		if e.Path == "run.seed" || e.Path == "run.replicates" {
			continue
		}
		v := e.Value.String()
		if e.Value.Kind == NumberKind {
			v = strconv.FormatFloat(e.Value.Num, 'g', -1, 64)
		}
		source, note := e.Source, e.Note
		if e.Value.Kind != NumberKind {
			source, note = "", "" // words carry no provenance: a case file has no place for it
		}
		rows = append(rows, strings.Join([]string{e.Path, strconv.Itoa(int(e.Value.Kind)), v, source, note}, "\x1f"))
	}
	sum := sha256.Sum256([]byte(strings.Join(rows, "\x1e")))
	return "sha256:" + hex.EncodeToString(sum[:])
}

// Ordered is the entries sorted as the key table lists them, array tables by position.
func Ordered(entries []Entry) []Entry {
	out := append([]Entry(nil), entries...)
	type rank struct {
		key int
		pos []int
	}
	ranks := make(map[string]rank, len(out))
	for _, e := range out {
		pattern, pos := patternOf(e.Path)
		at, ok := keyIndex[pattern]
		if !ok {
			at = len(keys)
		}
		ranks[e.Path] = rank{at, pos}
	}
	sort.SliceStable(out, func(i, j int) bool {
		a, b := ranks[out[i].Path], ranks[out[j].Path]
		ta, tb := topOf(out[i].Path), topOf(out[j].Path)
		if topRank[ta] != topRank[tb] {
			return topRank[ta] < topRank[tb]
		}
		// Rows of one array table stay together: position first, then the key.
		if arrayTables[ta] && len(a.pos) > 0 && len(b.pos) > 0 && a.pos[0] != b.pos[0] {
			return a.pos[0] < b.pos[0]
		}
		if a.key != b.key {
			return a.key < b.key
		}
		return pathLess(out[i].Path, out[j].Path)
	})
	return out
}

// pathLess compares two paths part by part, positions as numbers and before words.
func pathLess(a, b string) bool {
	for a != b {
		var x, y string
		x, a, _ = strings.Cut(a, ".")
		y, b, _ = strings.Cut(b, ".")
		if x == y {
			continue
		}
		m, isM := position(x)
		n, isN := position(y)
		switch {
		case isM && isN:
			return m < n
		case isM != isN:
			return isM && y != "" || x == ""
		}
		return x < y
	}
	return false
}

func topOf(path string) string {
	top, _, _ := strings.Cut(path, ".")
	return top
}
