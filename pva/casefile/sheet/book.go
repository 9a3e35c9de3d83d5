package sheet

import (
	"encoding/xml"
	"io"
	"path"
	"sort"
	"strconv"
	"strings"
	"unicode/utf8"

	"ebbline/pva/casefile"
)

// Bounds on the parts that describe a workbook.
const (
	largestList    = 256 << 10 // bytes of the list of sheets, or of links
	largestStyles  = 2 << 20   // bytes
	largestTexts   = 32 << 20  // bytes of the shared texts
	mostSheets     = 500
	mostTexts      = 300_000
	mostFormats    = 10_000
	longestFormat  = 1_000 // bytes of a number format
	longestCell    = 1 << 20
	longestBookURI = 1_000
)

// Workbook is a workbook that was found whole. Its sheets are read when asked for.
type Workbook struct {
	name    string
	archive *archive
	names   []string          // of the sheets, in order
	parts   map[string]string // sheet -> part
	texts   []string          // shared texts
	dates   []bool            // by style: whether numbers are shown as dates or times
	program string
}

// Open checks a workbook and reads what describes it. The name is the file's,
// for the errors, which are casefile.Error.
func Open(name string, data []byte) (*Workbook, error) {
	w := &Workbook{name: name, parts: map[string]string{}}
	if err := w.open(data); err != nil {
		return nil, w.named(err)
	}
	return w, nil
}

// named puts the file's name to an error.
func (w *Workbook) named(err error) error {
	switch e := err.(type) {
	case casefile.Error:
		e.File = w.name
		return e
	case Altered:
		e.What.File = w.name
		return e
	}
	return err
}

// Sheets is the names of the sheets in their order.
func (w *Workbook) Sheets() []string { return append([]string(nil), w.names...) }

// Program is the program that says it saved the workbook; "" if none does.
func (w *Workbook) Program() string { return w.program }

// Parts is the names of all parts, sorted.
func (w *Workbook) Parts() []string {
	names := make([]string, 0, len(w.archive.parts))
	for name := range w.archive.parts {
		if !strings.HasSuffix(name, "/") {
			names = append(names, name)
		}
	}
	sort.Strings(names)
	return names
}

// Part is a part unzipped; nil if there is none of that name.
func (w *Workbook) Part(name string) ([]byte, error) {
	if w.archive.parts[name] == nil {
		return nil, nil
	}
	r, err := w.archive.read(name, largestPart)
	if err != nil {
		return nil, w.named(err)
	}
	defer r.Close()
	data, err := io.ReadAll(r)
	if err != nil {
		return nil, w.named(refuse(takeAnother, "is damaged: the part %s %s", name, zipWords(err)))
	}
	return data, nil
}

// SheetPart is the part that holds a sheet; "" if it has no cells.
func (w *Workbook) SheetPart(sheet string) string { return w.parts[sheet] }

func (w *Workbook) open(data []byte) (err error) {
	if w.archive, err = open(data); err != nil {
		return err
	}
	links, err := w.archive.links("_rels/.rels", "")
	if err != nil {
		return err
	}
	main := ""
	for _, l := range links {
		if l.kind == "officeDocument" {
			main = l.target
		}
	}
	if main == "" || w.archive.parts["[Content_Types].xml"] == nil {
		return refuse("give an .xlsx workbook", "is an archive, but not a workbook")
	}
	folder, base := path.Split(main)
	if links, err = w.archive.links(folder+"_rels/"+base+".rels", folder); err != nil {
		return err
	}
	if err := w.sheets(main, links); err != nil {
		return err
	}
	for _, l := range links {
		switch l.kind {
		case "sharedStrings":
			if w.texts != nil {
				return refuse(takeAnother, "is damaged: it has two lists of texts")
			}
			if err := w.sharedTexts(l.target); err != nil {
				return err
			}
		case "styles":
			if err := w.styles(l.target); err != nil {
				return err
			}
		}
	}
	if w.archive.parts["docProps/app.xml"] != nil {
		return w.archive.scan("docProps/app.xml", "Properties", largestList, visitor{
			start: func(s *scanner, _ xml.StartElement) (bool, error) { return s.at("Properties", "Application"), nil },
			end: func(s *scanner, _, text string) error {
				if s.at("Properties", "Application") {
					w.program = text
				}
				return nil
			}})
	}
	return nil
}

// link is a relationship of one part to another.
type link struct {
	kind, target string
	outside      bool
}

// links reads the relationships of a part in a folder.
func (a *archive) links(part, folder string) (map[string]link, error) {
	out := map[string]link{}
	err := a.scan(part, "Relationships", largestList, visitor{start: func(s *scanner, e xml.StartElement) (bool, error) {
		if !s.at("Relationships", "Relationship") {
			return false, nil
		}
		id, target := attr(e, "Id"), attr(e, "Target")
		if _, twice := out[id]; twice || len(target) > longestBookURI {
			return false, s.broken()
		}
		if strings.HasPrefix(target, "/") {
			target = target[1:]
		} else {
			target = path.Join(folder, target)
		}
		out[id] = link{kind: path.Base(attr(e, "Type")), target: target, outside: attr(e, "TargetMode") == "External"}
		return false, nil
	}})
	return out, err
}

