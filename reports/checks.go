package reports

import (
	"math"
	"strconv"

	"gonum.org/v1/gonum/mathext"

	"ebbline/pva"
)

// checksPart sets the simulation against what it can be held against. It has
// nothing to show only where there is not even a second batch.
func checksPart(a *pva.Assessment, s scores) (Part, bool) {
	p := Part{Name: PartChecks, Lead: "What the simulation was held against, and what was not checked."}
	if t := exactTable(a); t != nil {
		p.Tables = append(p.Tables, t)
	}
	if t := closedTable(a); t != nil {
		p.Tables = append(p.Tables, t)
	}
	p.Tables = append(p.Tables, yardstickTables(a)...)
	if t := batchesTable(a, s); t != nil {
		p.Tables = append(p.Tables, t)
	}
	if t := pairsTable(a, s); t != nil {
		p.Tables = append(p.Tables, t)
	}
	if t := substepsTable(a); t != nil {
		p.Tables = append(p.Tables, t)
	}
	if len(p.Tables) == 0 {
		return p, false
	}
	p.Sections = []Section{{Heading: "Not checked", Paragraphs: notChecked(a)}}
	return p, true
}

// exactTable sets the simulated risks beside the exact ones.
func exactTable(a *pva.Assessment) *Table {
	if a.Exact == nil {
		return nil
	}
	pct := Format{Percents, tableDigits(a.Outcome.Replicates)}
	b := newTable("exact_check", "Simulation against the exact answer").
		column("what", "", "", Format{}).column("simulated", "Simulated", "", pct).column("low", "Low", "", pct).column("high", "High", "", pct).
		column("exact", "Exact", "", Format{Percents, 3}).column("error", "Its error, at most", "", Format{Kind: Small, Digits: 1}).column("difference", "Simulated less exact", "points", Format{Points, 3})
	if e := exactAnswer(a.Exact); e == nil {
		b.t.Columns = []Column{{Key: "what", Wide: true}}
		b.row("none", map[string]Cell{"what": text("No exact answer stands beside it: " + a.Exact.Reason + ".")})
		return b.t
	}
	row := func(id, what string, p pva.Proportion, e *pva.ExactAnswer, exact float64, where string) {
		d := 100 * (p.Estimate - exact)
		b.row(id, map[string]Cell{"what": text(what), "simulated": num(p.Estimate).by(where+":estimate}", p.Estimate), "low": num(p.Low), "high": num(p.High),
			"exact": num(exact), "error": num(e.Error), "difference": num(d).by("({simulated}-{exact})*100", d)})
	}
	row("risk", "Risk", a.Outcome.Risk, a.Exact, a.Exact.Risk, "{figures:risk")
	row("extinction", "None left at the last census", a.Outcome.Extinction, a.Exact, a.Exact.Extinction, "{figures:extinction")
	if e := exactAnswer(a.BaselineExact); e != nil && a.Baseline != nil {
		row("baseline", "Risk without the take", a.Baseline.Risk, e, e.Risk, "{figures:baseline")
	}
	b.t.Note = exactNote(a.Exact) + " A count at least so far from the exact risk has probability " + strconv.FormatFloat(a.ExactTail, 'g', 3, 64)
	if a.Unreliable {
		b.t.Note += ", less than one in a thousand million: one of the two is wrong"
	}
	b.t.Note += "."
	return b.t
}

func exactNote(e *pva.ExactAnswer) string {
	s := "Method: " + e.Method
	if e.States > 0 {
		s += ", " + Grouped(int64(e.States)) + " states"
	}
	if e.Nodes > 0 {
		s += ", " + counted(int64(e.Nodes), "quadrature node") + " for the weather"
	}
	return s + "; its own error is at most " + strconv.FormatFloat(e.Error, 'g', 2, 64) + "."
}

// batchesTable shows the replicates in interleaved batches and tests whether
// they scatter as they should (Pearson's chi-squared of a 2 by k table).
func batchesTable(a *pva.Assessment, s scores) *Table {
	batches := a.Outcome.Batches
	if len(batches) < 2 {
		return nil
	}
	pct, cnt := Format{Percents, tableDigits(batches[0].Of)}, Format{Kind: Counts}
	b := newTable("batches", "Convergence: the replicates in batches").
		column("batch", "Batch", "", Format{Kind: Dates}).column("count", "Fallen", "replicates", cnt).column("of", "Of", "replicates", cnt).
		column("estimate", "Risk", "", pct).column("low", "Low", "", pct).column("high", "High", "", pct).
		column("running", "Risk up to here", "", Format{Percents, tableDigits(a.Outcome.Replicates)}).
		column("part", "Part of chi-squared", "", Format{Decimal, 3})
	risk := a.Outcome.Risk.Estimate
	var count, of int64
	var chi float64
	countTerms, ofTerms := "", ""
	for i, p := range batches {
		id := yearID(i + 1)
		cells := map[string]Cell{"batch": num(float64(i + 1)), "of": num(float64(p.Of))}
		s.proportion(cells, p, "count", "estimate", "low", "high", "{of}")
		count, of = count+p.Count, of+p.Of
		countTerms, ofTerms = countTerms+"+{batches:"+id+":count}", ofTerms+"+{batches:"+id+":of}"
		running := float64(count) / float64(of)
		cells["running"] = num(running).by("("+countTerms[1:]+")/("+ofTerms[1:]+")", running)
		part := 0.0
		if risk > 0 && risk < 1 {
			gap := float64(p.Count) - float64(p.Of)*risk
			part = gap * gap / (float64(p.Of) * risk * (1 - risk))
			chi += part
		}
		const formula = "IF({figures:risk:estimate}*(1-{figures:risk:estimate})=0,0,({count}-{of}*{figures:risk:estimate})^2/({of}*{figures:risk:estimate}*(1-{figures:risk:estimate})))"
		contribution := num(part)
		contribution.Formula = formula
		cells["part"] = contribution
		b.row(id, cells)
	}
	free := float64(len(batches) - 1)
	p := mathext.GammaIncRegComp(free/2, chi/2)
	b.t.Note = "The batches scatter with chi-squared " + Significant(chi, 3) + " on " + strconv.Itoa(int(free)) + " degrees of freedom; so much or more has probability " + Significant(p, 2) + " if all is well."
	return b.t
}

