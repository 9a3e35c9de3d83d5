package casefile

import (
	"bytes"
	"errors"
	"fmt"
	"strings"

	"ebbline/pva"

	toml "github.com/pelletier/go-toml/v2"
	"github.com/pelletier/go-toml/v2/unstable"
)

// The limits keep a hostile file from costing more than seconds; no honest case
// comes near them.
const (
	largestFile   = 4 << 20 // bytes
	mostCommas    = 300_000 // the parser's memory grows with the values of one list
	mostLines     = 5_000   // tables and keys; looking for duplicates costs their square
	mostInline    = 1_000   // keys of one inline table, for the same reason
	mostParts     = 16      // parts of one dotted key
	deepest       = 16      // lists and tables within each other
	longestList   = 100_000
	mostRows      = 1_000     // rows of one array table
	mostValues    = 120_000   // values in a case
	mostTrials    = 3_000_000 // values times options: each option is tried on the case
	mostFaults    = 10_000    // faults that are kept
	longestKey    = 300       // bytes of one key
	byteOrderMark = "\xef\xbb\xbf"
)

// Read reads and checks a case file. The name is the file's, for the errors.
// It returns either a case or everything that is wrong with it: one syntax
// fault or duplicate key ends the reading, all other faults come together.
func Read(name string, data []byte) (*pva.Case, Errors) {
	data = bytes.TrimPrefix(data, []byte(byteOrderMark))
	r := newReader(name, data)
	if !r.sane() || !r.syntax() {
		return nil, r.errors(nil)
	}
	var p unstable.Parser
	p.Reset(data)
	for p.NextExpression() {
		r.expression(p.Expression())
	}
	r.finish()
	if len(r.entries) > mostValues {
		r.fail(nowhere, pva.Fault{Want: fmt.Sprintf("the case has %d values", len(r.entries)), Fix: fmt.Sprintf("%d are the most that can be read", mostValues)})
	} else if trials := len(r.entries) * (r.rows["option"] + 1); trials > mostTrials {
		r.fail(nowhere, pva.Fault{Want: "the case has too many options for its length", Fix: "split it into several cases"})
	}
	if r.tooMuch {
		return nil, r.errors(nil)
	}
	c, faults := pva.Build(r.entries)
	if c != nil && len(r.faults) == 0 {
		faults = solvable(c)
	}
	if errs := r.errors(faults); len(errs) > 0 {
		return nil, errs
	}
	return c, nil
}

// sane refuses what cannot be a case before any parser sees it.
func (r *reader) sane() bool {
	refuse := func(want, fix string) bool {
		r.fail(nowhere, pva.Fault{Want: want, Fix: fix})
		return false
	}
	switch {
	case len(r.data) > largestFile:
		return refuse("the file is larger than 4 MB", "a case file is a few thousand bytes")
	case bytes.HasPrefix(r.data, []byte("\xff\xfe")) || bytes.HasPrefix(r.data, []byte("\xfe\xff")):
		return refuse("the file is not UTF-8 text", "save it as UTF-8")
	case bytes.HasPrefix(r.data, []byte("PK\x03\x04")):
		return refuse("the file is a workbook or archive, not TOML text", "give the workbook its .xlsx ending")
	case bytes.Count(r.data, []byte(",")) > mostCommas:
		return refuse("the file holds too many values", fmt.Sprintf("a list may have %d", longestList))
	}
	return true
}

