package sheet

import (
	"encoding/xml"
	"errors"
	"io"
	"strings"
)

// Bounds on the XML of a part.
const (
	deepest      = 40
	mostElements = 2_000_000 // of one part: some seconds' work
	mostAttrs    = 64
)

// scanner walks the XML of one part: what begins, what stands in it, what ends.
type scanner struct {
	part  string
	d     *xml.Decoder
	path  []string // local names of the open elements
	count int
}

// visitor takes the events of a part; any may be nil. Text is what stands
// directly in the element that ends, where start asked for it.
type visitor struct {
	start func(s *scanner, e xml.StartElement) (wantText bool, err error)
	end   func(s *scanner, name, text string) error
}

// scan walks a part to its end. The part's root must have the name given, and
// the XML must be well formed to the last byte: what a lenient reader would skip
// over could hide half a table.
func (a *archive) scan(part, root string, most int, v visitor) error {
	r, err := a.read(part, most)
	if err != nil {
		return err
	}
	defer r.Close()
	s := &scanner{part: part, d: xml.NewDecoder(r)}
	rooted := false
	var text []byte // what stands in the open elements whose text is wanted
	var from []int  // for each open element where its text begins, -1 if unwanted
	for {
		token, err := s.d.Token()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			return s.broken()
		}
		switch t := token.(type) {
		case xml.Directive:
			return refuse(takeAnother, "holds a document type or entities in the part %s, which no workbook needs", part)
		case xml.StartElement:
			if s.count++; s.count > mostElements || len(s.path) >= deepest || len(t.Attr) > mostAttrs {
				return refuse(saveAnew, "holds too much, or too deeply nested, in the part %s", part)
			}
			if len(s.path) == 0 {
				if rooted || t.Name.Local != root {
					return s.broken()
				}
				rooted = true
			}
			for i, x := range t.Attr {
				for _, y := range t.Attr[:i] {
					if x.Name == y.Name {
						return s.broken()
					}
				}
			}
			s.path = append(s.path, t.Name.Local)
			want := false
			if v.start != nil {
				if want, err = v.start(s, t); err != nil {
					return err
				}
			}
			if want {
				from = append(from, len(text))
			} else {
				from = append(from, -1)
			}
		case xml.EndElement:
			own := ""
			if at := from[len(from)-1]; at >= 0 {
				own, text = string(text[at:]), text[:at]
			}
			if v.end != nil {
				if err := v.end(s, t.Name.Local, own); err != nil {
					return err
				}
			}
			from, s.path = from[:len(from)-1], s.path[:len(s.path)-1]
		case xml.CharData:
			if n := len(from); n > 0 && from[n-1] >= 0 {
				text = append(text, t...)
			} else if len(s.path) == 0 && strings.Trim(string(t), " \t\r\n\ufeff") != "" {
				return s.broken()
			}
		}
	}
	if !rooted || len(s.path) > 0 {
		return s.broken()
	}
	return nil
}

func (s *scanner) broken() error {
	return refuse(takeAnother, "is damaged: the part %s is not the XML it should be", s.part)
}

// at says whether the open elements are these, from the root.
func (s *scanner) at(path ...string) bool {
	if len(path) != len(s.path) {
		return false
	}
	for i := range path {
		if path[i] != s.path[i] {
			return false
		}
	}
	return true
}

// attr is an attribute without a namespace; "" if there is none.
func attr(e xml.StartElement, name string) string {
	for _, a := range e.Attr {
		if a.Name.Local == name && a.Name.Space == "" {
			return a.Value
		}
	}
	return ""
}

// linkAttr is the attribute that points to a relationship.
func linkAttr(e xml.StartElement) string {
	for _, a := range e.Attr {
		if a.Name.Local == "id" && a.Name.Space != "" {
			return a.Value
		}
	}
	return ""
}
