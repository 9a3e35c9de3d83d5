package reports

import (
	"fmt"
	"math"
	"slices"

	"ebbline/pva"
	"ebbline/pva/sweep"
)

// The names of the parts of a sweep's report.
const (
	PartHarvest = "Harvest"
	PartGrid    = "Grid"
	PartMinimum = "Minimum size"
)

// BuildSweep states a sweep as a report: what was found, every cell, and all
// that is needed to run it again. The search may be nil where none was made. A
// sweep of which nothing is complete is a bug of the caller and panics.
func BuildSweep(s *sweep.Result, largest *sweep.Crossing, meta Meta) *Report {
	if s.Case == nil {
		panic("reports: a sweep of which nothing is complete")
	}
	c := s.Study.Base
	r := sweepReport(s.Study, meta, s.Case.Risk, s.Case.Verdict, s.Case.Replicates, s.Warnings(largest))
	r.Numbers = sweepNumbers(s, largest)
	z := newScores(c.Question.Confidence)
	limit := math.NaN()
	if c.Question.Limit.Set {
		limit = c.Question.Limit.Value
		r.VerdictText = "The case as stated: " + verdictOn(s.Case.Verdict, limit) + "." + largestText(largest)
	}
	if largest != nil {
		r.Head, r.HeadBeside = crossingHead(largest, "the largest "+largest.Key+" within the limit")
	}
	answer := sweepAnswer(r, s.Case, limit, z)
	var parts []Part
	switch {
	case s.Study.Kind != sweep.Grid:
		parts = append(parts, mattersPart(s, z))
	case s.Study.SweepsTake():
		parts = append(parts, gridPart(PartHarvest, s, largest, z))
	default:
		parts = append(parts, gridPart(PartGrid, s, largest, z))
	}
	if largest != nil && len(largest.Points) > 0 {
		parts[0].Tables = append(parts[0].Tables, traceTable(largest, "The search for the largest value within the limit"))
	}
	for _, p := range parts {
		if len(p.Charts) > 0 && len(answer.Charts) < 2 {
			answer.Charts = append(answer.Charts, p.Charts[0])
		}
	}
	r.Parts = append([]Part{answer}, append(parts, closingParts(c, r, meta)...)...)
	return r
}

// BuildMinimum states a minimum viable size as a report.
func BuildMinimum(s *sweep.Study, q *sweep.Sizes, l *sweep.Crossing, meta Meta) *Report {
	c := s.Base
	at := l.At()
	r := sweepReport(s, meta, at.Risk, at.Verdict, at.Risk.Of, l.Warnings(s))
	r.Question = fmt.Sprintf("What is the smallest %s whose risk of falling to %s or fewer %s within %s is at most %s?", sizeWords(q), Plain(c.Question.Threshold), c.Counts,
		counted(int64(q.Horizon), c.TimeUnit), percentOf(q.Risk))
	r.Figures[0].Label = "the risk at " + Plain(at.Value)
	r.VerdictText = minimumText(q, l)
	r.Head, r.HeadBeside = crossingHead(l, "the smallest viable "+sizeWords(q)+", "+c.Counts)
	r.Replicates, r.Asked = c.Run.Replicates, c.Run.Replicates
	r.Numbers = crossingNumbers(l, "smallest viable "+sizeWords(q))
	z := newScores(c.Question.Confidence)
	answer := figuresOf(r, at.Risk, q.Risk, "Largest risk that counts as viable", z)
	part := Part{Name: PartMinimum, Lead: "The sizes that were looked at, and the risk at each. Intervals hold however often one looks (confidence sequence; Robbins 1970, Howard et al. 2021).",
		Tables: []*Table{settingsOf(c, z), traceTable(l, "")}}
	part.Charts = []Chart{traceChart(l, "Risk by size", "Size", q.Risk)}
	answer.Charts = part.Charts
	r.Parts = append([]Part{answer, part}, closingParts(c, r, meta)...)
	return r
}

