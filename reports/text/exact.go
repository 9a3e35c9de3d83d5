package text

import (
	"fmt"
	"strings"

	"ebbline/pva"
	"ebbline/reports"
)

// Exact is an answer without random numbers as terminal text.
func Exact(c *pva.Case, name string, e *pva.ExactAnswer, verdict pva.Verdict, warnings []pva.Warning) string {
	var b strings.Builder
	b.WriteString(wrap(reports.TitleOf(c, name), "", 0))
	b.WriteString(wrap(reports.Question(c), "", 0) + "\n")
	rows := [][]string{
		{"the risk", fine(e.Risk, 7), "error at most " + reports.Significant(100*e.Error, 1) + " %"},
		{noneLeft, fine(e.Extinction, 5), ""},
	}
	if c.Question.Limit.Set {
		rows = append(rows, []string{"the permit's limit", reports.Significant(100*c.Question.Limit.Value, 6) + " %", string(verdict)})
	}
	b.WriteString(columns(rows, "  "))
	b.WriteString("\n" + wrap(fmt.Sprintf("Method: %s; populations up to %s followed, %s of weather a year.", e.Method, reports.Grouped(int64(e.States)), countOf(int64(max(1, e.Nodes)), "point")), "  ", 0))
	last := c.Question.Horizon
	rows = [][]string{{c.TimeUnit, "fallen by then", "none left"}}
	for y := 1; y <= last; y++ {
		if y == 1 || y == last || y%max(1, (last+9)/10) == 0 {
			rows = append(rows, []string{fmt.Sprint(c.Label(y)), fine(e.Fallen[y-1], 4), fine(e.Extinct[y-1], 4)})
		}
	}
	b.WriteString("\n" + columns(rows, "  ", true, true, true))
	for _, w := range warnings {
		b.WriteString(wrap("Warning: "+w.String(), "", 2))
	}
	b.WriteString("\n")
	for _, caution := range reports.Unsaid(reports.ExactCautions(c), warnings) {
		b.WriteString(wrap(caution.Short, "", 0))
	}
	return b.String()
}

// fine is an exact risk with so many significant digits.
func fine(p float64, digits int) string {
	if s := reports.Percent(p, 0); strings.HasPrefix(s, "<") {
		return s
	}
	return reports.Significant(100*p, digits) + " %"
}
