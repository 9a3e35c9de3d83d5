package pva

import (
	"math"
	"strconv"
	"strings"
)

// Key is one row of the key table: everything the program knows about one key
// of a case. Reading, writing, overrides, options, sweeps, uncertain inputs and
// the nearest-key hint all work from it, so that a key is added in one place.
type Key struct {
	Path    string // a position in an array table or list is "*"
	Unit    string // "" for a pure number or a word
	Doc     string // one line for the Inputs sheet and the starter case
	Min     float64
	Max     float64
	OpenMin bool // Min itself is not allowed
	OpenMax bool
	Whole   bool     // whole numbers only
	Choices []string // for words: what is allowed; empty means free text
	// Default is the value when the key is not given: a float64, a string, a
	// bool, or nil for a key that has none.
	Default any
	// Required keys have no default and must be given (in each row of an array table).
	Required bool
	// When limits the key to certain values of a sibling word ("rule", "form",
	// "law", "offspring", "breeding"); WhenPath is that sibling's path.
	WhenPath string
	When     []string
	at       func(c *Case, i []int) any
	asks     string // what Asks says, made once
}

// At is a pointer to the field of the key in c: *float64, *Optional, *int,
// *int64, *uint64, *string, *bool or *Years. Positions count from 0, one for
// each "*" of Path; lists grow to hold them.
func (k *Key) At(c *Case, positions ...int) any { return k.at(c, positions) }

// IsNumber says whether the key holds a number (and so may carry provenance).
func (k *Key) IsNumber() bool {
	switch k.at(new(Case), make([]int, strings.Count(k.Path, "*"))).(type) {
	case *float64, *Optional, *int, *int64, *uint64:
		return true
	}
	return false
}

// Range says in words what a number of this key may be.
func (k *Key) Range() string {
	kind := "a number"
	if k.Whole {
		kind = "a whole number"
	}
	// A bound that only keeps numbers exact is no advice to anybody.
	lo, hi := k.Min > -latest, k.Max < 1e6
	switch {
	case lo && hi && !k.OpenMin && !k.OpenMax:
		return kind + " from " + plainNumber(k.Min) + " to " + plainNumber(k.Max)
	case lo && hi:
		a, b := "from ", "to "
		if k.OpenMin {
			a = "above "
		}
		if k.OpenMax {
			b = "below "
		}
		return kind + " " + a + plainNumber(k.Min) + " and " + strings.Replace(b, "to ", "up to ", 1) + plainNumber(k.Max)
	case lo && k.OpenMin:
		return kind + " above " + plainNumber(k.Min)
	case lo:
		return kind + ", " + plainNumber(k.Min) + " or more"
	}
	return kind
}

// tiniest is the smallest number but 0 that a case may hold: nothing in nature is
// as small, and what is made of much smaller ones has no digits left.
const tiniest = 1e-30

// Asks says in words what is to be given under the key.
func (k *Key) Asks() string { return k.asks }

func (k *Key) makeAsks() string {
	what := k.Range()
	switch k.at(new(Case), make([]int, 3)).(type) {
	case *string:
		what = "a text"
		if len(k.Choices) > 0 {
			what = anyOf(k.Choices)
		}
	case *bool:
		what = "true or false"
	case *Years:
		what = `years such as "2027-2056"`
	}
	return what + ": " + k.Doc
}

// anyOf lists words as a reader would write them: "a", "b" or "c".
func anyOf(words []string) string {
	out := ""
	for i, w := range words {
		switch {
		case i > 0 && i == len(words)-1:
			out += " or "
		case i > 0:
			out += ", "
		}
		out += strconv.Quote(w)
	}
	return out
}

func plainNumber(v float64) string {
	if v == math.Trunc(v) && math.Abs(v) < 1e15 {
		return strconv.FormatFloat(v, 'f', -1, 64)
	}
	return strings.Replace(strconv.FormatFloat(v, 'g', 6, 64), "e+", "e", 1)
}

// offends says which bound v breaks; "" if none.
func (k *Key) offends(v float64) string {
	switch {
	case math.IsNaN(v) || math.IsInf(v, 0):
		return "is not a finite number"
	case v < k.Min:
		return "is below " + plainNumber(k.Min)
	case v > k.Max:
		return "is above " + plainNumber(k.Max)
	case k.OpenMin && v == k.Min:
		return "is not above " + plainNumber(k.Min)
	case k.OpenMax && v == k.Max:
		return "is not below " + plainNumber(k.Max)
	case k.Whole && v != math.Trunc(v):
		return "is not a whole number"
	case v != 0 && math.Abs(v) < tiniest:
		return "is nearer to 0 than " + plainNumber(tiniest)
	}
	return ""
}

// Keys is the key table in the order in which cases are written.
func Keys() []*Key { return keys }

// Find is the key of a path by position, with its positions counted from 0;
// nil if there is no such key. "option.1.set.KEY" finds no key of its own.
func Find(path string) (*Key, []int) {
	pattern, pos := patternOf(path)
	if i, ok := keyIndex[pattern]; ok {
		return keys[i], pos
	}
	return nil, nil
}

// patternOf replaces each position of a path by "*". A position is a whole
// number from 1, counted from 0 in the result.
func patternOf(path string) (string, []int) {
	parts := strings.Split(path, ".")
	var pos []int
	for i, p := range parts {
		if n, ok := position(p); ok {
			parts[i] = "*"
			pos = append(pos, n-1)
		}
	}
	return strings.Join(parts, "."), pos
}

func position(s string) (int, bool) {
	if s == "" || len(s) > 6 || s[0] == '0' {
		return 0, false
	}
	n := 0
	for _, r := range s {
		if r < '0' || r > '9' {
			return 0, false
		}
		n = n*10 + int(r-'0')
	}
	return n, true
}

var (
	keys     []*Key
	keyIndex = map[string]int{}
	topRank  = map[string]int{}
	// arrayTables are the tables that may stand several times.
	arrayTables = map[string]bool{
		"catastrophe": true, "harvest": true, "stocking": true, "uncertain": true,
		"uncertain_pair": true, "option": true, "sweep": true,
	}
)

func init() {
	for _, group := range [][]*Key{headKeys(), rateKeys(), ruleKeys(), tailKeys()} {
		keys = append(keys, group...)
	}
	for i, k := range keys {
		if _, twice := keyIndex[k.Path]; twice {
			panic("pva: key twice in the table: " + k.Path)
		}
		keyIndex[k.Path] = i
		k.asks = k.makeAsks()
		if top := topOf(k.Path); topRank[top] == 0 {
			topRank[top] = len(topRank) + 1
		}
	}
}

// grow returns a pointer to element i of a list, which is lengthened to hold it.
func grow[T any](list *[]T, i int) *T {
	for len(*list) <= i {
		var zero T
		*list = append(*list, zero)
	}
	return &(*list)[i]
}
