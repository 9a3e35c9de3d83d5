package reports

import (
	"slices"
	"strconv"
	"strings"

	"ebbline/pva/sweep"
)

// gridPart is every cell of a grid, with the trade-off of yield against risk and
// a map of the risk over two keys.
func gridPart(name string, s *sweep.Result, largest *sweep.Crossing, z scores) Part {
	c := s.Study.Base
	p := Part{Name: name, Lead: "Every cell of the grid on the same replicates, so that differences between rows are sharper than their intervals suggest. Estimates are count / replicates, intervals Wilson's (1927)."}
	p.Tables = append(p.Tables, settingsOf(c, z), cellsTable(s, z))
	dims := s.Study.Dimensions
	if len(dims) == 1 {
		p.Charts = append(p.Charts, cellsChart(s))
	}
	if len(dims) == 2 && len(dims[1].Values) <= 60 && s.Whole() {
		p.Tables = append(p.Tables, mapTable(s))
	}
	if t := tradeOffTable(s); t != nil {
		p.Tables = append(p.Tables, t)
		p.Charts = append(p.Charts, tradeOffChart(s, t))
	}
	if largest != nil && !largest.Found {
		p.Sections = append(p.Sections, Section{Heading: "No largest value", Paragraphs: []Paragraph{{Text: sentence(largest.Reason) + "."}}})
	}
	return p
}

// cellsTable is one row a cell.
func cellsTable(s *sweep.Result, z scores) *Table {
	c := s.Study.Base
	pct, cnt, dec := Format{Percents, tableDigits(s.Replicates)}, Format{Kind: Counts}, Format{Decimal, 2}
	b := newTable("cells", "")
	b.t.Main = true
	for d, dim := range s.Study.Dimensions {
		b.column("key_"+yearID(d+1), dim.Key, dim.Unit, Format{Kind: General})
	}
	b.column("count", "Fallen", "replicates", cnt).column("estimate", "Risk", "", pct).column("low", "Low", "", pct).column("high", "High", "", pct)
	based := false
	for _, o := range s.Cells {
		based = based || o != nil && o.Baseline != nil
	}
	if based {
		b.column("base", "Risk without the take", "", pct).column("added", "The take adds", "points", Format{Points, pct.Digits}).
			column("added_low", "Low", "points", Format{Points, pct.Digits}).column("added_high", "High", "points", Format{Points, pct.Digits})
	}
	_, takes := c.Takes()
	if takes {
		b.column("taken", "Taken a "+c.TimeUnit, c.Counts, dec).column("shortfall", "Wanted and not there a "+c.TimeUnit, c.Counts, dec).column("closed", "Closed "+c.TimeUnit+"s", "", dec)
	}
	b.column("extinct", "None left at the end", "", pct).column("smallest", "Smallest count, mean", c.Counts, Format{Decimal, 1}).column("last", "Count at the end, mean", c.Counts, Format{Decimal, 1})
	if c.Question.Limit.Set {
		b.column("verdict", "Verdict", "", Format{})
	}
	if takes {
		b.column("best", "Not beaten", "", Format{})
	}
	for i, o := range s.Cells {
		if o == nil {
			continue
		}
		cells := map[string]Cell{"taken": num(o.TakeMean), "shortfall": num(o.ShortfallMean), "closed": num(o.ClosedYears), "extinct": num(o.Extinction.Estimate),
			"smallest": num(o.SmallestMean), "last": num(o.LastMean), "verdict": text(string(o.Verdict))}
		for d, v := range o.Values {
			cells["key_"+yearID(d+1)] = num(v)
		}
		z.proportion(cells, o.Risk, "count", "estimate", "low", "high", cellReplicates)
		if o.Baseline != nil {
			cells["base"], cells["added"] = num(o.Baseline.Estimate), num(100*o.Added.Estimate)
			cells["added"] = cells["added"].by("({estimate}-{base})*100", 100*(o.Risk.Estimate-o.Baseline.Estimate))
			cells["added_low"], cells["added_high"] = num(100*o.Added.Low), num(100*o.Added.High)
		}
		if o.Best {
			cells["best"] = text("yes")
		}
		b.row("cell_"+yearID(i+1), cells)
	}
	if takes {
		b.t.Note = "Not beaten: no other cell takes as much at less risk, or more at no more risk."
	}
	return b.t
}

// cellsChart is the risk along the one key of a grid.
func cellsChart(s *sweep.Result) Chart {
	c, dim := s.Study.Base, s.Study.Dimensions[0]
	ch := Chart{ID: "cells", Title: "Risk by " + dim.Key, XTitle: dim.Key, YTitle: "Risk", Table: "cells", X: "key_1", Percent: true,
		Series: []Series{{Name: percentOf(c.Question.Confidence) + " interval", Role: Band, Low: "low", High: "high"}, {Name: "Risk", Role: Main, Value: "estimate"}}}
	if l := c.Question.Limit; l.Set {
		ch.Series = append(ch.Series, Series{Name: "Limit, " + percentOf(l.Value), Role: LimitLine, Constant: cellLimit, Level: l.Value})
	}
	first, last := firstAndLast(s.Cells)
	if first.Baseline != nil {
		ch.Series = append(ch.Series, Series{Name: "Without the take", Role: Compared, Value: "base"})
	}
	ch.Alt = "Line with an interval band: the risk is " + Percent(first.Risk.Estimate, first.Risk.Of) + " at " + Plain(first.Values[0]) + " and " +
		Percent(last.Risk.Estimate, last.Risk.Of) + " at " + Plain(last.Values[0]) + "."
	return ch
}