// sweepReport is what every report of this kind begins with.
func sweepReport(s *sweep.Study, meta Meta, risk pva.Proportion, v pva.Verdict, replicates int64, warnings []pva.Warning) *Report {
	c := s.Base
	r := &Report{Meta: meta, Title: titleOf(c, meta.CaseFile), Prepared: c.Prepared, Purpose: c.Purpose, Question: Question(c), Digest: c.Digest(), Seed: c.Run.Seed,
		Replicates: replicates, Asked: replicates, Confidence: c.Question.Confidence, Verdict: v, Provenance: provenance(InputsTable(c))}
	r.methods = []string{wilson1927, newcombe, robbins, howard} // of the grid, and of the search
	f := proportionFigure("risk", "the case as stated", risk)
	f.Note = percentOf(c.Question.Confidence) + " interval, " + counted(risk.Of, "replicate")
	if risk.Of == 0 {
		f.Note, f.Interval, f.Beside, f.HasInterval = "by the exact answer", "", "", false
	}
	r.Figures = []Figure{f}
	r.ShortCautions, r.Cautions = SweepCautions(c)
	for _, w := range warnings {
		r.Warnings = append(r.Warnings, w.String())
	}
	return r
}

// SweepCautions are the cautions of a sweep: of the case at its stated values,
// as uncertain inputs are not drawn.
func SweepCautions(c *pva.Case) (short, long []Caution) {
	stated := *c
	stated.Uncertain, stated.UncertainPair = nil, nil
	return Cautions(&stated)
}

func closingParts(c *pva.Case, r *Report, meta Meta) []Part {
	return []Part{{Name: PartInputs, Bare: true, Tables: []*Table{InputsTable(c)}, Lead: "Every number and word in force, and what it rests on."},
		modelPart(c, meta), cautionsPart(c, r), rerunPart(r)}
}

// settingsOf holds what every interval of the report uses.
func settingsOf(c *pva.Case, z scores) *Table {
	b := newTable("settings", "").column("replicates", "Replicates", "", Format{Kind: Counts}).
		column("confidence", "Confidence", "", Format{Percents, PercentDecimals(z.confidence)}).column("z", "Normal quantile z", "", Format{Decimal, 6}).
		column("threshold", "Threshold", "", Format{Kind: General})
	b.row("run", map[string]Cell{"replicates": num(float64(c.Run.Replicates)), "confidence": num(z.confidence), "z": num(z.z).by("NORMSINV((1+{confidence})/2)", z.z), "threshold": num(c.Question.Threshold)})
	return b.t
}

// sweepAnswer is the first page: the case as stated, and what was found.
func sweepAnswer(r *Report, o *sweep.Outcome, limit float64, z scores) Part {
	return figuresOf(r, o.Risk, limit, "The permit's limit", z)
}

// figuresOf is the first page around one risk.
func figuresOf(r *Report, risk pva.Proportion, limit float64, of string, z scores) Part {
	b := newTable("figures", "The risk").column("label", "", "", Format{}).column("estimate", "Risk", "", Format{Percents, tableDigits(max(1, risk.Of))}).
		column("low", "Low", "", Format{Percents, tableDigits(max(1, risk.Of))}).column("high", "High", "", Format{Percents, tableDigits(max(1, risk.Of))}).
		column("count", "Count", "", Format{Kind: Counts}).column("of", "Of", "", Format{Kind: Counts}).wide("note", "")
	cells := map[string]Cell{"label": text(sentence(r.Figures[0].Label)), "note": text(sentence(r.Figures[0].Note))}
	if risk.Of > 0 {
		z.proportion(cells, risk, "count", "estimate", "low", "high", "{of}")
		cells["of"] = num(float64(risk.Of))
	} else {
		cells["estimate"], cells["low"], cells["high"] = num(risk.Estimate).as(Percents, 3), num(risk.Low).as(Percents, 3), num(risk.High).as(Percents, 3)
	}
	b.row("risk", cells)
	if !math.IsNaN(limit) {
		b.row("limit", map[string]Cell{"label": text(of), "estimate": num(limit).as(Percents, PercentDecimals(limit))})
	}
	return Part{Name: PartAnswer, Lead: r.Question, Tables: []*Table{b.t, numbersTable(r.Numbers)}}
}

