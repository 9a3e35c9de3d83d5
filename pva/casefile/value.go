package casefile

import (
	"bytes"
	"math"
	"strconv"
	"strings"

	"ebbline/pva"

	"github.com/pelletier/go-toml/v2/unstable"
)

// how says where a value stands.
type how struct {
	named   bool // in what an option or override sets: lists are marked
	inList  bool // an element of a list
	wrapped bool // the value of a provenance table
}

// value takes what stands to the right of a key, or as an element of a list.
func (r *reader) value(n *node, path string, v *unstable.Node, h how) {
	if v.Raw.Length > 0 {
		r.valueAt = int(v.Raw.Offset)
	}
	r.note(path)
	switch v.Kind {
	case unstable.Array:
		r.list(n, path, v, h)
	case unstable.InlineTable:
		r.inline(n, path, v, h)
	default:
		r.scalar(n, path, v)
	}
}

// note remembers where a path stands; for the value of a provenance table that
// is where its number is.
func (r *reader) note(path string) {
	p, known := r.places[path]
	if !known {
		p.key = r.keyAt
	}
	p.value = r.valueAt
	r.places[path] = p
}

func (r *reader) list(n *node, path string, v *unstable.Node, h how) {
	if n.elem == nil {
		fix := "give " + shapeAsks(n, path)
		r.fail(r.valueAt, pva.Fault{Key: path, Path: path, Want: "is a list", Fix: fix})
		return
	}
	if h.named && !h.inList {
		r.entries = append(r.entries, pva.Entry{Path: path, Value: pva.Value{Kind: pva.ListKind}, Origin: pva.FromCase})
	}
	key, value := r.keyAt, r.valueAt
	count := 0
	for it := v.Children(); it.Next(); {
		count++
		r.keyAt, r.valueAt = key, r.elementOffset(it.Node(), value)
		at := path + "." + strconv.Itoa(count)
		if n.tables() {
			r.rows[path] = count
			if r.crowded(at) {
				return
			}
		}
		r.keyAt = r.valueAt
		r.value(n.elem, at, it.Node(), how{named: h.named, inList: true})
	}
	r.keyAt, r.valueAt = key, value
	if count == 0 && h.inList {
		r.fail(value, pva.Fault{Key: path, Path: path, Want: "is an empty list", Fix: "remove it or fill it"})
	}
}

// elementOffset is where an element of a list begins; the parser keeps no place
// for a list within a list, so that is looked for before its first value.
func (r *reader) elementOffset(v *unstable.Node, otherwise int) int {
	lists := 0
	for v.Kind == unstable.Array {
		lists++
		if v = v.Child(); !v.Valid() {
			return otherwise
		}
	}
	at := int(v.Raw.Offset)
	for ; lists > 0; lists-- {
		if at = bytes.LastIndexByte(r.data[:at], '['); at < 0 {
			return otherwise
		}
	}
	return at
}

func (r *reader) inline(n *node, path string, v *unstable.Node, h how) {
	at := r.valueAt
	switch {
	case n.key != nil && !n.number:
		r.fail(at, pva.Fault{Key: path, Path: path, Want: "is a table", Fix: "give " + n.key.Asks()})
		return
	case n.number && h.wrapped:
		r.fail(at, pva.Fault{Key: path, Path: path, Want: "is a table within a table", Fix: "value is the number itself"})
		return
	case n.elem != nil && !n.numbers && !h.named:
		if n.tables() {
			r.fail(at, pva.Fault{Key: path, Path: path, Want: "is a single table", Fix: "write [[" + path + "]], or [ { ... } ]"})
		} else {
			r.fail(at, pva.Fault{Key: path, Path: path, Want: "is a table", Fix: "write the values between [ and ]"})
		}
		return
	}
	empty := true
	for it := v.Children(); it.Next(); {
		empty = false
		r.keyValue(n, path, it.Node(), h.named)
	}
	if empty && (h.inList || n.number) {
		r.fail(at, pva.Fault{Key: path, Path: path, Want: "is an empty table", Fix: "remove it or fill it"})
	}
}

