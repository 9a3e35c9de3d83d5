package casefile

import (
	"bytes"
	"strings"

	"ebbline/pva"
)

// Write is the case as a case file: what was given, in the order of the key
// table, with the sources and notes of numbers (a word has none in a case file,
// though it may in a workbook); nothing that is only a default. Read gives the
// same case back, with the same digest unless a word lost its source.
func Write(c *pva.Case) []byte {
	root := &tree{}
	for _, e := range pva.Ordered(c.Entries()) {
		if e.Value.Kind != pva.NumberKind {
			e.Source, e.Note = "", ""
		}
		root.put(e)
	}
	var b bytes.Buffer
	for _, top := range root.names {
		child := root.kids[top]
		if pva.IsArrayTable(top) {
			for _, row := range child.names {
				writeTable(&b, "[["+top+"]]", top, child.kids[row])
			}
			continue
		}
		writeTable(&b, "["+top+"]", top, child)
	}
	return bytes.TrimPrefix(b.Bytes(), []byte("\n"))
}

// tree is the entries as nested tables and lists, in their order.
type tree struct {
	entry *pva.Entry
	list  bool
	names []string
	kids  map[string]*tree
}

func (t *tree) put(e pva.Entry) {
	parts := strings.Split(e.Path, ".")
	if len(parts) > 3 && parts[0] == "option" && parts[2] == "set" {
		// What an option sets is a key of its own, written whole; only the
		// elements of a list that it gives anew go below it.
		set := t.at(parts[:3])
		key := parts[3:]
		for n := len(key); n > 0; n-- {
			if kid := set.kids[strings.Join(key[:n], ".")]; kid != nil && kid.list {
				kid.at(key[n:]).entry = &e
				return
			}
		}
		kid := set.at([]string{strings.Join(key, ".")})
		kid.entry, kid.list = &e, e.Value.Kind == pva.ListKind
		if kid.list {
			kid.entry = nil
		}
		return
	}
	t.at(parts).entry = &e
}

// at is the tree below t at a path, made if it is not there.
func (t *tree) at(parts []string) *tree {
	for _, part := range parts {
		if t.kids == nil {
			t.kids = map[string]*tree{}
		}
		kid := t.kids[part]
		if kid == nil {
			kid = &tree{}
			t.kids[part] = kid
			t.names = append(t.names, part)
		}
		if isPosition(part) {
			t.list = true
		}
		t = kid
	}
	return t
}

func isPosition(s string) bool {
	return s != "" && strings.Trim(s, "0123456789") == "" && s[0] != '0'
}

// sourced says whether anything below t carries a source or note.
func (t *tree) sourced() bool {
	if t.entry != nil && (t.entry.Source != "" || t.entry.Note != "") {
		return true
	}
	for _, kid := range t.kids {
		if kid.sourced() {
			return true
		}
	}
	return false
}

// writeTable writes a table's header and keys; its own tables come after them
// where they are too long for one line.
func writeTable(b *bytes.Buffer, header, path string, t *tree) {
	b.WriteString("\n" + header + "\n")
	var later []string
	for _, name := range t.names {
		kid := t.kids[name]
		inSet := path == "option.set" // there a key is written whole and its value on one line
		if !inSet && kid.entry == nil && !kid.list && (kid.sourced() || path == "option" && len(kid.names) > 1) {
			later = append(later, name)
			continue
		}
		if !inSet && kid.list && kid.kids[first(kid.names)].isTable() && kid.sourced() {
			later = append(later, name)
			continue
		}
		b.WriteString(bareKey(name) + " = ")
		kid.value(b)
		b.WriteByte('\n')
	}
	for _, name := range later {
		kid := t.kids[name]
		below := path + "." + bareKey(name)
		if !kid.list {
			writeTable(b, "["+below+"]", below, kid)
			continue
		}
		for _, row := range kid.names {
			writeTable(b, "[["+below+"]]", below, kid.kids[row])
		}
	}
}

func first(names []string) string {
	if len(names) == 0 {
		return ""
	}
	return names[0]
}

func (t *tree) isTable() bool { return t != nil && t.entry == nil && !t.list }

// value writes what stands to the right of a key.
func (t *tree) value(b *bytes.Buffer) {
	switch {
	case t.entry != nil:
		writeEntry(b, *t.entry)
	case t.list:
		t.writeList(b)
	default:
		b.WriteString("{ ")
		for i, name := range t.names {
			if i > 0 {
				b.WriteString(", ")
			}
			b.WriteString(bareKey(name) + " = ")
			t.kids[name].value(b)
		}
		b.WriteString(" }")
	}
}

func (t *tree) writeList(b *bytes.Buffer) {
	b.WriteByte('[')
	for i, name := range t.names {
		if i > 0 {
			b.WriteString(", ")
		}
		t.kids[name].value(b)
	}
	b.WriteByte(']')
}

func writeEntry(b *bytes.Buffer, e pva.Entry) {
	v := literal(e.Value)
	if e.Source == "" && e.Note == "" {
		b.WriteString(v)
		return
	}
	b.WriteString("{ value = " + v)
	if e.Source != "" {
		b.WriteString(", source = " + quote(e.Source))
	}
	if e.Note != "" {
		b.WriteString(", note = " + quote(e.Note))
	}
	b.WriteString(" }")
}
