package pva

import (
	"strconv"
	"strings"
)

// With is the case with some keys set to other values, checked anew: an
// override from the command line, an option, a cell of a sweep or a draw. Later
// settings win over earlier ones of the same key. A key that the changed rule or
// form has no use for any more is dropped, as is the rival of a key that is set;
// every other fault is reported. The options and sweeps of the case stay as
// they are and are not tried anew: see CheckOptions.
func (c *Case) With(settings []Setting) (*Case, Faults) {
	ch := change{c: c, gone: map[string]bool{}, at: map[string]int{}, inList: map[string][]string{}, replaced: map[string]bool{}}
	for _, s := range settings {
		ch.set(s)
	}
	if len(ch.faults) > 0 {
		return nil, ch.faults
	}
	entries := ch.entries()
	if faults := ch.names(entries); len(faults) > 0 {
		return nil, faults
	}
	for {
		out, faults := build(entries)
		drop := map[string]bool{}
		for _, f := range faults {
			if _, fresh := ch.at[f.Path]; f.unused && !fresh && !ch.replaced[f.Path] && len(ch.inList[f.Path]) == 0 {
				drop[f.Path] = true
			}
		}
		if len(drop) == 0 {
			if len(faults) > 0 {
				return nil, faults.WithoutEchoes()
			}
			return out, nil
		}
		// What is dropped may leave another key without use: look again.
		entries = without(entries, func(p string) bool { return under(p, drop) })
	}
}

// change gathers what settings do to the entries of a case.
type change struct {
	c        *Case
	fresh    []Entry             // what is set, in order; an empty path marks one that was taken back
	at       map[string]int      // path -> index into fresh
	gone     map[string]bool     // paths, and lists with all their elements, that the case loses
	inList   map[string][]string // list -> fresh paths under it
	replaced map[string]bool     // lists and array tables given anew as a whole
	faults   Faults
}

func (ch *change) set(s Setting) {
	path := s.Path
	if !ch.replaced[topOf(path)] {
		at, fault := ch.c.Lookup(path)
		if fault != nil {
			ch.faults = append(ch.faults, *fault)
			return
		}
		path = at
	}
	if s.Value.Kind == ListKind { // the elements follow
		ch.gone[path], ch.replaced[path] = true, true
		for _, p := range ch.inList[path] {
			ch.take(p)
		}
		delete(ch.inList, path)
		return
	}
	ch.take(path)
	for _, rival := range rivalsOf(path) {
		if _, fresh := ch.at[rival]; !fresh {
			ch.gone[rival] = true
		}
	}
	ch.at[path] = len(ch.fresh)
	ch.fresh = append(ch.fresh, Entry{Path: path, Value: s.Value, Origin: FromOverride})
	for end := strings.LastIndexByte(path, '.'); end > 0; end = strings.LastIndexByte(path[:end], '.') {
		ch.inList[path[:end]] = append(ch.inList[path[:end]], path)
	}
}

// take takes back an earlier setting of the path.
func (ch *change) take(path string) {
	if i, ok := ch.at[path]; ok {
		ch.fresh[i].Path = ""
		delete(ch.at, path)
	}
	ch.gone[path] = true
}

func (ch *change) entries() []Entry {
	kept := without(ch.c.entries, func(p string) bool { return under(p, ch.gone) })
	for _, e := range ch.fresh {
		if e.Path != "" {
			kept = append(kept, e)
		}
	}
	return kept
}

// under says whether a path is one of those given or lies under one.
func under(path string, any map[string]bool) bool {
	for end := len(path); end > 0; end = strings.LastIndexByte(path[:end], '.') {
		if any[path[:end]] {
			return true
		}
	}
	return false
}

// names looks at the names of rows anew if one is set.
func (ch *change) names(entries []Entry) Faults {
	for path := range ch.at {
		if _, _, rest, ok := cutRow(path); ok && rest == "name" {
			r := newResolver(entries)
			return r.faults
		}
	}
	return nil
}

// rivals are keys of which a case gives only one: setting one drops the other.
// A list stands for all its elements.
var rivals = [][2]string{
	{"deaths.rate", "deaths.fraction"},
	{"births.crowding.scale", "births.crowding.capacity"},
	{"deaths.crowding.scale", "deaths.crowding.capacity"},
	{"catastrophe.*.chance", "catastrophe.*.once_in"},
	{"harvest.*.fraction", "harvest.*.rate"},
	{"uncertain.*.sd", "uncertain.*.low"},
	{"uncertain.*.sd", "uncertain.*.high"},
	{"uncertain.*.sd", "uncertain.*.mode"},
	{"sweep.*.values", "sweep.*.from"},
	{"sweep.*.values", "sweep.*.to"},
	{"sweep.*.values", "sweep.*.step"},
}

// rivalsOf is the paths that cannot stand beside this one.
func rivalsOf(path string) []string {
	pattern, pos := patternOf(path)
	pattern = strings.TrimSuffix(pattern, ".*") // an element stands for its list
	var out []string
	for _, r := range rivals {
		for side := 0; side < 2; side++ {
			if pattern != r[side] {
				continue
			}
			other := r[1-side]
			if len(pos) > 0 {
				other = strings.Replace(other, "*", strconv.Itoa(pos[0]+1), 1)
			}
			out = append(out, other)
		}
	}
	return out
}

func without(entries []Entry, gone func(path string) bool) []Entry {
	kept := make([]Entry, 0, len(entries))
	for _, e := range entries {
		if !gone(e.Path) {
			kept = append(kept, e)
		}
	}
	return kept
}
