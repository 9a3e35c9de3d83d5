package text

import (
	"fmt"
	"math"
	"strings"
	"unicode/utf8"

	"ebbline/pva"
	"ebbline/pva/rates"
	"ebbline/reports"
)

// Check is a case as understood: the question, every value in force, the order
// of the year, growth under both readings, resting places and doubts.
func Check(c *pva.Case, m *rates.Model, warnings []pva.Warning) string {
	var b strings.Builder
	if c.Title != "" {
		b.WriteString(wrap(c.Title, "", 0))
	}
	b.WriteString(wrap(reports.Question(c), "", 0) + "\n")
	b.WriteString("What is in force\n" + inputs(c) + "\n")
	b.WriteString("The order of a " + c.TimeUnit + "\n")
	for i, step := range reports.OrderOfYear(c) { // numbered here, so that long steps hang
		b.WriteString(wrap(fmt.Sprintf("%d. %s", i+1, step), "  ", 3))
	}
	if c.Question.Watch == "always" {
		b.WriteString(wrap("The threshold is watched always: at the start and after every event and action.", "  ", 0))
	}
	b.WriteString("\nGrowth of the rates in a mean " + c.TimeUnit + ", without takes\n" + growth(c, m))
	b.WriteString("\nWhere the mean path rests (takes and stocking included)\n" + rests(c, m))
	if plan := substeps(m); plan != "" {
		b.WriteString("\n" + wrap(plan, "", 0))
	}
	b.WriteString("\n" + wrap(reports.ProvenanceOf(c).Text(), "", 0))
	for _, w := range warnings {
		b.WriteString(wrap("Warning: "+w.String(), "", 2))
	}
	return b.String()
}

// inputs are the values in force, one a line under the heading of their table,
// with what they rest on. Titles stand above and options below.
func inputs(c *pva.Case) string {
	t := reports.InputsTable(c)
	key, value, unit, source, status := t.Column("key"), t.Column("value"), t.Column("unit"), t.Column("source"), t.Column("status")
	var out strings.Builder
	var rows [][]string
	table := ""
	flush := func() {
		out.WriteString(hung(rows, "    "))
		rows = nil
	}
	for i, row := range t.Rows {
		top, rest, _ := strings.Cut(t.Shown(i, key), ".")
		switch row.ID {
		case "case.title", "case.prepared", "case.purpose":
			continue
		}
		if top == "option" {
			continue
		}
		if top != table {
			flush()
			out.WriteString("  " + top + "\n")
			table = top
		}
		v := t.Shown(i, value)
		if u := t.Shown(i, unit); u != "" && !strings.HasSuffix(v, "%") {
			v += " " + oneOf(v, u)
		}
		note := t.Shown(i, status)
		if s := t.Shown(i, source); s != "" && s != reports.Assumed {
			note = s
		}
		rows = append(rows, []string{shorten(rest, 28), shorten(v, 36), note})
	}
	flush()
	for _, o := range c.Option {
		out.WriteString(wrap("option "+o.Name+": "+settings(c, o), "  ", 4))
	}
	return out.String()
}

// settings are what an option sets, lists in brackets.
func settings(c *pva.Case, o pva.Option) string {
	var parts []string
	list := ""
	for _, s := range o.Set {
		switch {
		case s.Value.Kind == pva.ListKind:
			list = s.Path + "."
			parts = append(parts, s.Path+" =")
		case list != "" && strings.HasPrefix(s.Path, list):
			parts[len(parts)-1] += " " + s.Value.String()
		default:
			list = ""
			parts = append(parts, s.Path+" = "+s.Value.String())
		}
	}
	return strings.Join(parts, "; ")
}

