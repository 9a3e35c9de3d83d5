package reports

import (
	"math"
	"sort"
	"strconv"

	"ebbline/pva"
)

// The names of the parts of a case with uncertain inputs.
const (
	PartUncertainty = "Uncertainty"
	PartDraws       = "Draws"
)

// WithinText says how many of the draws have a risk within the limit: "In 83 %
// (79 to 87 %) of the draws the risk is within the limit of 10 %."; "" without a
// limit or where it cannot be said.
func WithinText(u *pva.Uncertainty, limit pva.Optional) string {
	w := u.Case.Within
	if w == nil || !limit.Set {
		return ""
	}
	return "In " + shareText(w.Estimate) + " (" + shareText(w.Low) + " to " + shareText(w.High) + ") of the draws the risk is within the limit of " + percentOf(limit.Value) + "."
}

// shareText is a share of the draws in whole percent; one that is nearly none or
// nearly all is not said to be either.
func shareText(p float64) string {
	switch {
	case p > 0 && p < 0.005:
		return "under 1 %"
	case p < 1 && p >= 0.995:
		return "over 99 %"
	}
	return strconv.FormatFloat(100*p, 'f', 0, 64) + " %"
}

// fewDraws is how many draws are too few to say how many would be enough.
const fewDraws = 20

// roughly rounds up to two digits: what it says of a number to come is no more.
func roughly(n int64) int64 {
	unit := int64(1)
	for n/unit >= 100 {
		unit *= 10
	}
	return (n + unit - 1) / unit * unit
}

// carryUncertainty says in a report's headline what its interval and verdict rest
// on where inputs are uncertain. It changes nothing of other reports.
func (r *Report) carryUncertainty(a *pva.Assessment) {
	u := a.Uncertainty
	if u == nil {
		return
	}
	risk := &r.Figures[0]
	risk.Note = percentOf(r.Confidence) + " interval between " + counted(int64(u.Draws), "draw") + " of the uncertain inputs, " + counted(a.Outcome.Risk.Of, "replicate")
	if m := u.Case.Mean; len(u.Case.Exact) > 0 {
		// The verdict rests on it, so that it leads.
		risk.Lead = Percent(m.Estimate, u.Case.Pooled.Of)
		risk.Beside = PercentRange(m.Low, m.High, u.Case.Pooled.Of) + ", exact in each draw"
		r.Figures = append(r.Figures, Figure{ID: "exact", Label: risk.Label + ", exact in each draw", Text: risk.Lead, Value: m.Estimate, Low: m.Low, High: m.High,
			HasInterval: true, Note: "the mean of the exact risks of the draws, on which the verdict rests"})
	}
	limit := a.Case.Question.Limit
	if r.VerdictText == "" {
		return
	}
	p, of := u.Case.Pooled, " the limit of "+percentOf(limit.Value)
	has := "the interval between draws, " + PercentRange(p.Low, p.High, p.Of) + ","
	if m := u.Case.Mean; len(u.Case.Exact) > 0 {
		has = "the mean of the exact risks of the draws, " + PercentRange(m.Low, m.High, p.Of) + ","
	}
	s := ""
	switch a.Verdict {
	case pva.Within:
		s = "Within the limit: " + has + " lies at or below" + of + "."
	case pva.AboveLimit:
		s = "Above the limit: " + has + " lies above" + of + "."
	default:
		s = "Undecided: " + has + " straddles" + of + ", so the mean risk is not shown to be within it."
		if a.ToDecide > 0 && u.Draws >= fewDraws {
			s += " If the mean stays where it is, about " + Grouped(roughly(a.ToDecide/u.Each)) + " draws, with as many replicates each, would settle it."
		}
	}
	if a.Unreliable {
		s = "Do not rely on this answer: the simulation and the exact answer disagree beyond chance. " + s
	}
	if w := WithinText(u, limit); w != "" {
		s += " " + w
	}
	r.VerdictText = s
}

// uncertaintyParts are the sheet about the risk over the draws and that with
// every draw; none where no input is uncertain.
func uncertaintyParts(a *pva.Assessment) []Part {
	u := a.Uncertainty
	if u == nil {
		return nil
	}
	p := Part{Name: PartUncertainty, Lead: leadOf(a), Tables: []*Table{overDraws(a), uncertainTable(u), lawTable(a)}}
	if len(u.Case.Law.Bins) > 0 {
		p.Charts = []Chart{lawChart(a)}
	}
	if linked(u) {
		p.Charts = append(p.Charts, linkChart(u))
	}
	p.Sections = []Section{{Heading: "How to read this", Paragraphs: readingUncertainty(a)}}
	return []Part{p, {Name: PartDraws, Bare: true, Tables: []*Table{drawsTable(u)}, Lead: "Every draw of the uncertain inputs with what came of it."}}
}

func leadOf(a *pva.Assessment) string {
	u := a.Uncertainty
	s := WithinText(u, a.Case.Question.Limit)
	if law := u.Case.Law; law.Reason == "" {
		if s != "" {
			s += " "
		}
		s += "Nine in ten draws have a risk from " + Percent(law.Percentiles.P05, 0) + " to " + Percent(law.Percentiles.P95, 0) + "."
	} else {
		s = sentence(law.Reason) + "."
	}
	return s
}

