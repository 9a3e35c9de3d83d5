package text

import (
	"fmt"
	"strconv"
	"strings"
	"unicode/utf8"

	"ebbline/pva"
	"ebbline/reports"
)

// Answer is an assessment as terminal text: what was asked, the risk with its
// interval, the risk without the take and what the take adds, the verdict, the
// options side by side, what drives the risk, doubts and cautions. With chart
// it adds the risk by year in block characters.
func Answer(r *reports.Report, a *pva.Assessment, chart bool) string {
	var b strings.Builder
	b.WriteString(wrap(r.Title, "", 0))
	b.WriteString(wrap(r.Question, "", 0) + "\n")
	b.WriteString(headline(r, a))
	if chart {
		b.WriteString("\n" + riskChart(a))
	}
	if len(a.Options) > 0 {
		b.WriteString("\n" + optionRows(a))
	}
	b.WriteString(uncertainty(a))
	if d := driverWords(a); d != "" {
		b.WriteString("\n" + wrap(d, "  ", 0))
	}
	b.WriteString("\n" + wrap(r.Provenance.Text(), "  ", 0))
	if len(r.Warnings) > 0 {
		b.WriteString("\n")
		for _, w := range r.Warnings {
			b.WriteString(wrap("Warning: "+w, "", 2))
		}
	}
	b.WriteString("\n")
	for _, c := range r.ShortCautions {
		b.WriteString(wrap(c.Short, "", 0))
	}
	return b.String()
}

// noneLeft is the label of the chance of none at the last census.
const noneLeft = "none left at the end"

// headline is the risk, what the take adds and the verdict.
func headline(r *reports.Report, a *pva.Assessment) string {
	var rows [][]string
	notes := ""
	for _, f := range r.Figures {
		switch f.ID {
		case "exact", "exact_baseline":
			continue // leads the row of the simulated figure
		case "extinction":
			if f.Count == 0 {
				continue
			}
		}
		if f.ID == "risk" {
			notes = f.Note
		}
		label := f.Label
		if f.ID == "extinction" {
			label = noneLeft // the whole label would not leave room for an interval
		}
		rows = append(rows, []string{label, f.Lead, f.Beside})
	}
	out := columns(rows, "  ")
	if notes != "" {
		out += wrap("("+notes+")", "  ", 0)
	}
	if r.VerdictText != "" {
		out += wrap(r.VerdictText, "  ", 0)
	}
	if a.Replicates < a.Asked {
		out += wrap(fmt.Sprintf("Interrupted: %s of %s replicates are complete.", reports.Grouped(a.Replicates), reports.Grouped(a.Asked)), "  ", 0)
	}
	return out
}

// optionRows are the case and its options side by side. Where every row has an
// exact answer the exact risks stand first, because the verdicts use them.
func optionRows(a *pva.Assessment) string {
	type option struct {
		name    string
		p       pva.Proportion
		exact   *pva.ExactAnswer
		added   *pva.Difference
		taken   float64
		verdict pva.Verdict
	}
	list := []option{{"the case", a.Outcome.Risk, known(a.Exact), a.Added, a.Outcome.TakeMean, a.Verdict}}
	for _, o := range a.Options {
		list = append(list, option{o.Name, o.Outcome.Risk, known(o.Exact), o.Added, o.Outcome.TakeMean, o.Verdict})
	}
	exact, anyExact, anyAdded, mostTaken := true, false, false, 0.0
	digits := 0
	for _, o := range list {
		exact = exact && o.exact != nil
		anyExact = anyExact || o.exact != nil
		anyAdded = anyAdded || o.added != nil
		mostTaken = max(mostTaken, o.taken)
		if o.p.Count > 0 {
			digits = max(digits, reports.PercentDigits(o.p.Estimate, o.p.Of))
		}
	}
	base := known(a.BaselineExact)
	percent := func(p float64, digits int) string {
		return reports.Format{Kind: reports.Percents, Digits: digits}.Show(p)
	}
	simulated := digits
	if exact {
		digits = max(digits, 2)
	}
	head := []string{"options", "risk", "interval"}
	right := []bool{false, true, false}
	if exact {
		head[1], head[2] = "exact risk", "simulated"
	} else if anyExact {
		head[1] = "simulated" // so that no row is taken for the exact figure above
	}
	if anyAdded {
		head, right = append(head, "added"), append(right, true)
	}
	if mostTaken > 0 {
		head, right = append(head, "taken"), append(right, true)
	}
	if a.Case.Question.Limit.Set {
		head = append(head, "verdict")
	}
	rows := [][]string{head}
	for _, o := range list {
		row := []string{o.name, percent(o.p.Estimate, digits), strings.TrimSuffix(percent(o.p.Low, simulated), " %") + " to " + percent(o.p.High, simulated)}
		if exact {
			row[1] = percent(o.exact.Risk, digits)
		}
		if anyAdded {
			added := ""
			switch {
			case o.added == nil:
			case exact && base != nil:
				added = points(o.exact.Risk-base.Risk, digits)
			default:
				added = points(o.added.Estimate, digits)
			}
			row = append(row, added)
		}
		if mostTaken > 0 {
			row = append(row, strconv.FormatFloat(o.taken, 'f', decimals(mostTaken), 64))
		}
		if a.Case.Question.Limit.Set {
			row = append(row, string(o.verdict))
		}
		rows = append(rows, row)
	}
	shortenFirst(rows, 2)
	out := columns(rows, "  ", right...)
	var units []string
	if anyAdded {
		units = append(units, "added: percentage points over the risk without the take")
	}
	if mostTaken > 0 {
		units = append(units, "taken: "+a.Case.Counts+" a "+a.Case.TimeUnit+", on average")
	}
	if len(units) > 0 {
		out += wrap("("+strings.Join(units, "; ")+")", "  ", 0)
	}
	return out
}