// syntax finds the first fault in the TOML itself.
func (r *reader) syntax() bool {
	var p unstable.Parser
	p.Reset(r.data)
	for n := 0; p.NextExpression(); n++ {
		e := p.Expression()
		if n == mostLines {
			r.fail(nowhere, pva.Fault{Want: "the file has too many tables and keys", Fix: fmt.Sprintf("%d are the most that can be read", mostLines)})
			return false
		}
		if !r.measured(e, 0, exprOffset(e)) {
			return false
		}
	}
	var pe *unstable.ParserError
	if err := p.Error(); errors.As(err, &pe) {
		r.fail(r.highlight(&p, pe), pva.Fault{Want: syntaxWords(pe.Message)})
		return false
	}
	// The library alone knows all rules about keys and tables that are given twice.
	var ignored struct{}
	err := toml.Unmarshal(r.data, &ignored)
	var de *toml.DecodeError
	if errors.As(err, &de) {
		line, col := de.Position()
		if line < 1 || line > len(r.lines.starts) {
			line, col = 1, 1
		}
		r.fail(r.lines.starts[line-1]+max(0, col-1), pva.Fault{Want: duplicateWords(err.Error()), Fix: duplicateFix(err.Error()), OfKey: true})
		return false
	}
	if err != nil {
		r.fail(0, pva.Fault{Want: syntaxWords(err.Error())})
		return false
	}
	return true
}

// highlight is the offset at which the parser stopped.
func (r *reader) highlight(p *unstable.Parser, e *unstable.ParserError) (offset int) {
	defer func() {
		if recover() != nil { // a highlight outside the text has no offset
			offset = 0
		}
	}()
	return int(p.Range(e.Highlight).Offset)
}

// measured refuses keys and values that are too long or too deep to be a case.
func (r *reader) measured(n *unstable.Node, depth, offset int) bool {
	if n.Raw.Length > 0 {
		offset = int(n.Raw.Offset)
	}
	refuse := func(want, fix string) bool {
		r.fail(offset, pva.Fault{Want: want, Fix: fix})
		return false
	}
	if depth > deepest {
		return refuse("lists and tables are nested too deeply", "no key of a case needs more than four levels")
	}
	if n.Kind == unstable.Table || n.Kind == unstable.ArrayTable || n.Kind == unstable.KeyValue {
		parts := 0
		for it := n.Key(); it.Next(); parts++ {
			if key := it.Node(); len(key.Data) > longestKey {
				offset = int(key.Raw.Offset)
				return refuse("the key is too long", fmt.Sprintf("keys have at most %d characters", longestKey))
			}
		}
		if parts > mostParts {
			return refuse("the key has too many parts", "no key of a case has more than six")
		}
	}
	switch n.Kind {
	case unstable.KeyValue:
		return r.measured(n.Value(), depth, offset)
	case unstable.Array, unstable.InlineTable:
		count := 0
		for it := n.Children(); it.Next(); count++ {
			if !r.measured(it.Node(), depth+1, offset) {
				return false
			}
		}
		if n.Kind == unstable.Array && count > longestList {
			return refuse(fmt.Sprintf("the list has %d elements", count), fmt.Sprintf("%d are the most that can be read", longestList))
		}
		if n.Kind == unstable.InlineTable && count > mostInline {
			return refuse(fmt.Sprintf("the table has %d keys", count), fmt.Sprintf("%d are the most that can be read", mostInline))
		}
	}
	return true
}

// nowhere is the offset of a fault of the file as a whole.
const nowhere = -1

// errors puts places to faults and sorts them.
func (r *reader) errors(built pva.Faults) Errors {
	all := make(pva.Faults, 0, len(r.faults)+len(built))
	offsets := map[string]int{}
	for _, f := range r.faults {
		all = append(all, f.fault)
		offsets[faultID(f.fault)] = f.offset
	}
	all = append(all, built...).WithoutEchoes()
	errs := make(Errors, 0, len(all))
	for _, f := range all {
		offset, ok := offsets[faultID(f)]
		if !ok {
			offset = r.place(f)
		}
		f.Key = r.display(f.Key)
		if f.Meant != "" {
			f.Fix = strings.Replace(f.Fix, f.Meant, r.display(f.Meant), 1)
		}
		errs = append(errs, Error{File: r.name, Fault: f, offset: offset})
	}
	errs.sort()
	for i := range errs {
		if i < mostShown && errs[i].offset != nowhere { // the rest is only counted
			errs[i].Line, errs[i].Col = r.lines.at(errs[i].offset)
			errs[i].Snippet = r.lines.snippet(errs[i].offset)
		}
	}
	return errs
}

func faultID(f pva.Fault) string { return f.Path + "\x00" + f.Error() }