// sheets reads the list of sheets.
func (w *Workbook) sheets(part string, links map[string]link) error {
	seen := map[string]bool{}
	return w.archive.scan(part, "workbook", largestList, visitor{start: func(s *scanner, e xml.StartElement) (bool, error) {
		if !s.at("workbook", "sheets", "sheet") {
			return false, nil
		}
		name := attr(e, "name")
		l, ok := links[linkAttr(e)]
		switch {
		case !ok || l.outside || name == "" || utf8.RuneCountInString(name) > 31:
			return false, s.broken()
		case len(w.names) == mostSheets:
			return false, refuse(saveAnew, "has more than %d sheets", mostSheets)
		case seen[strings.ToLower(name)]:
			return false, refuse(takeAnother, "has two sheets of the name %q", name)
		case l.kind == "worksheet" && w.archive.parts[l.target] == nil:
			return false, refuse(takeAnother, "is damaged: the part %s is missing", l.target)
		}
		seen[strings.ToLower(name)] = true
		w.names = append(w.names, name)
		if l.kind == "worksheet" {
			w.parts[name] = l.target
		}
		return false, nil
	}})
}

// sharedTexts reads the texts that cells point to: plain, or in runs of several
// looks; readings of characters beside them are no part of them.
func (w *Workbook) sharedTexts(part string) error {
	w.texts = []string{}
	var item strings.Builder
	return w.archive.scan(part, "sst", largestTexts, visitor{
		start: func(s *scanner, _ xml.StartElement) (bool, error) {
			if s.at("sst", "si") {
				if len(w.texts) == mostTexts {
					return false, refuse(saveAnew, "holds more than %d texts", mostTexts)
				}
				item.Reset()
			}
			return s.at("sst", "si", "t") || s.at("sst", "si", "r", "t"), nil
		},
		end: func(s *scanner, _, text string) error {
			switch {
			case s.at("sst", "si", "t") || s.at("sst", "si", "r", "t"):
				item.WriteString(text)
				if item.Len() > longestCell {
					return refuse(saveAnew, "holds a text longer than any cell can be")
				}
			case s.at("sst", "si"):
				w.texts = append(w.texts, unescaped(item.String()))
			}
			return nil
		}})
}

// unescaped reads _x000D_ and its like as the character they stand for, as
// spreadsheets do.
func unescaped(s string) string {
	if !strings.Contains(s, "_x") {
		return s
	}
	var b strings.Builder
	for i := 0; i < len(s); {
		if i+7 <= len(s) && s[i] == '_' && s[i+1] == 'x' && s[i+6] == '_' {
			if n, err := strconv.ParseUint(s[i+2:i+6], 16, 16); err == nil && !(n >= 0xd800 && n < 0xe000) {
				b.WriteRune(rune(n))
				i += 7
				continue
			}
		}
		b.WriteByte(s[i])
		i++
	}
	return b.String()
}

// styles learns which styles show a number as a date or a time.
func (w *Workbook) styles(part string) error {
	custom := map[int]bool{}
	formats := 0
	return w.archive.scan(part, "styleSheet", largestStyles, visitor{start: func(s *scanner, e xml.StartElement) (bool, error) {
		switch {
		case s.at("styleSheet", "numFmts", "numFmt"):
			code := attr(e, "formatCode")
			if formats++; formats > mostFormats || len(code) > longestFormat {
				return false, refuse(saveAnew, "holds too many number formats, or one of more than %d characters", longestFormat)
			}
			id, err := strconv.Atoi(attr(e, "numFmtId"))
			if err != nil {
				return false, s.broken()
			}
			custom[id] = dateFormat(code)
		case s.at("styleSheet", "cellXfs", "xf"):
			if len(w.dates) == mostFormats*7 {
				return false, refuse(saveAnew, "holds too many cell styles")
			}
			id, err := strconv.Atoi(attr(e, "numFmtId"))
			if err != nil && attr(e, "numFmtId") != "" {
				return false, s.broken()
			}
			isDate, known := custom[id]
			w.dates = append(w.dates, known && isDate || !known && builtInDate(id))
		}
		return false, nil
	}})
}

// builtInDate says whether a number format that workbooks need not spell out is
// one of dates or times.
func builtInDate(id int) bool {
	return id >= 14 && id <= 22 || id >= 27 && id <= 36 || id >= 45 && id <= 47 || id >= 50 && id <= 58 || id >= 71 && id <= 81
}

// dateFormat says whether a number format shows dates or times: whether a letter
// of one stands outside quotes, escapes and brackets, or in brackets as an
// elapsed time.
func dateFormat(code string) bool {
	for i := 0; i < len(code); i++ {
		switch c := code[i]; c {
		case '\\', '_', '*':
			i++
		case '"':
			end := strings.IndexByte(code[i+1:], '"')
			if end < 0 {
				return false
			}
			i += end + 1
		case '[':
			end := strings.IndexByte(code[i:], ']')
			if end < 0 {
				return false
			}
			if strings.Trim(strings.ToLower(code[i+1:i+end]), "h") == "" || strings.Trim(strings.ToLower(code[i+1:i+end]), "m") == "" || strings.Trim(strings.ToLower(code[i+1:i+end]), "s") == "" {
				return true
			}
			i += end
		default:
			if strings.HasPrefix(strings.ToLower(code[i:]), "general") {
				i += len("general") - 1
				continue
			}
			if strings.IndexByte("dDmMyYhHsS", c) >= 0 {
				return true
			}
		}
	}
	return false
}
