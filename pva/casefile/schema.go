package casefile

import (
	"strings"

	"ebbline/pva"
)

// node is one place in the shape of a case, made from the key table: a key, a
// table with fields, or a list whose elements are all alike.
type node struct {
	key     *pva.Key
	number  bool // a key that holds a number
	fields  map[string]*node
	elem    *node
	numbers bool // a list, or list of lists, of numbers
	set     bool // what an option sets: any key of a case, by name or position
}

var schema = newSchema()

func newSchema() *node {
	root := &node{}
	for _, k := range pva.Keys() {
		n := root
		for _, part := range strings.Split(k.Path, ".") {
			n = n.child(part)
		}
		n.key, n.number = k, k.IsNumber()
	}
	root.fields["option"].elem.fields["set"] = &node{set: true}
	root.mark()
	return root
}

func (n *node) child(part string) *node {
	if part == "*" {
		if n.elem == nil {
			n.elem = &node{}
		}
		return n.elem
	}
	if n.fields == nil {
		n.fields = map[string]*node{}
	}
	if n.fields[part] == nil {
		n.fields[part] = &node{}
	}
	return n.fields[part]
}

// mark finds the lists of numbers.
func (n *node) mark() {
	for _, f := range n.fields {
		f.mark()
	}
	if n.elem != nil {
		n.elem.mark()
		n.numbers = n.elem.number || n.elem.numbers
	}
}

// tables says whether the node is a list of tables.
func (n *node) tables() bool { return n.elem != nil && n.elem.fields != nil }

// nodeAt is the node of a path by name or position; nil if there is none.
func nodeAt(path string) *node {
	n := schema
	parts := strings.Split(path, ".")
	for i := 0; i < len(parts) && n != nil; i++ {
		switch {
		case n.set:
			return nodeAt(strings.Join(parts[i:], "."))
		case n.elem != nil:
			n = n.elem
		default:
			n = n.fields[parts[i]]
		}
	}
	return n
}