// overDraws is the law of the risk over the draws of the case, its baseline and
// its options.
func overDraws(a *pva.Assessment) *Table {
	u := a.Uncertainty
	pct := Format{Percents, tableDigits(a.Outcome.Replicates)}
	share := Format{Percents, 0}
	b := newTable("over_draws", "The risk over the draws").column("name", "", "", Format{}).
		column("pooled", "Pooled risk", "", pct).column("low", "Low", "", pct).column("high", "High", "", pct)
	exact := len(u.Case.Exact) > 0
	if exact {
		b.column("exact", "Mean exact risk", "", Format{Percents, 3}).column("exact_low", "Low", "", Format{Percents, 3}).column("exact_high", "High", "", Format{Percents, 3})
	}
	b.column("p05", "5 % of draws below", "", pct).column("p25", "25 %", "", pct).column("p50", "Half", "", pct).column("p75", "75 %", "", pct).column("p95", "95 %", "", pct)
	if a.Case.Question.Limit.Set {
		b.column("within", "Draws within the limit", "", share).column("within_low", "Low", "", share).column("within_high", "High", "", share)
	}
	b.column("total", "Variance of the shares fallen", "", Format{Kind: Small, Digits: 2}).column("inputs", "of it from the inputs", "", share).column("noise", "replicate noise", "", share)
	row := func(id, name string, r *pva.DrawnRisk) {
		cells := map[string]Cell{"name": text(name), "pooled": num(r.Pooled.Estimate), "low": num(r.Pooled.Low), "high": num(r.Pooled.High)}
		if id == "case" && u.Draws <= mostDrawsShown {
			mean := 0.0
			for _, x := range r.Fallen {
				mean += float64(x) / float64(u.Each) / float64(u.Draws)
			}
			cells["pooled"] = num(r.Pooled.Estimate).by("AVERAGE({draws::share})", mean)
		}
		if len(r.Exact) > 0 {
			cells["exact"], cells["exact_low"], cells["exact_high"] = num(r.Mean.Estimate), num(r.Mean.Low), num(r.Mean.High)
		}
		if q := r.Law.Percentiles; r.Law.Reason == "" {
			cells["p05"], cells["p25"], cells["p50"], cells["p75"], cells["p95"] = num(q.P05), num(q.P25), num(q.P50), num(q.P75), num(q.P95)
		}
		if w := r.Within; w != nil {
			cells["within"], cells["within_low"], cells["within_high"] = num(w.Estimate), num(w.Low), num(w.High)
		}
		if v := r.Spread; v.Total > 0 && !math.IsNaN(v.Noise) {
			cells["total"], cells["inputs"] = num(v.Total), num(v.Inputs/v.Total)
			cells["noise"] = num(1-v.Inputs/v.Total).by("1-{inputs}", 1-v.Inputs/v.Total)
		}
		b.row(id, cells)
	}
	row("case", "The case", &u.Case)
	for i := range u.Options {
		row("option_"+yearID(i+1), u.Options[i].Name, &u.Options[i])
	}
	if u.Baseline != nil {
		row("baseline", "Without the take", u.Baseline)
	}
	b.t.Note = "Low and high are the ends of " + percentOf(a.Case.Question.Confidence) + " intervals. The points in the middle are those of the " + lawWords(&u.Case.Law) + "."
	return b.t
}

func lawWords(l *pva.RiskLaw) string {
	if l.Exact {
		return "exact risks of the draws"
	}
	return "beta law fitted to the counts of the draws"
}

// uncertainTable lists the inputs, those first with which the risk goes most.
func uncertainTable(u *pva.Uncertainty) *Table {
	coefficient := Format{Decimal, 2}
	b := newTable("uncertain_inputs", "Which inputs the risk goes with").column("key", "Input", "", Format{}).
		column("link", "Partial rank correlation", "with the risk", coefficient).column("low", "Low", "", coefficient).column("high", "High", "", coefficient).
		column("value", "Value of the case", "", Format{Kind: General}).column("mean", "Mean of its law", "", Format{Kind: General}).column("sd", "Standard deviation", "", Format{Kind: General}).
		column("redrawn", "Drawn anew", "draws", Format{Kind: Counts}).wide("law", "Law")
	for i, in := range byLink(u) {
		b.row("input_"+yearID(i+1), map[string]Cell{"key": text(in.Key), "link": num(in.Link.Estimate), "low": num(in.Link.Low), "high": num(in.Link.High),
			"value": num(in.Value), "mean": fourDigits(in.Mean), "sd": fourDigits(in.SD), "redrawn": num(float64(in.Outside)), "law": text(in.Law)})
	}
	b.t.Note = "From -1 to 1: how regularly the risk rises (above 0) or falls (below 0) with the input while the others are held. 0 is no regular link."
	return b.t
}

func byLink(u *pva.Uncertainty) []pva.UncertainInput {
	out := append([]pva.UncertainInput(nil), u.Inputs...)
	size := func(i int) float64 {
		if v := math.Abs(out[i].Link.Estimate); !math.IsNaN(v) {
			return v
		}
		return -1
	}
	sort.SliceStable(out, func(i, j int) bool { return size(i) > size(j) })
	return out
}

