package pva

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// Build makes a case from entries (paths by name or by position, any order) and
// finds everything that is wrong with them at once. The case is nil if there is
// any fault.
func Build(entries []Entry) (*Case, Faults) {
	entries, _, faults := Resolve(entries)
	c, more := build(entries)
	faults = append(faults, more...)
	if len(faults) == 0 {
		faults = c.CheckOptions() // the case itself must stand first
	}
	if len(faults) > 0 {
		return nil, faults.WithoutEchoes()
	}
	return c, nil
}

// builder gathers what Build learns on its way.
type builder struct {
	c      *Case
	given  map[string]Entry // by position
	under  map[string]bool  // every path that some given key lies under
	bad    map[string]bool  // given keys with a fault of their own
	hints  int              // nearest keys looked for so far
	faults Faults
}

func build(entries []Entry) (*Case, Faults) {
	b := &builder{c: &Case{}, given: map[string]Entry{}, under: map[string]bool{}, bad: map[string]bool{}}
	b.c.entries = Ordered(entries)
	for _, k := range keys {
		if !strings.Contains(k.Path, "*") {
			b.fill(k, nil)
		}
	}
	rows := map[string]bool{}
	gap := b.gaps()
	for i, e := range b.c.entries {
		if gap[i] {
			continue
		}
		b.startRow(e.Path, rows)
		b.take(e)
	}
	b.required(rows)
	b.conditions()
	b.checks()
	return b.c, b.faults
}

// fill puts the default of a key into its field.
func (b *builder) fill(k *Key, pos []int) {
	if k.Default == nil {
		return
	}
	switch p := k.At(b.c, pos...).(type) {
	case *float64:
		*p = k.Default.(float64)
	case *int:
		*p = int(k.Default.(float64))
	case *int64:
		*p = int64(k.Default.(float64))
	case *uint64:
		*p = uint64(k.Default.(float64))
	case *string:
		*p = k.Default.(string)
	case *bool:
		*p = k.Default.(bool)
	case *Years:
		*p = Years{OpenFrom: true, OpenTo: true, Text: "-"}
	}
}

// startRow fills the defaults of a row of an array table when its first key comes.
func (b *builder) startRow(path string, rows map[string]bool) {
	parts := strings.SplitN(path, ".", 3)
	if len(parts) < 3 || !arrayTables[parts[0]] {
		return
	}
	n, ok := position(parts[1])
	row := parts[0] + "." + parts[1]
	if !ok || rows[row] {
		return
	}
	rows[row] = true
	for _, k := range keys {
		if strings.HasPrefix(k.Path, parts[0]+".*.") && strings.Count(k.Path, "*") == 1 {
			b.fill(k, []int{n - 1})
		}
	}
	if parts[0] == "option" {
		grow(&b.c.Option, n-1)
	}
}

func (b *builder) fault(path, value, want, fix string) {
	b.add(Fault{Key: b.c.Display(path), Path: path, Value: value, Want: want, Fix: fix})
}

// mostFaults bounds what is kept of a file that is wrong everywhere.
const mostFaults = 10_000

func (b *builder) add(f Fault) {
	b.bad[f.Path] = true
	if len(b.faults) < mostFaults {
		b.faults = append(b.faults, f)
	}
}

// ofKey is fault where the key should not stand there at all.
func (b *builder) ofKey(path, value, want, fix string) {
	b.add(Fault{Key: b.c.Display(path), Path: path, Value: value, Want: want, Fix: fix, OfKey: true})
}

// missing faults a key that is needed and not given.
func (b *builder) missing(path, fix string) {
	b.add(Fault{Key: b.c.Display(path), Path: path, Want: "is missing", Fix: fix, Missing: true})
}

// useless faults a key that what is chosen elsewhere has no use for.
func (b *builder) useless(path, with, fix string) {
	b.add(Fault{Key: b.c.Display(path), Path: path, Value: b.value(path), Want: "has no use " + with, Fix: fix, OfKey: true, unused: true})
}

