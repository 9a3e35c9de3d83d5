package casefile

import (
	"strconv"
	"strings"

	"ebbline/pva"

	"github.com/pelletier/go-toml/v2/unstable"
)

// reader flattens a file into entries by position and remembers where each of
// them stands.
type reader struct {
	name  string
	data  []byte
	lines *lines

	entries []pva.Entry
	places  map[string]place
	rows    map[string]int    // array table or list of tables -> rows so far
	names   map[string]string // row by position -> its name
	sources map[string]*provenance
	order   []string // paths of sources, as written
	faults  []located
	tooMuch bool

	// The table that the keys of the following lines belong to; a nil node
	// means that its header was faulted and its keys are passed over.
	table     *node
	tablePath string

	keyAt   int // offset of the key in work
	valueAt int // offset of its value
}

// place is where a key, and its value, begin.
type place struct{ key, value int }

type located struct {
	fault  pva.Fault
	offset int
}

// provenance is the source and note of one number, or of a whole list of them.
type provenance struct {
	source, note string
	value        bool
	at           int
}

func newReader(name string, data []byte) *reader {
	return &reader{name: name, data: data, lines: newLines(data), places: map[string]place{},
		rows: map[string]int{}, names: map[string]string{}, sources: map[string]*provenance{}, table: schema}
}

func (r *reader) fail(offset int, f pva.Fault) {
	if len(r.faults) < mostFaults {
		r.faults = append(r.faults, located{f, offset})
	}
	if f.Key == "" { // of the file as a whole
		r.tooMuch = true
	}
}

// expression takes one line of the file: a table's header, or a key and its value.
func (r *reader) expression(e *unstable.Node) {
	switch e.Kind {
	case unstable.Table, unstable.ArrayTable:
		r.header(e)
	case unstable.KeyValue:
		if r.table != nil {
			r.keyValue(r.table, r.tablePath, e, false)
		}
	}
}

// exprOffset is where an expression begins.
func exprOffset(e *unstable.Node) int {
	it := e.Key()
	if it.Next() {
		return int(it.Node().Raw.Offset)
	}
	return int(e.Raw.Offset)
}

// header opens the table that the following lines belong to.
func (r *reader) header(e *unstable.Node) {
	r.table, r.tablePath = nil, ""
	n, path := schema, ""
	for it := e.Key(); it.Next(); {
		key := it.Node()
		part := string(key.Data)
		r.keyAt = int(key.Raw.Offset)
		r.valueAt = r.keyAt
		last := it.IsLast()
		if n.set {
			r.fail(r.keyAt, pva.Fault{Key: path, Path: path, OfKey: true, Want: "has no tables below it", Fix: `write the whole key under [option.set]: "births.crowding.capacity" = 500`})
			return
		}
		if n.tables() && path != "" { // within the row begun last
			if r.rows[path] == 0 {
				r.oneRow(path)
				return
			}
			path += "." + strconv.Itoa(r.rows[path])
			n = n.elem
		}
		next, at, ok := r.step(n, path, part)
		if !ok {
			return
		}
		n, path = next, at
		if !last {
			continue
		}
		if e.Kind == unstable.ArrayTable {
			if !n.tables() {
				r.fail(r.keyAt, pva.Fault{Key: path, Path: path, OfKey: true, Want: "stands only once", Fix: "write [" + path + "], or a key and its value"})
				return
			}
			r.rows[path]++
			path += "." + strconv.Itoa(r.rows[path])
			n = n.elem
			r.crowded(path)
		} else if n.tables() {
			r.oneRow(path)
			return
		} else if n.elem != nil && !n.numbers || n.key != nil && !n.number {
			r.fail(r.keyAt, pva.Fault{Key: path, Path: path, OfKey: true, Want: "is not a table", Fix: "write it as a key and its value"})
			return
		}
	}
	r.table, r.tablePath = n, path
	r.places[path] = place{r.keyAt, r.keyAt}
}

func (r *reader) oneRow(path string) {
	r.fail(r.keyAt, pva.Fault{Key: path, Path: path, OfKey: true, Want: "may stand several times", Fix: "write [[" + path + "]], with a name = \"...\" below it where it has one"})
}

// crowded faults a table with more rows than any case has, once.
func (r *reader) crowded(path string) bool {
	list, _, _ := cutLast(path)
	if r.rows[list] <= mostRows {
		return false
	}
	if r.rows[list] == mostRows+1 {
		r.fail(r.keyAt, pva.Fault{Want: "[[" + list + "]] stands more than " + strconv.Itoa(mostRows) + " times", Fix: "split the case"})
	}
	return true
}

// step goes from a table to one of its keys.
func (r *reader) step(n *node, path, part string) (next *node, at string, ok bool) {
	if n.fields != nil {
		if next = n.fields[part]; next != nil {
			return next, join(path, part), true
		}
	}
	at = join(path, part)
	if strings.Contains(part, ".") {
		// A quoted key with dots would pass for several keys.
		r.fail(r.keyAt, pva.Fault{Key: strconv.Quote(part), Path: path, OfKey: true, Want: "is not a key of a case", Fix: "write it without quotes, under its table"})
		return nil, "", false
	}
	f := pva.UnknownKey(at)
	if len(f.Key) > 80 {
		f.Key = f.Key[:80] + "…"
	}
	r.fail(r.keyAt, f)
	return nil, "", false
}