func firstAndLast(cells []*sweep.Outcome) (first, last *sweep.Outcome) {
	for _, o := range cells {
		if o != nil {
			if first == nil {
				first = o
			}
			last = o
		}
	}
	return first, last
}

// mapTable is the risk over two keys: a row a value of the first, a column a
// value of the second.
func mapTable(s *sweep.Result) *Table {
	rows, columns := s.Study.Dimensions[0], s.Study.Dimensions[1]
	b := newTable("risk_map", "Risk by "+rows.Key+" (down) and "+columns.Key+" (across)").column("row", rows.Key, rows.Unit, Format{Kind: General})
	for j, v := range columns.Values {
		b.column("column_"+yearID(j+1), Plain(v), "", Format{Percents, tableDigits(s.Replicates)})
	}
	for i, v := range rows.Values {
		cells := map[string]Cell{"row": num(v)}
		for j := range columns.Values {
			cells["column_"+yearID(j+1)] = num(s.Cells[i*len(columns.Values)+j].Risk.Estimate)
		}
		b.row("row_"+yearID(i+1), cells)
	}
	b.t.Shaded = true
	return b.t
}

// tradeOffTable is the cells that no other beats, by rising take; nil where
// nothing is taken.
func tradeOffTable(s *sweep.Result) *Table {
	var best []*sweep.Outcome
	for _, o := range s.Cells {
		if o != nil && o.Best {
			best = append(best, o)
		}
	}
	if len(best) < 2 {
		return nil
	}
	slices.SortFunc(best, func(a, b *sweep.Outcome) int {
		if a.TakeMean < b.TakeMean {
			return -1
		}
		return 1
	})
	c := s.Study.Base
	pct := Format{Percents, tableDigits(s.Replicates)}
	b := newTable("trade_off", "Yield against risk: the cells that no other beats").column("taken", "Taken a "+c.TimeUnit, c.Counts, Format{Decimal, 2})
	b.column("estimate", "Risk", "", pct).column("low", "Low", "", pct).column("high", "High", "", pct)
	for d, dim := range s.Study.Dimensions {
		b.column("key_"+yearID(d+1), dim.Key, dim.Unit, Format{Kind: General})
	}
	for i, o := range best {
		// Rounded, because the labels of a chart show a number whole; every cell's
		// take stands unrounded in the table of all cells.
		cells := map[string]Cell{"taken": num(rounded(o.TakeMean, 4)), "estimate": num(o.Risk.Estimate), "low": num(o.Risk.Low), "high": num(o.Risk.High)}
		for d, v := range o.Values {
			cells["key_"+yearID(d+1)] = num(v)
		}
		b.row("best_"+yearID(i+1), cells)
	}
	return b.t
}

func tradeOffChart(s *sweep.Result, t *Table) Chart {
	c := s.Study.Base
	end := len(t.Rows) - 1
	var keys []string
	for d, dim := range s.Study.Dimensions {
		keys = append(keys, dim.Key+" = "+t.Shown(end, 4+d))
	}
	ch := Chart{ID: "trade_off", Title: "Yield against risk", XTitle: "Taken a " + c.TimeUnit, YTitle: "Risk", Table: "trade_off", X: "taken", Percent: true,
		Series: []Series{{Name: percentOf(c.Question.Confidence) + " interval", Role: Band, Low: "low", High: "high"}, {Name: "Risk", Role: Main, Value: "estimate"}},
		Alt:    "Line: the least risk for each yield; the largest yield, " + t.Shown(end, 0) + " a " + c.TimeUnit + ", carries a risk of " + t.Shown(end, 1) + " (" + strings.Join(keys, ", ") + ")."}
	if l := c.Question.Limit; l.Set {
		ch.Series = append(ch.Series, Series{Name: "Limit, " + percentOf(l.Value), Role: LimitLine, Constant: cellLimit, Level: l.Value})
	}
	return ch
}

// rounded is a number to so many significant digits.
func rounded(v float64, digits int) float64 {
	r, err := strconv.ParseFloat(strconv.FormatFloat(v, 'g', digits, 64), 64)
	if err != nil {
		return v
	}
	return r
}