// known is an exact answer, nil where there is none.
func known(e *pva.ExactAnswer) *pva.ExactAnswer {
	if e == nil || e.Reason != "" {
		return nil
	}
	return e
}

// points is a difference of risks in percentage points with so many decimals.
func points(d float64, digits int) string {
	s := strconv.FormatFloat(100*d, 'f', digits, 64)
	if strings.Trim(s, "-0.") == "" {
		return "0"
	}
	return s
}

// decimals are those that give a number of this size three significant digits,
// two at the most.
func decimals(most float64) int {
	switch {
	case most >= 100:
		return 0
	case most >= 10:
		return 1
	}
	return 2
}

// shortenFirst cuts the first column so that rows of columns, set in by so many,
// keep within the width; it leaves 12 characters at least.
func shortenFirst(rows [][]string, indent int) {
	room := Width - indent
	for j := 1; j < len(rows[0]); j++ {
		w := 0
		for _, r := range rows {
			w = max(w, utf8.RuneCountInString(r[j]))
		}
		room -= w + 2
	}
	for _, r := range rows {
		r[0] = shorten(r[0], max(12, min(26, room)))
	}
}

func shorten(s string, n int) string {
	if r := []rune(s); len(r) > n {
		return string(r[:n-1]) + "…"
	}
	return s
}

// driverWords say what the risk would be with one thing taken out.
func driverWords(a *pva.Assessment) string {
	var parts []string
	for _, d := range a.Drivers {
		if d.Without == "the take" {
			continue // stands above
		}
		parts = append(parts, "without "+d.Without+" "+reports.Percent(d.Risk.Estimate, d.Risk.Of))
	}
	return strings.Join(parts, "; ")
}

// riskChart is the risk by year as one row of blocks, its scale stated.
func riskChart(a *pva.Assessment) string {
	years := a.Outcome.Years
	top := years[len(years)-1].Fallen.Estimate
	if top == 0 {
		return ""
	}
	scale := top
	if l := a.Case.Question.Limit; l.Set && l.Value > scale {
		scale = l.Value
	}
	blocks := []rune(" ▁▂▃▄▅▆▇█")
	width := min(60, len(years))
	var bar strings.Builder
	for i := 0; i < width; i++ {
		y := years[(i+1)*len(years)/width-1]
		bar.WriteRune(blocks[int(y.Fallen.Estimate/scale*8+0.5)])
	}
	label := strconv.Itoa
	first, last := label(years[0].Label), label(years[len(years)-1].Label)
	gap := max(1, width-len(first)-len(last))
	return "  risk by " + a.Case.TimeUnit + ", full height " + reports.Percent(scale, 0) + "\n  " + bar.String() + "\n  " + first + strings.Repeat(" ", gap) + last + "\n"
}