// keyValue takes "key = value" under a table.
func (r *reader) keyValue(n *node, path string, kv *unstable.Node, named bool) {
	it := kv.Key()
	end := 0
	for it.Next() {
		key := it.Node()
		end = int(key.Raw.Offset + key.Raw.Length)
		r.keyAt = int(key.Raw.Offset)
		r.valueAt = r.keyAt
		part := string(key.Data)
		switch {
		case n.set:
			// All parts that are left are one key, with or without quotes.
			parts := []string{part}
			for it.Next() {
				key = it.Node()
				end = int(key.Raw.Offset + key.Raw.Length)
				parts = append(parts, string(key.Data))
			}
			n, path = r.named(schema, path, strings.Join(parts, "."))
			named = true
		case named && n.elem != nil && !isProvenance(n, part):
			n, path = n.elem, join(path, part)
		case n.number || n.numbers:
			if r.provenance(n, path, part, it.IsLast(), r.valueOffset(end), kv.Value(), named) {
				return
			}
			n = nil
		case n.key != nil:
			r.fail(r.keyAt, pva.Fault{Key: path, Path: path, OfKey: true, Want: "is not a table", Fix: "give " + n.key.Asks()})
			n = nil
		case n.elem != nil:
			r.oneRow(path)
			n = nil
		default:
			var ok bool
			if n, path, ok = r.step(n, path, part); !ok {
				n = nil
			}
		}
		if n == nil {
			return
		}
	}
	r.valueAt = r.valueOffset(end)
	r.value(n, path, kv.Value(), how{named: named})
}

// named follows a whole key of another case, by name or position: what an
// option or an override sets.
func (r *reader) named(n *node, path, key string) (*node, string) {
	full := key
	for key != "" {
		var part string
		part, key, _ = strings.Cut(key, ".")
		switch {
		case n.elem != nil:
			n = n.elem
		case n.fields[part] != nil && !n.fields[part].set:
			n = n.fields[part]
		default:
			f := unknownNamed(full)
			f.Key, f.Path, f.Meant = join(path, full), join(path, full), ""
			if len(f.Key) > 80 {
				f.Key = f.Key[:80] + "…"
			}
			r.fail(r.keyAt, f)
			return nil, ""
		}
	}
	if full == "" || strings.HasPrefix(full, "option") && (len(full) == 6 || full[6] == '.') {
		r.fail(r.keyAt, pva.Fault{Key: join(path, full), Path: join(path, full), OfKey: true, Want: "cannot be set by an option", Fix: "set a key of the case itself"})
		return nil, ""
	}
	return n, join(path, full)
}

// unknownNamed is the fault of an unknown key by name or position.
func unknownNamed(key string) pva.Fault {
	parts := strings.SplitN(key, ".", 3)
	if len(parts) < 3 || !pva.IsArrayTable(parts[0]) {
		return pva.UnknownKey(key)
	}
	first, named := parts[0]+".1.", parts[0]+"."+parts[1]+"."
	f := pva.UnknownKey(first + parts[2])
	f.Key, f.Path = key, key
	f.Fix = strings.Replace(f.Fix, first, named, 1)
	return f
}

// valueOffset is where the value begins whose key ends at an offset.
func (r *reader) valueOffset(end int) int {
	i := end
	for i < len(r.data) && (r.data[i] == ' ' || r.data[i] == '\t') {
		i++
	}
	if i < len(r.data) && r.data[i] == '=' {
		i++
	}
	for i < len(r.data) && (r.data[i] == ' ' || r.data[i] == '\t') {
		i++
	}
	return i
}

// place is the offset of a fault: its key or value, else the nearest table
// around it, else the beginning of the file.
func (r *reader) place(f pva.Fault) int {
	if p, ok := r.places[f.Path]; ok {
		if f.OfKey {
			return p.key
		}
		return p.value
	}
	for path, _, ok := cutLast(f.Path); ok; path, _, ok = cutLast(path) {
		if p, known := r.places[path]; known {
			return p.key
		}
	}
	return 0
}

// display is a path by name where its row has one.
func (r *reader) display(path string) string {
	parts := strings.SplitN(path, ".", 3)
	if len(parts) < 2 || !pva.IsArrayTable(parts[0]) {
		return path
	}
	if name := r.names[parts[0]+"."+parts[1]]; name != "" {
		parts[1] = name
	}
	return strings.Join(parts, ".")
}

func join(path, part string) string {
	if path == "" {
		return part
	}
	return path + "." + part
}

func cutLast(path string) (parent, last string, ok bool) {
	i := strings.LastIndexByte(path, '.')
	if i < 0 {
		return "", path, false
	}
	return path[:i], path[i+1:], true
}
