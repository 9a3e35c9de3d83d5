package reports

import (
	"path/filepath"
	"strings"

	"ebbline/pva"
)

func titleOf(c *pva.Case, file string) string {
	if c.Title != "" {
		return c.Title
	}
	if file != "" {
		return strings.TrimSuffix(filepath.Base(file), filepath.Ext(file))
	}
	return "Untitled case"
}

// Question is what the case asks, in one sentence.
func Question(c *pva.Case) string {
	var b strings.Builder
	b.WriteString("How likely is it that ")
	always := c.Question.Watch == "always"
	switch {
	case c.Question.Threshold < 1 && always:
		b.WriteString("no " + c.Counts + " are left at some time ")
	case c.Question.Threshold < 1:
		b.WriteString("no " + c.Counts + " are counted in some " + c.TimeUnit + " ")
	case always:
		b.WriteString("the population stands at " + Plain(c.Question.Threshold) + " or fewer " + c.Counts + " at some time ")
	default:
		b.WriteString(Plain(c.Question.Threshold) + " or fewer " + c.Counts + " are counted in some " + c.TimeUnit + " ")
	}
	b.WriteString(span(c))
	if takes := takePhrase(c); takes != "" {
		b.WriteString(", if " + takes)
	}
	if adds := addPhrase(c); adds != "" {
		b.WriteString(", with " + adds + " added")
	}
	return b.String() + "?"
}

// span is the years looked ahead: "from 2027 to 2076" or "within 50 years".
func span(c *pva.Case) string {
	h := c.Question.Horizon
	if c.Start.Year.Set {
		if h == 1 {
			return "in " + dateOf(c, 1)
		}
		return "from " + dateOf(c, 1) + " to " + dateOf(c, h)
	}
	return "within " + counted(int64(h), c.TimeUnit)
}

// dateOf is the date of one model year as text.
func dateOf(c *pva.Case, y int) string { return Format{Kind: Dates}.Show(float64(c.Label(y))) }

// takePhrase says what is taken: "8 a year are taken, on top of 5 % a year that goes on anyway".
func takePhrase(c *pva.Case) string {
	var permitted, existing []string
	for i := range c.Harvest {
		words := TakeWords(c, i, len(c.Harvest) > 1)
		if c.Harvest[i].Existing {
			existing = append(existing, words)
		} else {
			permitted = append(permitted, words)
		}
	}
	switch {
	case len(permitted) > 0 && len(existing) > 0:
		return listed(permitted) + " are taken, on top of " + listed(existing) + " taken in any case"
	case len(permitted) > 0:
		return listed(permitted) + " are taken" + stopWords(c)
	case len(existing) > 0:
		return listed(existing) + " are taken as now"
	}
	return ""
}

// stopWords is where the take stops, for a case with one rule; with several it
// stands in brackets behind each.
func stopWords(c *pva.Case) string {
	if len(c.Harvest) == 1 && c.Harvest[0].StopBelow > 0 {
		return ", none below " + Plain(c.Harvest[0].StopBelow)
	}
	return ""
}

// TakeWords is take rule i as a noun phrase: "8 a year from 2027 to 2056"; where
// it is named, its name and where it stops follow in brackets.
func TakeWords(c *pva.Case, i int, named bool) string {
	h := c.Harvest[i]
	each := " a " + c.TimeUnit
	if h.OneYearIn > 1 {
		each = " one " + c.TimeUnit + " in " + Grouped(int64(h.OneYearIn))
	}
	var s string
	switch h.Rule {
	case "constant":
		s = Plain(h.Take.Value) + each
		if h.Take.Value == 0 {
			s = "none"
		}
	case "fraction":
		if h.Rate.Set {
			s = Plain(h.Rate.Value) + " per head" + each
		} else {
			s = percentOf(h.Fraction.Value) + each
		}
	case "above":
		s = "all above " + Plain(h.Spare.Value) + each
		if f := h.Fraction.Or(1); f != 1 {
			s = percentOf(f) + " of those above " + Plain(h.Spare.Value) + each
		}
	case "ladder":
		takes := make([]float64, len(h.Points))
		for j, p := range h.Points {
			takes[j] = p[1]
		}
		s = between(takes) + each + " depending on the number seen"
	case "by_year":
		s = between(h.Takes) + each + " by a list"
	}
	if w := yearsWords(c, h.Schedule); w != "" {
		s += " " + w
	}
	if !named {
		return s
	}
	var aside []string
	if h.Name != "" {
		aside = append(aside, h.Name)
	}
	if h.StopBelow > 0 {
		aside = append(aside, "none below "+Plain(h.StopBelow))
	}
	if len(aside) > 0 {
		s += " (" + strings.Join(aside, ", ") + ")"
	}
	return s
}

// yearsWords is a schedule's span of years, "" where it is open on both sides.
func yearsWords(c *pva.Case, s pva.Schedule) string {
	f := func(y int) string { return Format{Kind: Dates}.Show(float64(y)) }
	word := ""
	if !c.Start.Year.Set {
		word = c.TimeUnit + " "
	}
	switch y := s.Years; {
	case y.OpenFrom && y.OpenTo:
		return ""
	case y.OpenFrom:
		return "until " + word + f(y.To)
	case y.OpenTo:
		return "from " + word + f(y.From) + " on"
	case y.From == y.To:
		return "in " + word + f(y.From)
	default:
		return "from " + word + f(y.From) + " to " + f(y.To)
	}
}

func between(v []float64) string {
	if len(v) == 0 {
		return "0"
	}
	lo, hi := v[0], v[0]
	for _, x := range v {
		lo, hi = min(lo, x), max(hi, x)
	}
	if lo == hi {
		return Plain(lo)
	}
	return Plain(lo) + " to " + Plain(hi)
}

func percentOf(f float64) string { return Significant(100*f, 6) + " %" }

func addPhrase(c *pva.Case) string {
	var adds []string
	for _, s := range c.Stocking {
		if s.Add == 0 {
			continue
		}
		each := " a " + c.TimeUnit
		if s.OneYearIn > 1 {
			each = " one " + c.TimeUnit + " in " + Grouped(int64(s.OneYearIn))
		}
		w := Plain(s.Add) + each
		if y := yearsWords(c, s.Schedule); y != "" {
			w += " " + y
		}
		if s.OnlyBelow.Set {
			w += " while below " + Plain(s.OnlyBelow.Value)
		}
		adds = append(adds, w)
	}
	return listed(adds)
}

// fallenTo is what falling means, for titles: "20 or fewer", or "none".
func fallenTo(c *pva.Case) string {
	if c.Question.Threshold < 1 {
		return "none"
	}
	return Plain(c.Question.Threshold) + " or fewer"
}