// pairsTable works out the interval of the added risk from its four counts.
func pairsTable(a *pva.Assessment, s scores) *Table {
	if a.Added == nil || a.Baseline == nil {
		return nil
	}
	d := *a.Added
	q := newPaired(a.Outcome.Risk, a.Baseline.Risk, d)
	cnt, pts := Format{Kind: Counts}, Format{Points, tableDigits(d.Of) + 1}
	how := "Newcombe 1998, method 10"
	if a.Sequential {
		how = "the two shares that fell in one only, each with a confidence sequence at half the doubt"
	}
	b := newTable("pairs", "How the interval of the added risk is made ("+how+")").
		column("both", "Fell in both", "replicates", cnt).column("only_with", "Only with the take", "replicates", cnt).
		column("only_without", "Only without", "replicates", cnt).column("neither", "In neither", "replicates", cnt)
	if !a.Sequential {
		b.column("phi", "Correlation phi", "", Format{Decimal, 6})
	}
	b.column("estimate", "The take adds", "points", pts).
		column("low", "Low", "points", pts).column("high", "High", "points", pts)
	low, high := num(100*d.Low), num(100*d.High)
	if q.explains(d, s) {
		low.Formula, high.Formula = limitFormulas("{figures:risk:estimate}", "{figures:risk:low}", "{figures:risk:high}",
			"{figures:baseline:estimate}", "{figures:baseline:low}", "{figures:baseline:high}", "{phi}")
	}
	phi := num(q.phi())
	phi.Formula = phiFormula("{both}", "{only_with}", "{only_without}", "{neither}")
	point := 100 * (q.onlyThis - q.onlyOther) / float64(d.Of)
	b.row("added", map[string]Cell{
		"both":      num(q.both).by("{figures:risk:count}-{only_with}", q.both),
		"only_with": num(q.onlyThis), "only_without": num(q.onlyOther),
		"neither": num(q.neither).by(cellReplicates+"-{both}-{only_with}-{only_without}", q.neither),
		"phi":     phi, "low": low, "high": high,
		"estimate": num(100*d.Estimate).by("({only_with}-{only_without})/"+cellReplicates+"*100", point),
	})
	return b.t
}

// substepsTable says how far sub-steps may shift the answer of a flow case.
func substepsTable(a *pva.Assessment) *Table {
	u := a.Substeps
	if u == nil {
		return nil
	}
	b := newTable("substeps", "Sub-steps of the "+a.Case.TimeUnit).column("what", "", "", Format{}).column("value", "Value", "", Format{Kind: Small, Digits: 1})
	if u.Substeps == 0 {
		b.t.Note = "Every birth and death was simulated as an event of its own: there is no error of this kind."
		b.row("substeps", map[string]Cell{"what": text("Sub-steps a " + a.Case.TimeUnit), "value": text("none")})
		return b.t
	}
	b.t.Note = "Rates are frozen within a sub-step. The bound on a probability follows from the two shifts by Pinsker's inequality over the horizon, and is usually generous."
	b.row("substeps", map[string]Cell{"what": text("Sub-steps a " + a.Case.TimeUnit), "value": num(float64(u.Substeps)).as(Counts, 0)})
	b.row("events", map[string]Cell{"what": text("Event by event while N is below"), "value": num(u.EventsBelow).as(Counts, 0)})
	b.row("log_growth", map[string]Cell{"what": text("Shift of mean log growth a " + a.Case.TimeUnit + ", at most"), "value": num(u.LogGrowth)})
	b.row("variance", map[string]Cell{"what": text("Relative shift of its variance, at most"), "value": num(u.Variance)})
	b.row("bound", map[string]Cell{"what": text("Shift of any probability, at most"), "value": num(u.RiskBound)})
	return b.t
}

func notChecked(a *pva.Assessment) []Paragraph {
	var out []Paragraph
	add := func(s string) { out = append(out, Paragraph{Text: s}) }
	add("Whether the inputs are right: the checks compare one calculation with another, not with the population.")
	add("Whether the structure is right: crowding, the laws of the young and the order of the " + a.Case.TimeUnit + " are taken as stated (see Model).")
	if exactAnswer(a.Exact) == nil && a.Uncertainty == nil { // of draws, the sheet about them says it
		why := "none was computed (--no-exact, or an interrupted run)"
		if a.Exact != nil {
			why = a.Exact.Reason
		}
		add("The risk against an exact answer: " + why + ".")
	}
	if a.Outcome.Capped > 0 {
		add("At-most-one young had a mean above one and was capped " + counted(a.Outcome.Capped, "time") + "; the births are lower than stated in those " + a.Case.TimeUnit + "s.")
	}
	if math.IsNaN(a.Outcome.MeanLogGrowth) {
		add("Mean log growth: no two consecutive censuses of a replicate that had not fallen.")
	}
	return out
}
