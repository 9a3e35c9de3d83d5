package text

import (
	"fmt"
	"strconv"
	"strings"

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

// headline is the risk, what the take adds and the verdict.
func headline(r *reports.Report, a *pva.Assessment) string {
	var rows [][]string
	notes := ""
	for _, f := range r.Figures {
		switch f.ID {
		case "exact", "exact_baseline":
			continue // stands beside the simulated figure
		case "extinction":
			if f.Count == 0 {
				continue
			}
		}
		row := []string{f.Label, f.Text, f.Interval}
		if e := exactBeside(a, f.ID); e != "" {
			row[2] += "; exact " + e
		}
		if f.ID == "limit" {
			row[2] = string(r.Verdict)
		}
		if f.ID == "risk" {
			notes = f.Note
		}
		rows = append(rows, row)
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

func exactBeside(a *pva.Assessment, id string) string {
	e := a.Exact
	if id == "baseline" {
		e = a.BaselineExact
	}
	if e == nil || e.Reason != "" || (id != "risk" && id != "baseline") {
		return ""
	}
	return reports.Percent(e.Risk, 0)
}

// optionRows are the options side by side.
func optionRows(a *pva.Assessment) string {
	head := []string{"options", "risk", "interval", "added", "taken a " + a.Case.TimeUnit, "verdict"}
	rows := [][]string{head}
	for _, o := range a.Options {
		p := o.Outcome.Risk
		added := ""
		if o.Added != nil {
			added = reports.PointsText(o.Added.Estimate, o.Added.Of)
		}
		rows = append(rows, []string{shorten(o.Name, 26), reports.Percent(p.Estimate, p.Of), reports.PercentRange(p.Low, p.High, p.Of), added,
			reports.Significant(o.Outcome.TakeMean, 3), string(o.Verdict)})
	}
	return columns(rows, "  ", false, true, false, true, true)
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
