package pva

import (
	"strconv"
	"strings"
)

// UnknownKey is the fault of a path by position that is no key of a case. It
// names the first part that is wrong and the key that was probably meant.
func UnknownKey(path string) Fault {
	f := Fault{Key: path, Path: path, Want: "is not a key of a case", OfKey: true}
	pattern, pos := patternOf(path)
	if top := topOf(pattern); topRank[top] == 0 {
		near := Nearest(strings.ToLower(top), tops())
		if pattern == top && near == "" {
			near = meantKey(pattern) // a key without its table
		}
		if pattern != top || topRank[near] > 0 {
			f.Key, f.Path, f.Want = top, top, "is not a table of a case"
		}
		switch {
		case near == "" || strings.Contains(near, "*"):
			f.Fix = seeNew
		case arrayTables[near]:
			f.Meant, f.Fix = near, "did you mean [["+near+"]]?"
		case topRank[near] > 0:
			f.Meant, f.Fix = near, "did you mean ["+near+"]?"
		default:
			f.Meant, f.Fix = near, "did you mean "+near+"?"
		}
		return f
	}
	meant := meantKey(pattern)
	for _, p := range pos {
		meant = strings.Replace(meant, "*", strconv.Itoa(p+1), 1)
	}
	if meant == "" || strings.Contains(meant, "*") {
		f.Fix = seeNew
		return f
	}
	f.Meant = meant
	f.Fix = "did you mean " + meant + "?"
	return f
}

const seeNew = "`ebbline new` shows all keys of a case"

// meantKey is the key pattern that an unknown pattern was probably meant to be:
// a slip of the last word, or the right word in the wrong table.
func meantKey(pattern string) string {
	if len(pattern) > 80 {
		return ""
	}
	cut := strings.LastIndexByte(pattern, '.')
	parent, last := pattern[:max(cut, 0)], pattern[cut+1:]
	siblings := map[string]bool{}
	var words []string
	for _, k := range keys {
		if rest, ok := strings.CutPrefix(k.Path, parent+"."); ok && parent != "" {
			word, _, _ := strings.Cut(rest, ".")
			if word != "*" && !siblings[word] {
				siblings[word] = true
				words = append(words, word)
			}
		}
	}
	if near := Nearest(strings.ToLower(last), words); near != "" {
		return parent + "." + near
	}
	var same, sameTop []string
	for _, k := range keys {
		// A row of another table would need a position that nobody gave.
		if strings.Count(k.Path, "*") > strings.Count(pattern, "*") || !strings.HasSuffix(k.Path, "."+last) {
			continue
		}
		same = append(same, k.Path)
		if topOf(k.Path) == topOf(pattern) {
			sameTop = append(sameTop, k.Path)
		}
	}
	switch {
	case len(sameTop) == 1:
		return sameTop[0]
	case len(same) == 1:
		return same[0]
	}
	return nearestWithin(pattern, patterns(), 2)
}

func tops() []string {
	var out []string
	seen := map[string]bool{}
	for _, k := range keys {
		if top := topOf(k.Path); !seen[top] {
			seen[top] = true
			out = append(out, top)
		}
	}
	return out
}

func patterns() []string {
	out := make([]string, len(keys))
	for i, k := range keys {
		out[i] = k.Path
	}
	return out
}

// shape says what a path that holds further keys is: "a table", "a list" or "a
// list of tables"; "" for a key of its own and for what is unknown.
func shape(path string) string {
	pattern, _ := patternOf(path)
	switch {
	case arrayTables[pattern]:
		return "a list of tables"
	case anyKeyUnder(pattern + ".*."):
		if k, _ := Find(path + ".1.1"); k != nil {
			return "a list of lists"
		}
		return "a list of tables"
	case anyKeyUnder(pattern + ".*"):
		return "a list"
	case anyKeyUnder(pattern+".") || pattern == "option.*.set":
		return "a table"
	}
	return ""
}

// shapeFix shows how a list or table is written.
func shapeFix(path string) string {
	pattern, _ := patternOf(path)
	switch shape(path) {
	case "a list":
		return "write the values between [ and ]"
	case "a list of lists":
		return "write [[60, 0], [100, 5]]: abundance and take"
	case "a list of tables":
		if arrayTables[pattern] {
			return "write [[" + pattern + "]] on a line of its own and its keys below"
		}
		return "write [ { from = 2035, factor = 0.9 } ]"
	case "a table":
		if pattern == "option.*.set" {
			return `write { "harvest.control.take" = 4 }`
		}
		if !strings.Contains(pattern, ".") {
			return "write [" + pattern + "] on a line of its own and its keys below"
		}
		for _, k := range keys {
			if rest, ok := strings.CutPrefix(k.Path, pattern+"."); ok {
				return "write { " + rest + " = ... }"
			}
		}
	}
	return ""
}

func anyKeyUnder(prefix string) bool {
	for _, k := range keys {
		if strings.HasPrefix(k.Path, prefix) {
			return true
		}
	}
	return false
}

// Nearest is the known name closest to an unknown one by edit distance
// (Levenshtein 1966), or "" if nothing is near enough to be a slip: one letter
// in three, at least one and two from four letters on (common practice, no source).
func Nearest(name string, known []string) string {
	if len(name) > 80 {
		return ""
	}
	most := max(1, len(name)/3)
	if len(name) >= 4 {
		most = max(2, most)
	}
	return nearestWithin(name, known, most)
}

// nearestWithin is the known name at most so many letters away, "" if none.
func nearestWithin(name string, known []string, most int) string {
	best, at := most+1, ""
	for _, k := range known {
		if d := editDistance(name, k); d < best {
			best, at = d, k
		}
	}
	return at
}

func editDistance(a, b string) int {
	prev := make([]int, len(b)+1)
	for j := range prev {
		prev[j] = j
	}
	for i := 1; i <= len(a); i++ {
		diagonal := prev[0]
		prev[0] = i
		for j := 1; j <= len(b); j++ {
			cost := diagonal
			if a[i-1] != b[j-1] {
				cost++
			}
			diagonal = prev[j]
			prev[j] = min(cost, prev[j]+1, prev[j-1]+1)
		}
	}
	return prev[len(b)]
}