// take puts one entry into the case.
func (b *builder) take(e Entry) {
	if prev, twice := b.given[e.Path]; twice {
		b.ofKey(e.Path, quoted(e.Value), "is given twice (also as "+quoted(prev.Value)+")", "keep one of them")
		return
	}
	b.given[e.Path] = e
	for end := strings.LastIndexByte(e.Path, '.'); end > 0; end = strings.LastIndexByte(e.Path[:end], '.') {
		b.under[e.Path[:end]] = true
	}
	b.plainText(e)
	if row, rest, ok := cutOption(e.Path); ok {
		grow(&b.c.Option, row).Set = append(grow(&b.c.Option, row).Set, Setting{Path: rest, Value: e.Value})
		return
	}
	k, pos := Find(e.Path)
	if k == nil {
		b.unknown(e)
		return
	}
	if k.Path == "harvest.*.points.*.*" && pos[2] > 1 {
		b.fault(e.Path, quoted(e.Value), "is one number too many", "a point is [abundance, take]")
		return
	}
	switch p := k.At(b.c, pos...).(type) {
	case *float64, *Optional, *int, *int64, *uint64:
		b.takeNumber(k, e, p)
	case *string:
		b.takeWord(k, e, p)
	case *bool:
		if e.Value.Kind != FlagKind {
			b.fault(e.Path, quoted(e.Value), "is not true or false", "write true or false without quotes")
			return
		}
		*p = e.Value.Flag
	case *Years:
		y, err := ParseYears(e.Value.String())
		if err != nil || e.Value.Kind == FlagKind || e.Value.Kind == ListKind {
			b.fault(e.Path, quoted(e.Value), "is not a span of years", `write "2027-2056", "2030-", "-2040" or "2031"`)
			return
		}
		*p = y
	}
}

func (b *builder) takeNumber(k *Key, e Entry, p any) {
	v := e.Value
	if v.Kind != NumberKind {
		fix := "give " + k.Asks()
		if v.Kind == TextKind {
			if _, err := strconv.ParseFloat(strings.TrimSpace(v.Text), 64); err == nil {
				fix = "write the number without quotes"
			}
		}
		b.fault(e.Path, quoted(v), "is not a number", fix)
		return
	}
	if want := k.offends(v.Num); want != "" {
		b.fault(e.Path, quoted(v), want, "give "+k.Asks())
		return
	}
	switch p := p.(type) {
	case *float64:
		*p = v.Num
	case *Optional:
		*p = Optional{v.Num, true}
	case *int:
		*p = int(v.Num)
	case *int64:
		*p = int64(v.Num)
	case *uint64:
		seed, err := strconv.ParseUint(strings.ReplaceAll(v.Text, "_", ""), 0, 64)
		if err != nil {
			if v.Num >= math.MaxUint64 {
				b.fault(e.Path, quoted(v), "is above 18446744073709551615", "give a smaller whole number")
				return
			}
			if v.Num >= 1<<53 {
				b.fault(e.Path, quoted(v), "is not an exact whole number", "write all digits, without an exponent")
				return
			}
			seed = uint64(v.Num)
		}
		*p = seed
	}
}

func (b *builder) takeWord(k *Key, e Entry, p *string) {
	v := e.Value
	// run.substeps is a word or a whole number.
	if k.Path == "run.substeps" && v.Kind == NumberKind {
		*p = v.Text
		return
	}
	if v.Kind != TextKind {
		fix := "put it in quotes"
		if len(k.Choices) > 0 {
			fix = "give " + k.Asks()
		}
		b.fault(e.Path, quoted(v), "is not a text", fix)
		return
	}
	for _, choice := range k.Choices {
		if v.Text == choice {
			*p = v.Text
			return
		}
	}
	if len(k.Choices) > 0 {
		fix := "give " + k.Asks()
		if near := Nearest(strings.ToLower(v.Text), k.Choices); near != "" {
			fix = "did you mean " + strconv.Quote(near) + "? (" + anyOf(k.Choices) + ")"
		}
		b.fault(e.Path, quoted(v), "is not known here", fix)
		return
	}
	if usual, _ := k.Default.(string); strings.TrimSpace(v.Text) == "" && (usual != "" || k.Required) {
		b.fault(e.Path, quoted(v), "is empty", "give "+k.Asks())
		return
	}
	*p = v.Text
}

// unknown is the fault of a key that is not in the table, with the nearest that is.
func (b *builder) unknown(e Entry) {
	if b.hints++; b.hints > mostHints {
		b.ofKey(e.Path, "", "is not a key of a case", "")
		return
	}
	f := UnknownKey(e.Path)
	f.Key = b.c.Display(f.Path)
	if what := shape(e.Path); what != "" {
		f = Fault{Key: f.Key, Path: e.Path, Value: quoted(e.Value), Want: "is not " + what, Fix: shapeFix(e.Path)}
	}
	b.add(f)
}