// sweepNumbers are what a sweep found.
func sweepNumbers(s *sweep.Result, largest *sweep.Crossing) []Number {
	if largest != nil {
		return append(crossingNumbers(largest, "largest "+largest.Key+" within the limit"),
			Number{ID: "cells", Label: "cells of the grid", Value: float64(s.Complete), Format: Format{Kind: Counts}})
	}
	d := sweep.DoubtsOf(s)
	n := d.Replicates.Of
	out := []Number{{ID: "replicates_span", Label: "the risk by its replicates", Value: math.NaN(), Text: PercentRange(d.Replicates.Low, d.Replicates.High, n), Note: "interval of the case as stated"}}
	if d.Inputs.Cells > 0 {
		out = append(out, Number{ID: "inputs_span", Label: "the risk by its inputs, one at a time", Value: math.NaN(), Text: PercentRange(d.Inputs.Low, d.Inputs.High, n), Note: d.Inputs.LowBy + " to " + d.Inputs.HighBy})
	}
	if d.Forms.Cells > 0 {
		out = append(out, Number{ID: "forms_span", Label: "the risk by the form of the model", Value: math.NaN(), Text: PercentRange(d.Forms.Low, d.Forms.High, n), Note: d.Forms.LowBy + " to " + d.Forms.HighBy})
	}
	return out
}

// crossingNumbers are a search's answer and the stretch left undecided.
func crossingNumbers(l *sweep.Crossing, label string) []Number {
	f := Format{Kind: Counts}
	if !l.Whole {
		f = Format{Kind: General}
		if width := l.High() - l.Low(); width > 0 { // two digits of the stretch left undecided
			f = Format{Decimal, max(0, min(8, 1-int(math.Floor(math.Log10(width)))))}
		}
	}
	value := Number{ID: "value", Label: label, Value: l.Value, Format: f, Note: l.Reason}
	if !l.Found {
		value.Value, value.Text = math.NaN(), "none"
	}
	if l.Found {
		value.Text = f.Show(l.Value)
	}
	ends := Number{ID: "undecided", Label: "values left undecided at " + percentOf(l.Confidence), Value: math.NaN()}
	low, high := l.Undecided()
	show := func(v float64, open string) string {
		if math.IsNaN(v) {
			return open
		}
		return f.Show(v)
	}
	ends.Text = show(low, "the smallest") + " to " + show(high, "the largest")
	switch {
	case (math.IsNaN(low) || math.IsNaN(high)) && l.Settled():
		ends.Text, ends.Note = "none", "of those looked at"
	case l.Low() == l.High():
		ends.Text = "none"
		ends.Note = "every value on one side is shown within the limit, every one on the other above it"
	}
	return []Number{value, ends}
}

// largestText is a search's answer as one more sentence; "" without a search.
func largestText(l *sweep.Crossing) string {
	switch {
	case l == nil:
		return ""
	case !l.Found:
		return " There is no largest value: " + l.Reason + "."
	}
	n := crossingNumbers(l, "")
	s := " The largest " + l.Key + " within it is " + n[0].Text
	if l.Verdict == pva.Undecided {
		s = " The largest " + l.Key + " estimated to be within it is " + n[0].Text + ", which is not shown"
	}
	if n[1].Text != "none" {
		s += "; undecided are " + n[1].Text
	}
	return s + "."
}

// verdictOn joins a verdict and its limit.
func verdictOn(v pva.Verdict, limit float64) string {
	if v == pva.Undecided {
		return string(v) + " against the limit of " + percentOf(limit)
	}
	return string(v) + " of " + percentOf(limit)
}

