package pva

import "strconv"

// gaps finds positions that skip one: births.by_year.3 without births.by_year.2.
// Such an entry would make up the values between; it is faulted, once a list,
// and left out (true at its index).
func (b *builder) gaps() map[int]bool {
	seen := map[string]map[int]bool{} // list -> positions
	for _, e := range b.c.entries {
		eachPosition(e.Path, func(list string, n int) bool {
			if seen[list] == nil {
				seen[list] = map[int]bool{}
			}
			seen[list][n] = true
			return true
		})
	}
	first := map[string]int{} // list -> first position that is not there
	for list, positions := range seen {
		n := 1
		for positions[n] {
			n++
		}
		first[list] = n
	}
	out := map[int]bool{}
	said := map[string]bool{}
	for i, e := range b.c.entries {
		eachPosition(e.Path, func(list string, n int) bool {
			if n < first[list] {
				return true
			}
			out[i] = true
			if !said[list] {
				said[list] = true
				b.missing(list+"."+strconv.Itoa(first[list]), "number them 1, 2, 3 without gaps: the case has "+e.Path)
			}
			return false
		})
	}
	return out
}

// eachPosition calls f with each list that the path leads through and the
// position in it, until f says stop. What an option sets is a path into another
// case and is looked at there.
func eachPosition(path string, f func(list string, n int) bool) {
	_, _, inOption := cutOption(path)
	start := 0
	for i := 0; i <= len(path); i++ {
		if i < len(path) && path[i] != '.' {
			continue
		}
		if n, ok := position(path[start:i]); ok && start > 0 {
			if !f(path[:start-1], n) || inOption {
				return
			}
		}
		start = i + 1
	}
}