// mostHints bounds the search for nearest keys: a file of nothing but unknown
// keys gets the first few explained and the rest only named.
const mostHints = 60

// required faults each key that must be given and is not.
func (b *builder) required(rows map[string]bool) {
	for _, k := range keys {
		if !k.Required {
			continue
		}
		top := topOf(k.Path)
		switch {
		case arrayTables[top]:
			for row := range rows {
				if topOf(row) == top {
					b.need(k, strings.Replace(k.Path, top+".*", row, 1))
				}
			}
		case strings.Contains(k.Path, "*"): // births.steps.*.from
			prefix, last, _ := strings.Cut(k.Path, "*")
			for n := 1; b.under[prefix+strconv.Itoa(n)]; n++ {
				b.need(k, prefix+strconv.Itoa(n)+last)
			}
		default:
			b.need(k, k.Path)
		}
	}
}

func (b *builder) need(k *Key, path string) {
	if _, ok := b.given[path]; ok {
		return
	}
	b.missing(path, "give "+k.Asks())
}

// conditions faults keys that the chosen rule, form or law has no use for.
func (b *builder) conditions() {
	said := map[string]bool{}
	for _, e := range b.c.entries {
		k, pos := Find(e.Path)
		if k == nil || k.WhenPath == "" {
			continue
		}
		sibling := k.WhenPath
		for _, p := range pos[:strings.Count(sibling, "*")] {
			sibling = strings.Replace(sibling, "*", strconv.Itoa(p+1), 1)
		}
		sk, spos := Find(sibling)
		have := *sk.At(b.c, spos...).(*string)
		used := have == "" || b.bad[sibling] // a missing or mistaken word has a fault of its own
		for _, w := range k.When {
			used = used || w == have
		}
		if !used {
			name := sibling[strings.LastIndex(sibling, ".")+1:]
			path := listOf(k, e.Path)
			if said[path] {
				continue
			}
			said[path] = true
			b.useless(path, fmt.Sprintf("with %s = %q", name, have), fmt.Sprintf("remove it, or choose %s = %q", name, k.When[0]))
		}
	}
}

// listOf is the list that a path is an element of, or else the path.
func listOf(k *Key, path string) string {
	for p := k.Path; strings.HasSuffix(p, ".*"); p = strings.TrimSuffix(p, ".*") {
		path = path[:strings.LastIndexByte(path, '.')]
	}
	return path
}

// quoted shows a value as it stands in a file, cut short where it is long.
func quoted(v Value) string {
	text := v.String()
	if v.Kind == TextKind {
		text = strconv.Quote(v.Text)
	}
	const most = 60
	if utf8.RuneCountInString(text) <= most {
		return text
	}
	return string([]rune(text)[:most-1]) + "…"
}

// longestText is the most characters of a text, source or note: far beyond a
// sentence, and well within what a cell of a workbook holds.
const longestText = 4000

// plainText faults characters that no reader would see: they would spoil a
// terminal, and a workbook cannot hold them.
func (b *builder) plainText(e Entry) {
	oneLine := e.Path != "case.purpose"
	_, _, rest, inRow := cutRow(e.Path)
	for i, part := range []string{e.Value.Text, e.Source, e.Note} {
		if i == 0 && inRow && rest == "name" {
			continue // looked at with the names
		}
		what := [...]string{"text", "source", "note"}[i]
		bad := func(r rune) bool {
			return unicode.IsControl(r) && (r != '\t' && r != '\n' || what == "text" && oneLine) || r == utf8.RuneError
		}
		if strings.IndexFunc(part, bad) >= 0 {
			b.fault(e.Path, quoted(Text(part)), "has a line break or control character in its "+what, "remove it")
		}
		if utf8.RuneCountInString(part) > longestText {
			b.fault(e.Path, quoted(Text(part)), "is too long a "+what, fmt.Sprintf("%d characters are the most", longestText))
		}
	}
}

// cutOption splits "option.2.set.KEY" into row 1 and KEY.
func cutOption(path string) (row int, key string, ok bool) {
	parts := strings.SplitN(path, ".", 4)
	if len(parts) != 4 || parts[0] != "option" || parts[2] != "set" {
		return 0, "", false
	}
	n, ok := position(parts[1])
	return n - 1, parts[3], ok
}
