package reports

import (
	"strconv"
	"strings"

	"ebbline/pva"
)

// The statuses of an input. Stated are words, and numbers that put the question
// or say how it is run: they rest on nobody's data.
const (
	Sourced    = "sourced"
	Assumed    = "assumed"
	Unsourced  = "unsourced"
	Overridden = "overridden"
	Default    = "default"
	Stated     = "stated"
)

// Provenance counts what the inputs rest on. Only numbers about the population,
// its take and its surroundings count as inputs; a list of numbers is one.
type Provenance struct {
	Inputs                                  int
	Sourced, Assumed, Unsourced, Overridden []string // their keys, by name
	Defaults                                int      // numbers that nobody gave
}

// Text is the provenance in a line: "14 inputs: 9 sourced, 3 assumed, 2
// unsourced (births.year_sd, deaths.year_sd)".
func (p Provenance) Text() string { return p.text(true) }

// Short is the same without the keys.
func (p Provenance) Short() string { return p.text(false) }

func (p Provenance) text(keys bool) string {
	parts := []string{strconv.Itoa(len(p.Sourced)) + " sourced"}
	add := func(list []string, word string, named bool) {
		if len(list) == 0 {
			return
		}
		s := strconv.Itoa(len(list)) + " " + word
		if keys && named {
			s += " (" + some(list) + ")"
		}
		parts = append(parts, s)
	}
	add(p.Assumed, Assumed, false)
	add(p.Overridden, Overridden, true)
	add(p.Unsourced, Unsourced, true)
	return counted(int64(p.Inputs), "input") + ": " + strings.Join(parts, ", ")
}

func some(keys []string) string {
	if len(keys) > 6 {
		return strings.Join(keys[:5], ", ") + " and " + strconv.Itoa(len(keys)-5) + " more"
	}
	return strings.Join(keys, ", ")
}

// dated are numbers that say when, how often or per how many, and so rest on
// nobody's data either.
var dated = map[string]bool{"start.year": true, "births.per": true, "deaths.per": true, "births.steps.*.from": true, "deaths.steps.*.from": true,
	"harvest.*.one_year_in": true, "harvest.*.survey_every": true, "stocking.*.one_year_in": true}

// asked are the tables whose numbers put the question or say how it is run.
var asked = map[string]bool{"case": true, "question": true, "run": true, "option": true, "sweep": true, "minimum": true}

// InputsTable lists every number and word in force: those given, in the order of
// the key table, and the defaults that the case makes use of. Its first five
// columns are the form in which a case can be read from a sheet; a reader leaves
// out the rows whose status is default.
func InputsTable(c *pva.Case) *Table {
	b := newTable("inputs", "")
	b.t.Main = true
	b.column("key", "Key", "", Format{}).column("value", "Value", "", Format{Kind: General}).column("unit", "Unit", "", Format{}).
		wide("source", "Source").wide("note", "Note").column("status", "Status", "", Format{}).wide("meaning", "Meaning")
	names := newNames(c)
	for _, e := range inForce(c) {
		if names.spare(e.Path) {
			continue // the name stands in the keys of the row
		}
		key := keyOf(c, e.Path)
		cells := map[string]Cell{"key": text(names.display(e.Path)), "value": valueCell(e.Value),
			"source": optional(e.Source), "note": optional(e.Note), "status": text(status(e, key))}
		if key != nil {
			cells["unit"], cells["meaning"] = optional(unitOf(c, key)), optional(key.Doc)
			if v := cells["value"]; v.Kind == NumberCell {
				cells["value"] = shownAs(v, key)
			}
		}
		b.row(e.Path, cells)
	}
	return b.t
}

// shownAs writes dates and the seed as plain digits and a level as percent; the
// value stays the one of the case.
func shownAs(v Cell, key *pva.Key) Cell {
	switch {
	case key.Unit == "date" || key.Path == "run.seed":
		v.Format = Format{Kind: Dates}
	case key.Path == "question.limit" || key.Path == "question.confidence":
		v.Format = Format{Percents, PercentDecimals(v.Num)}
	}
	return v
}

func optional(s string) Cell {
	if s == "" {
		return Cell{}
	}
	return text(s)
}

// keyOf is the key of a path; for what an option sets, by name or by position,
// the key it sets.
func keyOf(c *pva.Case, path string) *pva.Key {
	if parts := strings.SplitN(path, ".", 4); len(parts) == 4 && parts[0] == "option" && parts[2] == "set" {
		path = parts[3]
		if at, fault := c.Lookup(path); fault == nil {
			path = at
		}
	}
	k, _ := pva.Find(path)
	return k
}

func valueCell(v pva.Value) Cell {
	switch v.Kind {
	case pva.NumberKind:
		// A whole number beyond 2^53 would lose digits as a number.
		if v.Num >= 1<<53 || v.Num <= -(1<<53) {
			return text(v.Text)
		}
		return num(v.Num)
	case pva.FlagKind:
		return Cell{Kind: FlagCell, Flag: v.Flag}
	}
	return text(v.String())
}

func status(e pva.Entry, key *pva.Key) string {
	top, _, _ := strings.Cut(e.Path, ".")
	switch {
	case e.Origin == pva.FromDefault:
		return Default
	case e.Origin == pva.FromOverride:
		return Overridden
	case e.Source == Assumed:
		return Assumed
	case e.Source != "":
		return Sourced
	case key == nil || !key.IsNumber() || asked[top] || dated[key.Path]:
		return Stated
	}
	return Unsourced
}

