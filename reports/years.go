package reports

import (
	"math"

	"ebbline/pva"
)

// settingsTable holds what every interval of the report uses.
func settingsTable(a *pva.Assessment, s scores) *Table {
	b := newTable("settings", "").
		column("replicates", "Replicates", "", Format{Kind: Counts}).
		column("confidence", "Confidence", "", Format{Percents, PercentDecimals(s.confidence)}).
		column("z", "Normal quantile z", "", Format{Decimal, 6}).
		column("threshold", "Threshold", "", Format{Kind: General})
	b.row("run", map[string]Cell{
		"replicates": num(float64(a.Outcome.Replicates)),
		"confidence": num(s.confidence),
		"z":          num(s.z).by("NORMSINV((1+{confidence})/2)", s.z),
		"threshold":  num(a.Case.Question.Threshold),
	})
	return b.t
}

// riskPart is the risk year by year, with the counts it is made of.
func riskPart(a *pva.Assessment, s scores) Part {
	c := a.Case
	return Part{
		Name: PartRisk,
		Lead: "Fallen: the share of replicates with " + fallenCount(c) + " at that or an earlier census. None left: no " + c.Counts +
			" at that very census. Estimates are count / replicates, intervals " + intervalsOf(a) + ".",
		Tables: []*Table{settingsTable(a, s), yearsTable(a, s)},
	}
}

// intervalsOf names the method behind the intervals of probabilities.
func intervalsOf(a *pva.Assessment) string {
	if a.Uncertainty != nil {
		return "between draws, by betting (Waudby-Smith & Ramdas 2024)"
	}
	if a.Sequential {
		return "those of confidence sequences, which hold at every look (Robbins 1970, Howard et al. 2021)"
	}
	return "Wilson's (1927)"
}

func yearsTable(a *pva.Assessment, s scores) *Table {
	c, o := a.Case, a.Outcome
	pct := Format{Percents, tableDigits(o.Replicates)}
	cnt := Format{Kind: Counts}
	b := newTable("years", "")
	b.t.Main = true
	b.column("date", axisYear(c), "", Format{Kind: Dates}).
		column("fallen_count", "Fallen by then", "replicates", cnt).column("fallen", "Risk", "", pct).column("low", "Low", "", pct).column("high", "High", "", pct).
		column("newly", "Fallen in the "+c.TimeUnit, "", pct).
		column("extinct_count", "None left", "replicates", cnt).column("extinct", "Chance", "", pct).column("extinct_low", "Low", "", pct).column("extinct_high", "High", "", pct)
	exact, baseExact := exactYears(a.Exact, c), exactYears(a.BaselineExact, c)
	if exact != nil {
		b.column("exact", "Exact risk", "", Format{Percents, 3})
	}
	if a.Baseline != nil {
		b.column("base_count", "Fallen without the take", "replicates", cnt).column("base", "Risk without", "", pct).column("base_low", "Low", "", pct).column("base_high", "High", "", pct)
		if baseExact != nil {
			b.column("base_exact", "Exact without", "", Format{Percents, 3})
		}
		b.column("added", "The take adds", "points", Format{Points, pct.Digits})
	}
	if o.Outgrown > 0 {
		b.column("outgrown", "Outgrown by then", "replicates", cnt)
	}
	before := int64(0)
	for i, y := range o.Years {
		cells := map[string]Cell{"date": num(float64(y.Label)), "outgrown": num(float64(y.Outgrown))}
		s.proportion(cells, y.Fallen, "fallen_count", "fallen", "low", "high", cellReplicates)
		s.proportion(cells, y.Extinct, "extinct_count", "extinct", "extinct_low", "extinct_high", cellReplicates)
		newly := float64(y.Fallen.Count-before) / float64(o.Replicates)
		cells["newly"] = num(newly)
		cells["newly"] = cells["newly"].by(newlyFormula(i), newly)
		before = y.Fallen.Count
		if exact != nil {
			cells["exact"] = num(exact[i])
		}
		if a.Baseline != nil {
			base := a.Baseline.Years[i].Fallen
			s.proportion(cells, base, "base_count", "base", "base_low", "base_high", cellReplicates)
			d := 100 * (y.Fallen.Estimate - base.Estimate)
			cells["added"] = num(d).by("({fallen}-{base})*100", d)
			if baseExact != nil {
				cells["base_exact"] = num(baseExact[i])
			}
		}
		b.row(yearID(i+1), cells)
	}
	return b.t
}