func (r *reader) scalar(n *node, path string, v *unstable.Node) {
	if n.key == nil {
		f := pva.Fault{Key: path, Path: path, Value: literalShown(v), Want: "is not " + shapeOf(n), Fix: "give " + shapeAsks(n, path)}
		r.fail(r.valueAt, f)
		return
	}
	fault := func(want, fix string) {
		r.fail(r.valueAt, pva.Fault{Key: path, Path: path, Value: literalShown(v), Want: want, Fix: fix})
	}
	var value pva.Value
	switch v.Kind {
	case unstable.String:
		value = pva.Text(plainBreaks(v.Data))
	case unstable.Bool:
		value = pva.Flag(v.Data[0] == 't')
	case unstable.Integer, unstable.Float:
		num, ok := parseNumber(string(v.Data))
		if !ok {
			fault("is not a finite number", "give "+n.key.Asks())
			return
		}
		value = pva.Value{Kind: pva.NumberKind, Num: num, Text: string(v.Data)}
		if takesNumber(n.key) {
			value = pva.Text(value.Text)
		}
	default:
		fix := "give " + n.key.Asks()
		if !n.number {
			fix = "put it in quotes"
		}
		fault("is a date or time", fix)
		return
	}
	if row, last, _ := cutLast(path); last == "name" && value.Kind == pva.TextKind && pva.GoodName(value.Text) {
		r.names[row] = value.Text
	}
	r.entries = append(r.entries, pva.Entry{Path: path, Value: value, Origin: pva.FromCase})
}

// takesNumber says whether a word may also be written as a bare number: a single
// year, or a number of sub-steps.
func takesNumber(k *pva.Key) bool {
	_, years := k.At(new(pva.Case), 0, 0, 0).(*pva.Years)
	return years || k.Path == "run.substeps"
}

// plainBreaks is a text whose line breaks do not depend on who saved the file.
func plainBreaks(text []byte) string { return strings.ReplaceAll(string(text), "\r\n", "\n") }

// parseNumber reads a TOML number; false for inf, nan and what is too large.
func parseNumber(literal string) (float64, bool) {
	s := strings.ReplaceAll(literal, "_", "")
	if len(s) > 2 && s[0] == '0' && strings.ContainsRune("xob", rune(s[1])) {
		n, err := strconv.ParseUint(s, 0, 64)
		return float64(n), err == nil
	}
	f, err := strconv.ParseFloat(s, 64)
	return f, err == nil && !math.IsInf(f, 0) && !math.IsNaN(f)
}

func literalShown(v *unstable.Node) string {
	s := string(v.Data)
	if v.Kind == unstable.String {
		s = strconv.Quote(s)
	}
	if r := []rune(s); len(r) > 60 {
		s = string(r[:59]) + "…"
	}
	return s
}

func shapeOf(n *node) string {
	switch {
	case n.tables():
		return "a list of tables"
	case n.elem != nil:
		return "a list"
	}
	return "a table"
}

// shapeAsks says how what belongs here is written.
func shapeAsks(n *node, path string) string {
	switch {
	case n.key != nil:
		return n.key.Asks()
	case n.set:
		return `a table: { "harvest.control.take" = 4 }`
	case n.tables() && !strings.Contains(path, "."):
		return "[[" + path + "]] on a line of its own, and its keys below"
	case n.tables():
		return "a list of tables: [ { from = 2035, factor = 0.9 } ]"
	case n.elem != nil && n.elem.elem != nil:
		return "a list of lists: [[60, 0], [100, 5]]"
	case n.elem != nil:
		return "a list: [ ... ]"
	case strings.Contains(path, "."):
		return "a table: { ... }"
	}
	return "[" + path + "] on a line of its own, and its keys below"
}