func sizeWords(q *sweep.Sizes) string {
	switch q.Vary {
	case "capacity":
		return "carrying capacity"
	case "both":
		return "start (the capacity in proportion)"
	}
	return "start"
}

// crossingHead is the large figure of a search: its answer, and the stretch in
// which the verdict is undecided.
func crossingHead(l *sweep.Crossing, what string) (head, beside string) {
	if !l.Found {
		return "none", what
	}
	if n := crossingNumbers(l, ""); n[1].Text != "none" {
		what += "; undecided: " + n[1].Text
	}
	return Plain(l.Value), what
}

func minimumText(q *sweep.Sizes, l *sweep.Crossing) string {
	if !l.Found {
		return "No minimum: " + l.Reason + "."
	}
	s := "The smallest viable " + sizeWords(q) + " is " + Plain(l.Value)
	if l.Verdict == pva.Undecided {
		s = "The smallest " + sizeWords(q) + " estimated to be viable is " + Plain(l.Value) + ", which is not shown"
	}
	if n := crossingNumbers(l, ""); n[1].Text != "none" {
		s += "; undecided are " + n[1].Text
	}
	s += "."
	if l.Reason != "" {
		s += " " + sentence(l.Reason) + "."
	}
	return s
}

// traceTable is the values that a search looked at.
func traceTable(l *sweep.Crossing, title string) *Table {
	n := int64(1000)
	for _, p := range l.Points {
		n = max(n, p.Risk.Of)
	}
	pct := Format{Percents, tableDigits(n)}
	b := newTable("trace", title).column("value", sentence(l.Key), l.Unit, Format{Kind: General}).column("estimate", "Risk", "", pct).column("low", "Low", "", pct).column("high", "High", "", pct).
		column("count", "Fallen", "replicates", Format{Kind: Counts}).column("of", "Of", "replicates", Format{Kind: Counts}).column("verdict", "Verdict", "", Format{}).column("rests", "Rests on", "", Format{})
	for i, p := range l.Points {
		cells := map[string]Cell{"value": num(p.Value), "verdict": text(string(p.Verdict)), "rests": text("replicates")}
		if p.Unreachable == "" {
			cells["estimate"], cells["low"], cells["high"] = num(p.Risk.Estimate), num(p.Risk.Low), num(p.Risk.High)
		}
		switch {
		case p.Unreachable != "":
			cells["verdict"], cells["rests"] = text("not viable"), text(p.Unreachable)
		case p.Exact != nil:
			cells["rests"] = text("exact answer")
		default:
			cells["count"], cells["of"] = num(float64(p.Risk.Count)), num(float64(p.Risk.Of))
			cells["estimate"] = cells["estimate"].by("{count}/{of}", float64(p.Risk.Count)/float64(p.Risk.Of))
		}
		b.row("point_"+yearID(i+1), cells)
	}
	return b.t
}

func traceChart(l *sweep.Crossing, title, axis string, limit float64) Chart {
	ch := Chart{ID: "trace", Title: title, XTitle: axis + " (as looked at)", YTitle: "Risk", Table: "trace", X: "value", Percent: true,
		Series: []Series{{Name: percentOf(l.Confidence) + " interval", Role: Band, Low: "low", High: "high"}, {Name: "Risk", Role: Main, Value: "estimate"}}}
	if !math.IsNaN(limit) {
		ch.Series = append(ch.Series, Series{Name: "Limit, " + percentOf(limit), Role: LimitLine, Constant: "{figures:limit:estimate}", Level: limit})
	}
	known := slices.DeleteFunc(slices.Clone(l.Points), func(p *sweep.Point) bool { return p.Unreachable != "" })
	first, last := known[0], known[len(known)-1]
	ch.Alt = "Line with an interval band: the risk is " + Percent(first.Risk.Estimate, first.Risk.Of) + " at " + Plain(first.Value) + " and " + Percent(last.Risk.Estimate, last.Risk.Of) + " at " + Plain(last.Value) + "."
	return ch
}
