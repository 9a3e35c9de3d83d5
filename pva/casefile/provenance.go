package casefile

import (
	"strconv"
	"strings"

	"ebbline/pva"

	"github.com/pelletier/go-toml/v2/unstable"
)

// isProvenance says whether a key of a list is one of its provenance table.
func isProvenance(n *node, part string) bool {
	return n.numbers && (part == "value" || part == "source" || part == "note")
}

// provenance takes value, source or note of a number, or of a whole list of
// numbers. It says whether it took the key to its end.
func (r *reader) provenance(n *node, path, part string, last bool, valueAt int, v *unstable.Node, named bool) bool {
	r.valueAt = valueAt
	fault := func(at int, value, want, fix string) bool {
		r.fail(at, pva.Fault{Key: path, Path: path, Value: value, Want: want, Fix: fix, OfKey: true})
		return false
	}
	what := "number"
	if n.numbers {
		what = "list"
	}
	if !last || !(part == "value" || part == "source" || part == "note") {
		return fault(r.keyAt, "", "has no part "+strconv.Quote(part), "a "+what+" with its origin is { value = ..., source = \"...\", note = \"...\" }")
	}
	p := r.sources[path]
	if p == nil {
		p = &provenance{at: r.keyAt}
		r.sources[path] = p
		r.order = append(r.order, path)
	}
	if part == "value" {
		p.value = true
		if _, known := r.places[path]; !known {
			r.places[path] = place{r.keyAt, r.keyAt}
		}
		if n.numbers && v.Kind != unstable.Array {
			return fault(r.valueAt, "", "is not a list", "write value = [ ... ]")
		}
		r.value(n, path, v, how{named: named, wrapped: true})
		return true
	}
	if v.Kind != unstable.String {
		return fault(r.valueAt, literalShown(v), "is not a text", "put the "+part+" in quotes")
	}
	text := strings.TrimSpace(plainBreaks(v.Data))
	if part == "note" {
		p.note = text
		return true
	}
	p.source = sourceText(text)
	return true
}

// sourceText is a source as kept: "assumed" is one word however it is written.
func sourceText(s string) string {
	s = strings.TrimSpace(s)
	if strings.EqualFold(s, "assumed") {
		return "assumed"
	}
	return s
}

// finish joins sources to their numbers, once all lines are read, and looks for
// rows without any key.
func (r *reader) finish() {
	for _, path := range r.order {
		if p := r.sources[path]; !p.value {
			r.fail(p.at, pva.Fault{Key: path, Path: path, OfKey: true, Want: "has an origin but no value", Fix: "add value = ..."})
		}
	}
	filled := map[string]bool{}
	for i := range r.entries {
		e := &r.entries[i]
		for path, ok := e.Path, true; ok; path, _, ok = cutLast(path) {
			filled[path] = true
			p := r.sources[path]
			if p == nil || e.Value.Kind == pva.ListKind {
				continue
			}
			if e.Source == "" {
				e.Source = p.source
			}
			if e.Note == "" {
				e.Note = p.note
			}
		}
	}
	for list, rows := range r.rows {
		for n := 1; n <= min(rows, mostRows); n++ {
			path := list + "." + strconv.Itoa(n)
			if filled[path] || r.faulted(path) {
				continue
			}
			r.fail(r.places[path].key, pva.Fault{Key: path, Path: path, OfKey: true, Want: "is an empty table", Fix: "remove it or fill it"})
		}
	}
}

// faulted says whether something at or under a path has been faulted already.
func (r *reader) faulted(path string) bool {
	for _, f := range r.faults {
		if f.fault.Path == path || strings.HasPrefix(f.fault.Path, path+".") {
			return true
		}
	}
	return false
}
