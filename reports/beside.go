package reports

import (
	"sort"
	"strings"

	"ebbline/pva"
	"ebbline/pva/estimate"
)

// optionsPart sets the case, its options and the baseline side by side.
func optionsPart(a *pva.Assessment, s scores) Part {
	interval := "Newcombe's paired interval (1998)"
	if a.Sequential {
		interval = "an interval that holds at every look (two confidence sequences)"
	}
	return Part{Name: PartOptions,
		Lead: "Every row is assessed on the same replicates, so that differences between rows are sharper than their intervals suggest. " +
			"The difference is the row's risk minus the case's, in percentage points, with " + interval + ".",
		Tables: []*Table{optionsTable(a, s)}, Charts: []Chart{optionsChart(a)}}
}

// besideColumns are the columns of a risk set beside the case's.
func besideColumns(b *builder, replicates int64) {
	d := tableDigits(replicates)
	pct, cnt, pts := Format{Percents, d}, Format{Kind: Counts}, Format{Points, d}
	b.column("count", "Fallen", "replicates", cnt).column("estimate", "Risk", "", pct).column("low", "Low", "", pct).column("high", "High", "", pct).
		column("difference", "Difference from the case", "points", pts).column("difference_low", "Low", "points", pts).column("difference_high", "High", "points", pts).
		column("only_this", "Fell only here", "replicates", cnt).column("only_case", "Fell only in the case", "replicates", cnt)
}

// beside fills them. The interval of the difference is a formula of the four
// counts, which are the row's own, where Newcombe's method gave it.
func (s scores) beside(cells map[string]Cell, table string, p pva.Proportion, d pva.Difference, of pva.Proportion) {
	s.proportion(cells, p, "count", "estimate", "low", "high", cellReplicates)
	point := 100 * (p.Estimate - of.Estimate)
	at := func(key string) string { return "{" + table + ":case:" + key + "}" }
	cells["difference"] = num(100*d.Estimate).by("({estimate}-"+at("estimate")+")*100", point)
	low, high := num(100*d.Low), num(100*d.High)
	q := newPaired(p, of, d)
	if q.explains(d, s) {
		both := "({count}-{only_this})"
		neither := "(" + cellReplicates + "-{count}-{only_case})"
		phi := "(" + phiFormula(both, "{only_this}", "{only_case}", neither) + ")"
		low.Formula, high.Formula = limitFormulas("{estimate}", "{low}", "{high}", at("estimate"), at("low"), at("high"), phi)
	}
	cells["difference_low"], cells["difference_high"] = low, high
	cells["only_this"], cells["only_case"] = num(float64(d.OnlyThis)), num(float64(d.OnlyOther))
}

func optionsTable(a *pva.Assessment, s scores) *Table {
	c, o := a.Case, a.Outcome
	b := newTable("options", "")
	b.t.Main = true
	b.column("name", "Option", "", Format{})
	besideColumns(b, o.Replicates)
	digits := tableDigits(o.Replicates)
	exact := exactAnswer(a.Exact) != nil
	if exact {
		b.column("exact", "Exact risk", "", Format{Percents, 3})
	}
	if a.Added != nil {
		b.column("added", "Adds to the baseline", "points", Format{Points, digits})
	}
	_, takes := c.Takes()
	if takes {
		b.column("taken", "Taken a "+c.TimeUnit, c.Counts, Format{Decimal, 2})
	}
	if c.Question.Limit.Set {
		b.column("verdict", "Verdict", "", Format{})
	}
	b.wide("set", "What is changed")
	cells := map[string]Cell{"name": text("The case"), "taken": num(o.TakeMean), "set": text("as stated")}
	s.proportion(cells, o.Risk, "count", "estimate", "low", "high", cellReplicates)
	if a.Added != nil {
		cells["added"] = added(a.Added, o.Risk, a.Baseline.Risk)
	}
	if exact {
		cells["exact"] = num(a.Exact.Risk)
	}
	cells["verdict"] = rowVerdict(a.Verdict, o.Risk, exactAnswer(a.Exact), c)
	b.row("case", cells)
	for i, alt := range a.Options {
		cells := map[string]Cell{"name": text(alt.Name), "taken": num(alt.Outcome.TakeMean), "set": text(settingsText(c, alt.Set))}
		s.beside(cells, "options", alt.Outcome.Risk, alt.Difference, o.Risk)
		if alt.Added != nil && a.Baseline != nil {
			cells["added"] = added(alt.Added, alt.Outcome.Risk, a.Baseline.Risk)
		}
		if e := exactAnswer(alt.Exact); e != nil {
			cells["exact"] = num(e.Risk)
		}
		cells["verdict"] = rowVerdict(alt.Verdict, alt.Outcome.Risk, exactAnswer(alt.Exact), c)
		b.row("option_"+yearID(i+1), cells)
	}
	if a.Baseline != nil && a.Added != nil {
		// The difference of the baseline from the case is the added risk turned round.
		d := estimate.Reversed(*a.Added)
		cells := map[string]Cell{"name": text("Without the take"), "taken": num(a.Baseline.TakeMean), "set": text("no take that the permit would allow")}
		s.beside(cells, "options", a.Baseline.Risk, d, o.Risk)
		if e := exactAnswer(a.BaselineExact); e != nil {
			cells["exact"] = num(e.Risk)
		}
		b.row("baseline", cells)
	}
	return b.t
}