// provenance counts the rows of an inputs table.
func provenance(t *Table) Provenance {
	var p Provenance
	seen := map[string]bool{}
	for i, row := range t.Rows {
		key, _ := pva.Find(row.ID)
		top, _, _ := strings.Cut(row.ID, ".")
		if key == nil || !key.IsNumber() || asked[top] || dated[key.Path] {
			continue
		}
		name := listOf(t.Rows[i].Cells[t.Column("key")].Text)
		if seen[name] {
			continue
		}
		seen[name] = true
		switch row.Cells[t.Column("status")].Text {
		case Default:
			p.Defaults++
			continue
		case Overridden:
			p.Overridden = append(p.Overridden, name)
		case Assumed:
			p.Assumed = append(p.Assumed, name)
		case Sourced:
			p.Sourced = append(p.Sourced, name)
		default:
			p.Unsourced = append(p.Unsourced, name)
		}
		p.Inputs++
	}
	return p
}

// listOf cuts the positions off the end of a key, so that a list is one input.
func listOf(key string) string {
	for {
		i := strings.LastIndexByte(key, '.')
		if i < 0 {
			return key
		}
		if _, err := strconv.Atoi(key[i+1:]); err != nil {
			return key
		}
		key = key[:i]
	}
}

// names shows paths by name where every row of the table has one; with some
// rows unnamed, names in a sheet of keys would not keep the order of the rows.
type names struct {
	c     *pva.Case
	named map[string]bool
}

func newNames(c *pva.Case) names {
	n := names{c, map[string]bool{"harvest": true, "stocking": true, "catastrophe": true, "option": true}}
	for _, x := range c.Harvest {
		n.named["harvest"] = n.named["harvest"] && x.Name != ""
	}
	for _, x := range c.Stocking {
		n.named["stocking"] = n.named["stocking"] && x.Name != ""
	}
	for _, x := range c.Catastrophe {
		n.named["catastrophe"] = n.named["catastrophe"] && x.Name != ""
	}
	for _, x := range c.Option {
		n.named["option"] = n.named["option"] && x.Name != ""
	}
	return n
}

// display is a path by name. What an option sets stays as written, by name or
// by position: it is part of the option's own key.
func (n names) display(path string) string {
	if top, _, _ := strings.Cut(path, "."); n.named[top] {
		return n.c.Display(path)
	}
	return path
}

// spare says whether a row only gives the name that its other keys carry.
func (n names) spare(path string) bool {
	parts := strings.Split(path, ".")
	return len(parts) == 3 && parts[2] == "name" && n.named[parts[0]]
}

// inForce is what was given and the defaults in force, in the order of the key table.
func inForce(c *pva.Case) []pva.Entry {
	given := map[string]bool{}
	rows := map[string]map[string]bool{}
	entries := c.Entries()
	for _, e := range entries {
		given[e.Path] = true
		if parts := strings.SplitN(e.Path, ".", 3); len(parts) == 3 {
			if rows[parts[0]] == nil {
				rows[parts[0]] = map[string]bool{}
			}
			rows[parts[0]][parts[1]] = true
		}
	}
	add := func(k *pva.Key, path string) {
		v, ok := defaultValue(k)
		if ok && !given[path] && inUse(c, k, path) {
			entries = append(entries, pva.Entry{Path: path, Value: v, Origin: pva.FromDefault})
		}
	}
	for _, k := range pva.Keys() {
		top, rest, _ := strings.Cut(k.Path, ".")
		switch {
		case !strings.Contains(k.Path, "*"):
			add(k, k.Path)
		case strings.HasPrefix(rest, "*.") && strings.Count(rest, "*") == 1:
			for n := range rows[top] {
				add(k, top+"."+n+strings.TrimPrefix(rest, "*"))
			}
		}
	}
	return pva.Ordered(entries)
}

func defaultValue(k *pva.Key) (pva.Value, bool) {
	switch d := k.Default.(type) {
	case float64:
		return pva.Num(d), true
	case bool:
		return pva.Flag(d), true
	case string:
		return pva.Text(d), d != ""
	}
	return pva.Value{}, false
}

// inUse says whether a default has any part in this case.
func inUse(c *pva.Case, k *pva.Key, path string) bool {
	pulse := c.Births.Breeding == "pulse"
	_, pos := pva.Find(path)
	switch k.Path {
	case "births.parents", "births.offspring":
		return pulse
	case "run.substeps":
		return !pulse
	case "deaths.per":
		return c.Deaths.Rate.Set
	case "births.cycle.period", "births.cycle.phase":
		return c.Births.Cycle.Amplitude != 0
	case "deaths.cycle.period", "deaths.cycle.phase":
		return c.Deaths.Cycle.Amplitude != 0
	case "run.draws":
		return len(c.Uncertain) > 0
	case "run.baseline":
		permitted, _ := c.Takes()
		return permitted
	case "minimum.vary":
		return c.Minimum != (pva.Minimum{Vary: c.Minimum.Vary})
	case "harvest.*.survey_cv", "harvest.*.survey_every", "harvest.*.take_cv", "harvest.*.take_noise":
		return c.Harvest[pos[0]].When != "through"
	case "stocking.*.noise":
		return c.Stocking[pos[0]].When != "through"
	}
	return true
}