// mattersPart is which inputs move the risk most, and what other forms of the
// model give.
func mattersPart(s *sweep.Result, z scores) Part {
	p := Part{Name: PartDrivers, Lead: "Three sources of doubt, three numbers: chance in the replicates, the inputs (each changed alone), and the form of the model (same growth of few, same capacity)."}
	p.Tables = append(p.Tables, settingsOf(s.Study.Base, z), doubtsTable(s))
	if order := sweep.Influences(s); len(order) > 0 {
		top := min(len(order), mostInfluences)
		p.Tables = append(p.Tables, influenceTable("influences", "What moves the risk most", order[:top], s))
		if top < len(order) {
			p.Tables = append(p.Tables, influenceTable("influences_rest", "What moves it less", order[top:], s))
		}
		p.Charts = append(p.Charts, influenceChart(order, s))
	}
	if t := formsTable(s, z); t != nil {
		p.Tables = append(p.Tables, t)
	}
	if len(s.Study.Left) > 0 {
		sec := Section{Heading: "Not varied"}
		for _, l := range s.Study.Left {
			sec.Paragraphs = append(sec.Paragraphs, Paragraph{Text: l.What + ": " + l.Reason + "."})
		}
		p.Sections = append(p.Sections, sec)
	}
	return p
}

func doubtsTable(s *sweep.Result) *Table {
	d := sweep.DoubtsOf(s)
	pct := Format{Percents, tableDigits(s.Replicates)}
	b := newTable("doubts", "").column("source", "Source of doubt", "", Format{}).column("low", "Lowest risk", "", pct).column("high", "Highest risk", "", pct).column("cells", "Variants", "", Format{Kind: Counts})
	b.row("replicates", map[string]Cell{"source": text("Replicates"), "low": num(d.Replicates.Low), "high": num(d.Replicates.High)})
	b.t.Note = "Replicates: the interval of the case as stated."
	add := func(id, name string, span sweep.Span) {
		if span.Cells > 0 {
			b.row(id, map[string]Cell{"source": text(name), "low": num(span.Low), "high": num(span.High), "cells": num(float64(span.Cells))})
			b.t.Note += " " + name + ": lowest by " + span.LowBy + ", highest by " + span.HighBy + "."
		}
	}
	add("inputs", "Inputs, one at a time", d.Inputs)
	add("forms", "Other forms of the model", d.Forms)
	return b.t
}

// mostInfluences is how many inputs a chart can show.
const mostInfluences = 12

func influenceTable(id, title string, order []sweep.Influence, s *sweep.Result) *Table {
	pct := Format{Percents, tableDigits(s.Replicates)}
	pts := Format{Points, pct.Digits}
	b := newTable(id, title).column("key", "Input", "", Format{}).column("value", "In the case", "", Format{Kind: General}).
		column("less", "Less", "", Format{Kind: General}).column("less_risk", "Risk", "", pct).column("less_difference", "Difference", "points", pts).
		column("more", "More", "", Format{Kind: General}).column("more_risk", "Risk", "", pct).column("more_difference", "Difference", "points", pts).
		column("span", "Span", "points", pts)
	b.t.Main = id == "influences"
	for i, in := range order {
		cells := map[string]Cell{"key": text(in.Key), "value": num(in.Value), "span": num(100 * in.Span)}
		if in.Less != nil {
			cells["less"], cells["less_risk"], cells["less_difference"] = num(in.LessTo), num(in.Less.Risk.Estimate), num(100*in.Less.Difference.Estimate)
		}
		if in.More != nil {
			cells["more"], cells["more_risk"], cells["more_difference"] = num(in.MoreTo), num(in.More.Risk.Estimate), num(100*in.More.Difference.Estimate)
		}
		b.row("input_"+yearID(i+1), cells)
	}
	return b.t
}

func influenceChart(order []sweep.Influence, s *sweep.Result) Chart {
	ch := Chart{ID: "influences", Title: "What moves the risk most", YTitle: "Risk less that of the case, percentage points", Table: "influences", X: "key", Bars: true, Across: true,
		Series: []Series{{Name: "With less", Role: Compared, Value: "less_difference"}, {Name: "With more", Role: Main, Value: "more_difference"}}}
	ch.Alt = "Bars to the left and right of the case's risk: what it changes by with less and with more of each input; the most by " + order[0].Key + ", " + PointsText(order[0].Span, s.Replicates) + " points."
	return ch
}

// formsTable is the risk under the other forms; nil where none was tried.
func formsTable(s *sweep.Result, z scores) *Table {
	c := s.Study.Base
	pct := Format{Percents, tableDigits(s.Replicates)}
	b := newTable("forms", "Other forms of the model").wide("form", "Form").column("count", "Fallen", "replicates", Format{Kind: Counts}).column("estimate", "Risk", "", pct).
		column("low", "Low", "", pct).column("high", "High", "", pct).column("difference", "Difference from the case", "points", Format{Points, pct.Digits})
	if c.Question.Limit.Set {
		b.column("verdict", "Verdict", "", Format{})
	}
	row := func(id, name string, o *sweep.Outcome) {
		cells := map[string]Cell{"form": text(sentence(name)), "difference": num(100 * o.Difference.Estimate), "verdict": text(string(o.Verdict))}
		z.proportion(cells, o.Risk, "count", "estimate", "low", "high", cellReplicates)
		b.row(id, cells)
	}
	any := false
	row("case", "the case as stated", s.Case)
	for i, ch := range s.Study.Changes {
		if ch.Kind == sweep.Structures && s.Cells[i] != nil {
			any = true
			row("form_"+yearID(i+1), ch.Name, s.Cells[i])
		}
	}
	if !any {
		return nil
	}
	return b.t
}