func growth(c *pva.Case, m *rates.Model) string {
	rows := [][]string{{"at a population of", "if pulse", "if flow", ""}}
	add := func(n float64, note string) {
		g := m.GrowthAt(n)
		mark := func(v float64, own bool) string {
			s := fmt.Sprintf("%+.2f %%", 100*(v-1))
			if own {
				s += " *"
			}
			return s
		}
		flow := c.Births.Breeding == "flow"
		rows = append(rows, []string{reports.Plain(n), mark(g.Pulse, !flow), mark(g.Flow, flow), note})
	}
	low := "the threshold"
	if c.Question.Threshold < 1 {
		low = "one left"
	}
	add(math.Max(1, math.Ceil(c.Question.Threshold)), low)
	add(c.Start.Abundance, "the start")
	return columns(rows, "  ", true, true, true) + "  * the reading in force; a rate meant for the other reading shows here\n"
}

func rests(c *pva.Case, m *rates.Model) string {
	const mean = "(of a mean path: no weather, no catastrophes, and rules of one year in several averaged over the years)"
	note := wrap(strings.ReplaceAll(mean, "year", c.TimeUnit), "  ", 0)
	list := m.Equilibria()
	if len(list) == 0 {
		n := m.MeanYear(c.Start.Abundance)
		way := "declines"
		if n > c.Start.Abundance {
			way = "grows"
		}
		return "  nowhere above 0: from the start it " + way + "\n" + note
	}
	var out strings.Builder
	for _, e := range list {
		kind := "unstable: it moves away from there"
		if e.Stable {
			kind = "stable"
		}
		out.WriteString("  " + reports.Significant(e.N, 4) + "  " + kind + "\n")
	}
	return out.String() + note
}

// substeps says how a flow year is simulated.
func substeps(m *rates.Model) string {
	b := rates.BoundSubsteps(m)
	switch {
	case b == nil:
		return ""
	case b.Substeps == 0:
		return "Every birth, death and removal is simulated as an event of its own."
	}
	s := fmt.Sprintf("The year is simulated in %d sub-steps", b.Substeps)
	if b.EventsBelow > 0 {
		s += " while the population is above " + reports.Plain(b.EventsBelow) + ", and event by event below"
	}
	return s + "; " + boundWords(b.RiskBound) + "."
}

// boundWords say what a bound on the shift of a probability is worth.
func boundWords(bound float64) string {
	switch {
	case bound < 0.0001:
		return "that shifts any probability by less than 0.0001"
	case bound >= 0.5 || math.IsNaN(bound):
		return "how far that shifts a probability is not bounded: what can be shown allows for half or more"
	}
	return fmt.Sprintf("that shifts no probability by more than about %.2g", bound)
}

// oneOf is a unit as it stands after a number: singular after 1. Only the words
// of this program are known in the singular, not those that a case counts in.
func oneOf(number, unit string) string {
	if number != "1" {
		return unit
	}
	word, rest, _ := strings.Cut(unit, " ")
	switch word {
	case "animals", "heads", "years", "units", "replicates", "draws", "deaths", "months", "days", "weeks", "seasons":
		word = strings.TrimSuffix(word, "s")
	}
	return strings.TrimSpace(word + " " + rest)
}

// hung lays rows out in columns, the last of which goes on below itself where
// it is too long for the line.
func hung(rows [][]string, indent string) string {
	if len(rows) == 0 {
		return ""
	}
	last := len(rows[0]) - 1
	at := utf8.RuneCountInString(indent)
	for j := range last {
		w := 0
		for _, r := range rows {
			w = max(w, utf8.RuneCountInString(r[j]))
		}
		at += w + 2
	}
	if Width-at < 16 { // no room beside: below, set in
		var out strings.Builder
		short := make([][]string, len(rows))
		for i, r := range rows {
			short[i] = r[:last]
		}
		lines := strings.SplitAfter(columns(short, indent), "\n")
		for i, r := range rows {
			out.WriteString(lines[i] + wrap(r[last], indent+"    ", 0))
		}
		return out.String()
	}
	var flat [][]string
	for _, r := range rows {
		for i, line := range strings.Split(strings.TrimRight(wrapTo(r[last], Width-at), "\n"), "\n") {
			row := make([]string, last+1)
			if i == 0 {
				copy(row, r)
			}
			row[last] = line
			flat = append(flat, row)
		}
	}
	return columns(flat, indent)
}
