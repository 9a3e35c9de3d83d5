package text

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"ebbline/pva"
	"ebbline/pva/sweep"
	"ebbline/reports"
)

// most is how many rows of a sweep are shown; the rest stand in the report.
const most = 21

// Sweep is a finished sweep as terminal text: what was varied, the cells, and
// the largest take within the limit, or what moves the risk most and the three
// sources of doubt. The search may be nil.
func Sweep(r *sweep.Result, largest *sweep.Crossing, file string) string {
	c := r.Study.Base
	var b strings.Builder
	b.WriteString(wrap(reports.TitleOf(c, file), "", 0))
	b.WriteString(wrap(reports.Question(c), "", 0) + "\n")
	if r.Case != nil {
		b.WriteString(statedRows(r))
	}
	switch r.Study.Kind {
	case sweep.Grid:
		b.WriteString("\n" + gridRows(r))
		if largest != nil {
			words := LargestWords(c, largest)
			if len(r.Study.Dimensions) > 1 && len(largest.Points) > 0 {
				words += " (The other keys as the case states them.)"
			}
			b.WriteString("\n" + wrap(words, "  ", 0))
		}
	default:
		if order := sweep.Influences(r); len(order) > 0 {
			b.WriteString("\n" + influenceRows(order, r))
		}
		if r.Case != nil {
			b.WriteString("\n" + doubtRows(r))
		}
	}
	b.WriteString(doubts(r.Warnings(largest)))
	return b.String() + "\n" + cautions(c)
}

func doubts(warnings []pva.Warning) string {
	var b strings.Builder
	for _, w := range warnings {
		b.WriteString("\n" + wrap("Warning: "+w.Text, "", 2))
	}
	return b.String()
}

func cautions(c *pva.Case) string {
	var b strings.Builder
	short, _ := reports.SweepCautions(c)
	for _, w := range short {
		b.WriteString(wrap(w.Short, "", 0))
	}
	return b.String()
}

// statedRows is the case as stated, beside which everything stands.
func statedRows(r *sweep.Result) string {
	c, p := r.Study.Base, r.Case.Risk
	rows := [][]string{{"the case as stated", reports.Percent(p.Estimate, p.Of), reports.PercentRange(p.Low, p.High, p.Of) + ", " + reports.Significant(100*c.Question.Confidence, 4) + " % interval, " + countOf(r.Replicates, "replicate")}}
	if l := c.Question.Limit; l.Set {
		rows = append(rows, []string{"the permit's limit", reports.Significant(100*l.Value, 6) + " %", string(r.Case.Verdict)})
	}
	return columns(rows, "  ")
}

// gridRows are the cells of a grid: all of a small one, otherwise those that no
// other beats.
func gridRows(r *sweep.Result) string {
	dims := r.Study.Dimensions
	var shown []*sweep.Outcome
	for _, o := range r.Cells {
		if o != nil {
			shown = append(shown, o)
		}
	}
	note := ""
	if len(shown) > most {
		all := len(shown)
		best := slices.DeleteFunc(slices.Clone(shown), func(o *sweep.Outcome) bool { return !o.Best })
		if len(best) > 0 && len(dims) > 1 && r.Study.VariesTakesAlone() {
			note = fmt.Sprintf("Of %s cells those are shown that no other beats in both risk and take; the report holds all.", reports.Grouped(int64(all)))
			shown = best
		}
		if len(shown) > most {
			kept := make([]*sweep.Outcome, most)
			for i := range kept {
				kept[i] = shown[i*(len(shown)-1)/(most-1)]
			}
			note = fmt.Sprintf("%d of %s cells are shown; the report holds all.", most, reports.Grouped(int64(all)))
			shown = kept
		}
	}
	var head []string
	for _, d := range dims {
		head = append(head, shortKey(d.Key, max(8, 30/len(dims))))
	}
	takes := false
	for _, o := range shown {
		takes = takes || o.TakeMean > 0
	}
	added, limit := len(shown) > 0 && shown[0].Added != nil, r.Study.Base.Question.Limit.Set
	head = append(head, "risk", "interval")
	right := make([]bool, len(head)+3)
	for i := range right {
		right[i] = i != len(dims)+1
	}
	if added {
		head = append(head, "added")
	}
	if takes {
		head = append(head, "taken")
	}
	if limit {
		right[len(head)] = false
		head = append(head, "verdict")
	}
	rows := [][]string{head}
	for _, o := range shown {
		var row []string
		for _, v := range o.Values {
			row = append(row, pva.Num(v).Text)
		}
		row = append(row, reports.Percent(o.Risk.Estimate, o.Risk.Of), strings.TrimSuffix(reports.PercentRange(o.Risk.Low, o.Risk.High, o.Risk.Of), " %"))
		if added {
			row = append(row, reports.PointsText(o.Added.Estimate, o.Added.Of))
		}
		if takes {
			row = append(row, reports.Significant(o.TakeMean, 3))
		}
		if limit {
			row = append(row, shortVerdict(o.Verdict))
		}
		rows = append(rows, row)
	}
	out := columns(rows, "  ", right...)
	if takes {
		note = strings.TrimSpace("Taken: the mean a " + r.Study.Base.TimeUnit + ". " + note)
	}
	if note != "" {
		out += wrap(note, "  ", 0)
	}
	return out
}

// shortKey is a key that fits: without the parts before its last ones.
func shortKey(key string, n int) string {
	for len([]rune(key)) > n {
		_, rest, more := strings.Cut(key, ".")
		if !more {
			return shorten(key, n)
		}
		key = rest
	}
	return key
}