func linked(u *pva.Uncertainty) bool {
	for _, in := range u.Inputs {
		if !math.IsNaN(in.Link.Estimate) {
			return true
		}
	}
	return false
}

// lawTable is the histogram of the risk over the draws.
func lawTable(a *pva.Assessment) *Table {
	law := a.Uncertainty.Case.Law
	limit := a.Case.Question.Limit
	b := newTable("risk_law", "The law of the risk over the draws").column("range", "Risk", "", Format{}).
		column("share", "Share of the draws", "", Format{Percents, 1}).column("seen", "By shares of replicates fallen", "", Format{Percents, 1})
	if limit.Set {
		b.column("against", "Against the limit", "", Format{})
	}
	for i, bin := range law.Bins {
		against := "holds the limit"
		switch {
		case bin.High <= limit.Value:
			against = "within"
		case bin.Low >= limit.Value:
			against = "above"
		}
		b.row("bar_"+yearID(i+1), map[string]Cell{"range": text(Significant(100*bin.Low, 6) + " to " + Significant(100*bin.High, 6) + " %"),
			"share": num(bin.Share), "seen": num(bin.Seen), "against": text(against)})
	}
	b.t.Note = "The first column of shares is the " + lawWords(&law) + ", free of the noise of " + counted(a.Uncertainty.Each, "replicate") + " a draw; the second has that noise in it and is wider."
	if law.Reason != "" {
		b.t.Note = sentence(law.Reason) + "."
	}
	return b.t
}

func lawChart(a *pva.Assessment) Chart {
	u := a.Uncertainty
	law := u.Case.Law
	ch := Chart{ID: "risk_law", Title: "The risk over the draws of the uncertain inputs", XTitle: "Risk", YTitle: "Share of the draws", Table: "risk_law", X: "range", Percent: true, Bars: true,
		Series: []Series{{Name: sentence(lawWords(&law)), Role: Main, Value: "share"}, {Name: "Shares of replicates fallen, with their noise", Role: Compared, Value: "seen"}}}
	ch.Alt = "Histogram: over " + counted(int64(u.Draws), "draw") + " the risk is " + Percent(law.Mean, 0) + " in the mean; nine in ten draws lie between " +
		Percent(law.Percentiles.P05, 0) + " and " + Percent(law.Percentiles.P95, 0) + "."
	if w := WithinText(u, a.Case.Question.Limit); w != "" {
		ch.Alt += " " + w
	}
	return ch
}

func linkChart(u *pva.Uncertainty) Chart {
	ch := Chart{ID: "uncertain_inputs", Title: "Which inputs the risk goes with", YTitle: "Partial rank correlation", Table: "uncertain_inputs", X: "key", Bars: true,
		Series: []Series{{Name: "Partial rank correlation with its interval", Role: Main, Value: "link", Low: "low", High: "high"}}}
	ch.Alt = "Bars with intervals:"
	for i, in := range byLink(u) {
		if i > 0 {
			ch.Alt += ";"
		}
		ch.Alt += " " + in.Key + " " + Format{Decimal, 2}.Show(in.Link.Estimate)
	}
	ch.Alt += "."
	return ch
}

// mostDrawsShown is how many draws are listed.
const mostDrawsShown = 5000

// drawsTable lists the draws.
func drawsTable(u *pva.Uncertainty) *Table {
	b := newTable("draws", "")
	b.t.Main = true
	b.column("draw", "Draw", "", Format{Kind: Counts})
	for j, in := range u.Inputs {
		b.column("input_"+yearID(j+1), in.Key, "", Format{Kind: General})
	}
	b.column("fallen", "Fallen", "replicates", Format{Kind: Counts}).column("of", "Of", "replicates", Format{Kind: Counts}).column("share", "Share fallen", "", Format{Percents, tableDigits(u.Each)})
	if len(u.Case.Exact) > 0 {
		b.column("exact", "Exact risk", "", Format{Percents, 3})
	}
	for d := range min(u.Draws, mostDrawsShown) {
		cells := map[string]Cell{"draw": num(float64(d + 1)), "fallen": num(float64(u.Case.Fallen[d])), "of": num(float64(u.Each))}
		for j, v := range u.Values[d] {
			cells["input_"+yearID(j+1)] = num(v)
		}
		share := float64(u.Case.Fallen[d]) / float64(u.Each)
		cells["share"] = num(share).by("{fallen}/{of}", share)
		if len(u.Case.Exact) > 0 {
			cells["exact"] = num(u.Case.Exact[d])
		}
		b.row("draw_"+yearID(d+1), cells)
	}
	return b.t
}

// fourDigits is a number shown to four significant digits; the cell holds all.
func fourDigits(v float64) Cell {
	c := num(v)
	if v != 0 && !math.IsNaN(v) && !math.IsInf(v, 0) {
		c = c.as(Decimal, max(0, 3-int(math.Floor(math.Log10(math.Abs(v))))))
	}
	return c
}
