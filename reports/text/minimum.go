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

// Minimum is the answer to the question of the minimum viable size as terminal text.
func Minimum(s *sweep.Study, q *sweep.Sizes, l *sweep.Crossing, file string) string {
	var b strings.Builder
	c := s.Base
	b.WriteString(wrap(reports.TitleOf(c, file), "", 0))
	ask := fmt.Sprintf("What is the smallest %s whose risk of falling to %s or fewer %s within %s is at most %s?", varied(q), reports.Plain(c.Question.Threshold), c.Counts,
		countOf(int64(q.Horizon), c.TimeUnit), reports.Significant(100*q.Risk, 6)+" %")
	b.WriteString(wrap(ask, "", 0) + "\n")
	b.WriteString(wrap(MinimumWords(c, q, l), "  ", 0) + "\n")
	rows := [][]string{{"size", "risk", "interval", "rests on", ""}}
	points, note := l.Points, ""
	if len(points) > most {
		kept := points[:0:0]
		for i := range most {
			kept = append(kept, points[i*(len(points)-1)/(most-1)])
		}
		note = fmt.Sprintf("%d of %d sizes are shown; the report holds all.", most, len(points))
		if at := l.At(); !slices.Contains(kept, at) { // in place of its nearest neighbour
			near := 0
			for i, p := range kept {
				if math.Abs(p.Value-at.Value) < math.Abs(kept[near].Value-at.Value) {
					near = i
				}
			}
			kept[near] = at
		}
		points = kept
	}
	for _, p := range points {
		if p.Unreachable != "" {
			rows = append(rows, []string{reports.Plain(p.Value), "none", "", "cannot rest there", "not viable"})
			continue
		}
		on, digits := countOf(p.Risk.Of, "replicate"), p.Risk.Of
		interval := strings.TrimSuffix(reports.PercentRange(p.Risk.Low, p.Risk.High, digits), " %")
		if p.Exact != nil {
			on, interval = "exact answer", ""
		}
		rows = append(rows, []string{reports.Plain(p.Value), reports.Percent(p.Risk.Estimate, digits), interval, on, shortVerdict(p.Verdict)})
	}
	b.WriteString(columns(rows, "  ", true, true, false, false))
	if note != "" {
		b.WriteString(wrap(note, "  ", 0))
	}
	b.WriteString(doubts(l.Warnings(s)))
	return b.String() + "\n" + cautions(c)
}

// MinimumWords is the answer in a sentence or two.
func MinimumWords(c *pva.Case, q *sweep.Sizes, l *sweep.Crossing) string {
	if !l.Found {
		return "No minimum: " + l.Reason + "."
	}
	s := fmt.Sprintf("The smallest %s that is viable in this sense is %s", varied(q), pointText(l, l.Value))
	if l.Verdict == pva.Undecided {
		s = fmt.Sprintf("The smallest %s estimated to be viable in this sense is %s, which is not shown", varied(q), pointText(l, l.Value)) + shownTo(l)
	}
	s += between(l, c.Question.Confidence) + ". " + evidence(l) + "."
	if l.Reason != "" {
		s += " Note: " + l.Reason + "."
	}
	return s
}

// varied is what a size is.
func varied(q *sweep.Sizes) string {
	switch q.Vary {
	case "capacity":
		return "carrying capacity"
	case "both":
		return "start (the capacity in proportion)"
	}
	return "start"
}