func shortVerdict(v pva.Verdict) string {
	switch v {
	case pva.Within:
		return "within"
	case pva.AboveLimit:
		return "above"
	}
	return string(v)
}

// LargestWords is the answer of a search for the largest take in a sentence or two.
func LargestWords(c *pva.Case, l *sweep.Crossing) string {
	if !l.Found {
		return "No largest value of " + l.Key + ": " + l.Reason + "."
	}
	limit := reports.Significant(100*l.Limit, 6) + " %"
	s := fmt.Sprintf("The largest %s within the limit of %s is %s", l.Key, limit, pointText(l, l.Value))
	if l.Verdict == pva.Undecided {
		s = fmt.Sprintf("The largest %s estimated to be within the limit of %s is %s, which is not shown", l.Key, limit, pointText(l, l.Value)) + shownTo(l)
	}
	s += between(l, c.Question.Confidence) + ". " + evidence(l) + "."
	if l.Reason != "" {
		s += " Note: " + l.Reason + "."
	}
	return s
}

// shownTo is how far a search's values are shown to be within the limit.
func shownTo(l *sweep.Crossing) string {
	switch {
	case math.IsNaN(l.Safe):
		return "; none is shown to be"
	case l.Rising:
		return "; up to " + pointText(l, l.Safe) + " is shown to be"
	}
	return "; from " + pointText(l, l.Safe) + " up is shown to be"
}

// between says between which values the verdict is undecided.
func between(l *sweep.Crossing, confidence float64) string {
	low, high := l.Undecided()
	at := " at " + reports.Significant(100*confidence, 4) + " %"
	switch {
	case !math.IsNaN(low) && !math.IsNaN(high) && l.Low() == l.High():
		return ", and no other value is in doubt" + at
	case (math.IsNaN(low) || math.IsNaN(high)) && l.Settled():
		return ", and no value looked at is left undecided" + at
	case math.IsNaN(low) && math.IsNaN(high):
		return "; the verdict is undecided" + at + " for all values looked at"
	case math.IsNaN(low):
		return "; up to " + pointText(l, high) + " the verdict is undecided" + at
	case math.IsNaN(high):
		return "; from " + pointText(l, low) + " up the verdict is undecided" + at
	}
	if low == high {
		return "; for " + pointText(l, low) + " the verdict is undecided" + at
	}
	return "; from " + pointText(l, low) + " to " + pointText(l, high) + " the verdict is undecided" + at
}

// evidence is what the answer rests on.
func evidence(l *sweep.Crossing) string {
	if l.Exact != nil {
		return "The risk there is " + reports.Percent(l.Exact.Risk, 0) + " by the exact answer"
	}
	p := l.Risk
	return "The risk there is " + reports.Percent(p.Estimate, p.Of) + " (" + reports.PercentRange(p.Low, p.High, p.Of) + ", " + countOf(p.Of, "replicate") + ", an interval that holds at every look)"
}

// pointText is a value of a search with the digits that its interval supports.
func pointText(l *sweep.Crossing, v float64) string {
	if l.Whole {
		return reports.Grouped(int64(math.Round(v)))
	}
	return reports.Significant(v, 4)
}

func countOf(n int64, noun string) string {
	if n != 1 {
		noun += "s"
	}
	return reports.Grouped(n) + " " + noun
}

// influenceRows are the inputs that move the risk most.
func influenceRows(order []sweep.Influence, r *sweep.Result) string {
	cell := func(o *sweep.Outcome, to float64) (string, string) {
		if o == nil {
			return "", "no such value"
		}
		return reports.Significant(to, 4), reports.Percent(o.Risk.Estimate, o.Risk.Of)
	}
	rows := [][]string{{"what matters most", "less", "risk", "more", "risk", "points"}}
	for i, in := range order {
		if i == 12 {
			break
		}
		less, lessRisk := cell(in.Less, in.LessTo)
		more, moreRisk := cell(in.More, in.MoreTo)
		rows = append(rows, []string{shortKey(in.Key, 30), less, lessRisk, more, moreRisk, reports.PointsText(in.Span, r.Replicates)})
	}
	out := columns(rows, "  ", false, true, true, true, true, true)
	if n := len(order); n > 12 {
		out += wrap(fmt.Sprintf("%d more inputs move it less; the report holds all.", n-12), "  ", 0)
	}
	return out
}

// doubtRows are the three sources of doubt side by side.
func doubtRows(r *sweep.Result) string {
	d := sweep.DoubtsOf(r)
	n := d.Replicates.Of
	rows := [][]string{{"three sources of doubt", "risk", ""},
		{"replicates", reports.PercentRange(d.Replicates.Low, d.Replicates.High, n), "the interval of the case as stated"}}
	if d.Inputs.Cells > 0 {
		rows = append(rows, []string{"inputs, one at a time", reports.PercentRange(d.Inputs.Low, d.Inputs.High, n), countOf(int64(d.Inputs.Cells), "change")})
	}
	if d.Forms.Cells > 0 {
		rows = append(rows, []string{"other forms of the model", reports.PercentRange(d.Forms.Low, d.Forms.High, n), countOf(int64(d.Forms.Cells), "form")})
	}
	out := columns(rows, "  ")
	if d.Inputs.Cells > 0 {
		out += wrap("Inputs: lowest by "+d.Inputs.LowBy+", highest by "+d.Inputs.HighBy+".", "  ", 2)
	}
	if d.Forms.Cells > 0 {
		out += wrap("Forms: lowest by "+d.Forms.LowBy+", highest by "+d.Forms.HighBy+".", "  ", 2)
	}
	return out
}
