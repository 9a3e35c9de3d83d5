package pva

import (
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// Resolve turns names in paths into positions: "harvest.control.take" becomes
// "harvest.1.take" where the first harvest is named control. A name that no row
// carries makes a new row of that name, so that a sheet of keys needs no rows
// of names; overrides use Lookup, which refuses it. From tells for each entry
// returned which of those given it comes from.
func Resolve(entries []Entry) (out []Entry, from []int, faults Faults) {
	r := newResolver(entries)
	out, from = make([]Entry, 0, len(entries)), make([]int, 0, len(entries))
	for i, e := range entries {
		table, row, rest, ok := cutRow(e.Path)
		if _, byPosition := position(row); ok && !byPosition {
			n, known := r.names[table][row]
			if !known {
				if !r.nameable(e.Path, table, row) {
					continue
				}
				r.highest[table]++
				n = r.highest[table]
				r.note(table, row, n)
				out = append(out, Entry{Path: table + "." + strconv.Itoa(n) + ".name", Value: Text(row), Origin: e.Origin})
				from = append(from, i)
			}
			e.Path = table + "." + strconv.Itoa(n) + "." + rest
			if rest == "name" && e.Value.Kind == TextKind && e.Value.Text == row {
				continue // harvest.control.name = control says nothing new
			}
		}
		out, from = append(out, e), append(from, i)
	}
	return out, from, r.faults
}

// resolver knows which row of which table carries which name.
type resolver struct {
	names   map[string]map[string]int // table, name -> position from 1
	highest map[string]int            // table -> highest position in use
	faults  Faults
}

// newResolver learns the names of all rows.
func newResolver(entries []Entry) *resolver {
	r := &resolver{names: map[string]map[string]int{}, highest: map[string]int{}}
	for _, e := range entries {
		r.declare(e)
	}
	return r
}

// declare learns the name of a row that is given by position.
func (r *resolver) declare(e Entry) {
	table, row, rest, ok := cutRow(e.Path)
	n, byPosition := position(row)
	if !ok || !byPosition {
		return
	}
	r.highest[table] = max(r.highest[table], n)
	if rest != "name" || e.Value.Kind != TextKind || e.Value.Text == "" {
		return
	}
	name := e.Value.Text
	if _, twice := r.names[table][name]; twice {
		r.faults = append(r.faults, Fault{Key: e.Path, Path: e.Path, Value: quoted(e.Value), Want: "names two rows of [[" + table + "]]", Fix: "give each its own name"})
		return
	}
	if why := badName(name); why != "" {
		r.faults = append(r.faults, Fault{Key: e.Path, Path: e.Path, Value: quoted(e.Value), Want: "cannot be a name: " + why, Fix: "give a short name in plain words"})
		return
	}
	r.note(table, name, n)
}

// nameable says whether rows of the table have names and this may be one.
func (r *resolver) nameable(path, table, row string) bool {
	if k, _ := Find(table + ".1.name"); k == nil {
		r.faults = append(r.faults, Fault{Key: path, Path: path, Want: "has no position", Fix: "rows of [[" + table + "]] have no names: write " + table + ".1"})
		return false
	}
	if why := badName(row); why != "" {
		r.faults = append(r.faults, Fault{Key: path, Path: path, Value: quoted(Text(row)), Want: "cannot be a name: " + why, Fix: "give a short name in plain words"})
		return false
	}
	return true
}

func (r *resolver) note(table, name string, n int) {
	if r.names[table] == nil {
		r.names[table] = map[string]int{}
	}
	r.names[table][name] = n
}

// longestName is the most characters that the name of a row may have.
const longestName = 100

// GoodName says whether a text can be the name of a row of an array table.
func GoodName(name string) bool { return badName(name) == "" }

// badName says why a text cannot be the name of a row; "" if it can.
func badName(name string) string {
	_, whole := position(name)
	switch {
	case whole:
		return "a bare number is the position of a row"
	case strings.Contains(name, "."):
		return "it has a dot, which parts the words of a key"
	case strings.TrimSpace(name) != name || name == "":
		return "it begins or ends with a space"
	case strings.IndexFunc(name, unicode.IsControl) >= 0:
		return "it has a control character"
	case utf8.RuneCountInString(name) > longestName:
		return "it is longer than 100 characters"
	}
	return ""
}

// cutRow splits "harvest.control.take" into table, row and the rest; ok is
// false where the path leads through no array table.
func cutRow(path string) (table, row, rest string, ok bool) {
	parts := strings.SplitN(path, ".", 3)
	if len(parts) < 3 || !arrayTables[parts[0]] {
		return "", "", "", false
	}
	return parts[0], parts[1], parts[2], true
}

// IsArrayTable says whether the table may stand several times, as [[harvest]] may.
func IsArrayTable(table string) bool { return arrayTables[table] }

// Display is a path by name where its row has one, for people to read.
func (c *Case) Display(path string) string {
	parts := strings.SplitN(path, ".", 3)
	if len(parts) < 3 || !arrayTables[parts[0]] {
		return path
	}
	n, ok := position(parts[1])
	if !ok {
		return path
	}
	if name := c.rowName(parts[0], n-1); GoodName(name) {
		return parts[0] + "." + name + "." + parts[2]
	}
	return path
}

func (c *Case) rowName(table string, i int) string {
	switch table {
	case "harvest":
		if i < len(c.Harvest) {
			return c.Harvest[i].Name
		}
	case "stocking":
		if i < len(c.Stocking) {
			return c.Stocking[i].Name
		}
	case "catastrophe":
		if i < len(c.Catastrophe) {
			return c.Catastrophe[i].Name
		}
	case "option":
		if i < len(c.Option) {
			return c.Option[i].Name
		}
	}
	return ""
}

// rows counts the rows of an array table.
func (c *Case) rows(table string) int {
	switch table {
	case "harvest":
		return len(c.Harvest)
	case "stocking":
		return len(c.Stocking)
	case "catastrophe":
		return len(c.Catastrophe)
	case "option":
		return len(c.Option)
	case "uncertain":
		return len(c.Uncertain)
	case "uncertain_pair":
		return len(c.UncertainPair)
	case "sweep":
		return len(c.Sweep)
	}
	return 0
}

// Lookup turns a path by name into one by position for this case. The fault
// says which names there are if the named row does not exist.
func (c *Case) Lookup(path string) (string, *Fault) {
	parts := strings.SplitN(path, ".", 3)
	if len(parts) < 3 || !arrayTables[parts[0]] {
		return path, nil
	}
	rows := c.rows(parts[0])
	var known []string
	for i := 0; i < rows; i++ {
		name := c.rowName(parts[0], i)
		if name != "" && name == parts[1] {
			return parts[0] + "." + strconv.Itoa(i+1) + "." + parts[2], nil
		}
		if name == "" {
			name = strconv.Itoa(i + 1)
		}
		known = append(known, name)
	}
	if n, ok := position(parts[1]); ok && n <= rows {
		return path, nil
	}
	fix := "the case has no [[" + parts[0] + "]]"
	if len(known) > 0 {
		fix = "it has " + strings.Join(known, ", ")
	}
	return "", &Fault{Key: path, Path: path, OfKey: true, Want: "the case has no row " + strconv.Quote(parts[1]) + " in [[" + parts[0] + "]]", Fix: fix}
}