func newlyFormula(i int) string {
	if i == 0 {
		return "{fallen_count}/" + cellReplicates
	}
	return "({fallen_count}-{years:" + yearID(i) + ":fallen_count})/" + cellReplicates
}

// exactYears is the exact risk of every year, nil where there is none.
func exactYears(e *pva.ExactAnswer, c *pva.Case) []float64 {
	if exactAnswer(e) == nil || len(e.Fallen) != c.Question.Horizon {
		return nil
	}
	return e.Fallen
}

// lowestPart is when replicates fall and how low each got. It stands apart from
// the tables by year, so that a page's repeated heading is always the right one.
func lowestPart(a *pva.Assessment, s scores) Part {
	return Part{Name: PartLowest,
		Lead: "The time to fall is over all replicates, so that a share may not be reached within the horizon. The smallest count is the lowest census of a replicate; its mean over replicates, " +
			Significant(a.Outcome.SmallestMean, 4) + ", is the expected minimum abundance (McCarthy & Thompson 2001).",
		Tables: []*Table{fallTable(a), smallestTable(a, s)}, Charts: []Chart{fallChart(a)}}
}

// fallTable is the time to fall in quartiles of all replicates.
func fallTable(a *pva.Assessment) *Table {
	c, o := a.Case, a.Outcome
	b := newTable("fall_time", "Time to fall").column("share", "Share of all replicates fallen", "", Format{Percents, 0}).column("date", "By", "", Format{Kind: Dates})
	if a.Baseline != nil {
		b.column("base_date", "Without the take", "", Format{Kind: Dates})
	}
	at := func(y int) Cell {
		if y == 0 {
			return text(fallText(c, 0))
		}
		return num(float64(c.Label(y)))
	}
	quartiles := func(o *pva.Outcome) []int { return []int{o.FallP25, o.FallP50, o.FallP75} }
	for i, y := range quartiles(o) {
		cells := map[string]Cell{"share": num(float64(i+1) / 4), "date": at(y)}
		if a.Baseline != nil {
			cells["base_date"] = at(quartiles(a.Baseline)[i])
		}
		b.row([]string{"p25", "p50", "p75"}[i], cells)
	}
	return b.t
}

// abundancePart is the count, the take and what goes with them, year by year.
func abundancePart(a *pva.Assessment) Part {
	c := a.Case
	p := Part{Name: PartAbundance,
		Lead:   "Counts of " + c.Counts + " at each census over all replicates" + outgrownWords(a.Outcome) + ". The 5 % column is the count that one replicate in twenty is at or below.",
		Tables: []*Table{abundanceTable(a)}}
	return p
}

func outgrownWords(o *pva.Outcome) string {
	if o.Outgrown == 0 {
		return ""
	}
	return "; " + counted(o.Outgrown, "replicate") + " outgrew the model: above every percentile, left out of the means"
}