func added(d *pva.Difference, risk, base pva.Proportion) Cell {
	return num(100*d.Estimate).by("({estimate}-{figures:baseline:estimate})*100", 100*(risk.Estimate-base.Estimate))
}

func rowVerdict(v pva.Verdict, p pva.Proportion, exact *pva.ExactAnswer, c *pva.Case) Cell {
	if v == pva.NoVerdict || !c.Question.Limit.Set {
		return Cell{}
	}
	if exact != nil {
		return verdictBy(text(string(v)), exact.Risk, exact.Risk, c.Question.Limit.Value, "{exact}", "{exact}")
	}
	return verdictBy(text(string(v)), p.Low, p.High, c.Question.Limit.Value, "{low}", "{high}")
}

// settingsText says what an option changes, with the case's own value beside it.
func settingsText(c *pva.Case, set []pva.Setting) string {
	was := map[string]string{}
	for _, e := range inForce(c) {
		was[e.Path] = e.Value.String()
	}
	parts := make([]string, 0, len(set))
	for _, s := range set {
		if s.Value.Kind == pva.ListKind {
			continue // its elements follow
		}
		path, fault := c.Lookup(s.Path)
		if fault != nil {
			path = s.Path
		}
		t := c.Display(path) + " = " + s.Value.String()
		if old, ok := was[path]; ok {
			t += " (case: " + old + ")"
		}
		parts = append(parts, t)
	}
	return strings.Join(parts, "; ")
}

// driversPart shows what the risk hangs on.
func driversPart(a *pva.Assessment, s scores) Part {
	return Part{Name: PartDrivers,
		Lead:   "The same replicates with one thing taken out. The further a bar falls below the case, the more of the risk that one thing brings; parts do not add up, because they act together.",
		Tables: []*Table{driversTable(a, s)}, Charts: []Chart{driversChart(a)}}
}

func driversTable(a *pva.Assessment, s scores) *Table {
	b := newTable("drivers", "")
	b.t.Main = true
	b.column("without", "Case", "", Format{})
	besideColumns(b, a.Outcome.Replicates)
	cells := map[string]Cell{"without": text("The case")}
	s.proportion(cells, a.Outcome.Risk, "count", "estimate", "low", "high", cellReplicates)
	b.row("case", cells)
	order := append([]pva.Driver(nil), a.Drivers...)
	sort.SliceStable(order, func(i, j int) bool { return order[i].Risk.Estimate < order[j].Risk.Estimate })
	for i, d := range order {
		cells := map[string]Cell{"without": text("Without " + d.Without)}
		s.beside(cells, "drivers", d.Risk, d.Difference, a.Outcome.Risk)
		b.row("driver_"+yearID(i+1), cells)
	}
	return b.t
}