func abundanceTable(a *pva.Assessment) *Table {
	c, o := a.Case, a.Outcome
	cnt, mean := Format{Kind: Counts}, Format{Decimal, 1}
	b := newTable("abundance", "")
	b.t.Main = true
	b.column("date", axisYear(c), "", Format{Kind: Dates}).column("mean", "Mean", c.Counts, mean)
	for _, p := range percentileColumns("") {
		b.column(p.key, p.head, c.Counts, cnt)
	}
	_, takes := c.Takes()
	used := usedColumns(o)
	if takes {
		b.column("take_mean", "Taken, mean", c.Counts, Format{Decimal, 2}).column("take_p05", "Taken, 5\u00a0%", c.Counts, cnt).
			column("take_p50", "Taken, median", c.Counts, cnt).column("take_p95", "Taken, 95\u00a0%", c.Counts, cnt).
			column("shortfall", "Wanted, not there", c.Counts, Format{Decimal, 2})
		if used.closed {
			b.column("closed", "Closed", "share", Format{Percents, tableDigits(o.Replicates)})
		}
	}
	if used.extra {
		b.column("extra", "Extra deaths", c.Counts, Format{Decimal, 2})
	}
	if used.stocked {
		b.column("stocked", "Added", c.Counts, Format{Decimal, 2})
	}
	if a.Baseline != nil {
		b.column("base_mean", "Mean without the take", c.Counts, mean).column("base_p50", "Median without", c.Counts, cnt)
	}
	if e := exactAnswer(a.Exact); e != nil && len(e.Mean) == len(o.Years) {
		b.column("exact_mean", "Exact mean", c.Counts, Format{Decimal, 2})
	}
	for i, y := range o.Years {
		q := y.Abundance
		cells := map[string]Cell{
			"date": num(float64(y.Label)), "mean": num(y.Mean),
			"p05": num(q.P05), "p25": num(q.P25), "p50": num(q.P50), "p75": num(q.P75), "p95": num(q.P95),
			"take_mean": num(y.TakeMean), "take_p05": num(y.Take.P05), "take_p50": num(y.Take.P50), "take_p95": num(y.Take.P95),
			"shortfall": num(y.ShortfallMean), "closed": num(y.Closed.Estimate), "extra": num(y.ExtraMean), "stocked": num(y.StockedMean),
		}
		if a.Baseline != nil {
			cells["base_mean"], cells["base_p50"] = num(a.Baseline.Years[i].Mean), num(a.Baseline.Years[i].Abundance.P50)
		}
		if e := exactAnswer(a.Exact); e != nil && len(e.Mean) == len(o.Years) {
			cells["exact_mean"] = num(e.Mean[i])
		}
		b.row(yearID(i+1), cells)
	}
	return b.t
}

type percentileColumn struct{ key, head string }

func percentileColumns(prefix string) []percentileColumn {
	return []percentileColumn{{prefix + "p05", "5\u00a0%"}, {prefix + "p25", "25\u00a0%"}, {prefix + "p50", "Median"}, {prefix + "p75", "75\u00a0%"}, {prefix + "p95", "95\u00a0%"}}
}

// used says which of the seldom columns hold anything.
type used struct{ closed, extra, stocked bool }

func usedColumns(o *pva.Outcome) used {
	var u used
	some := func(v float64) bool { return v > 0 && !math.IsNaN(v) }
	for _, y := range o.Years {
		u.closed = u.closed || y.Closed.Count > 0
		u.extra = u.extra || some(y.ExtraMean)
		u.stocked = u.stocked || some(y.StockedMean)
	}
	return u
}

// smallestTable is the law of the smallest census.
func smallestTable(a *pva.Assessment, s scores) *Table {
	o := a.Outcome
	b := newTable("smallest", "Chance of having been at or below a level at some census").
		column("level", "At or below", a.Case.Counts, Format{Kind: Counts}).column("count", "Replicates", "", Format{Kind: Counts}).
		column("estimate", "Risk", "", Format{Percents, tableDigits(o.Replicates)}).column("low", "Low", "", Format{Percents, tableDigits(o.Replicates)}).
		column("high", "High", "", Format{Percents, tableDigits(o.Replicates)})
	for _, l := range o.Smallest {
		cells := map[string]Cell{"level": num(float64(l.Level))}
		s.proportion(cells, l.Risk, "count", "estimate", "low", "high", cellReplicates)
		b.row(yearID(int(l.Level)), cells)
	}
	return b.t
}

// fallenCount is a count that makes a replicate fallen: "20 or fewer adult females".
func fallenCount(c *pva.Case) string {
	if c.Question.Threshold < 1 {
		return "no " + c.Counts
	}
	return fallenTo(c) + " " + c.Counts
}
