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
	takes, adds := takePhrase(c), addPhrase(c)
	switch {
	case takes != "" && adds != "":
		b.WriteString(", if " + takes + ", and " + adds)
	case takes+adds != "":
		b.WriteString(", if " + takes + adds)
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

// takePhrase says what is taken: "8 a year are taken, on top of 5 % a year in any case".
func takePhrase(c *pva.Case) string {
	if len(c.Harvest) == 1 {
		h := c.Harvest[0]
		n := takeNoun(c, h)
		s := n.amount + n.each + n.verb() + " taken" + n.rest
		if h.StopBelow > 0 {
			s += ", none below " + Plain(h.StopBelow)
		}
		if h.Existing {
			s += ", as now"
		}
		return s
	}
	var permitted, existing []string
	for i := range c.Harvest {
		words := TakeWords(c, i, true)
		if c.Harvest[i].Existing {
			existing = append(existing, words)
		} else {
			permitted = append(permitted, words)
		}
	}
	switch {
	case len(permitted) > 0 && len(existing) > 0:
		return listed(permitted) + " are taken, on top of " + listed(existing) + " in any case"
	case len(permitted) > 0:
		return listed(permitted) + " are taken"
	case len(existing) > 0:
		return listed(existing) + " are taken as now"
	}
	return ""
}

// amountWords are the words for a yearly amount: how many, "a year" where it is
// every year, and the rest: how often otherwise, by what, and when.
type amountWords struct{ amount, each, rest string }

func (w amountWords) verb() string {
	if w.amount == "1" || strings.HasPrefix(w.amount, "1 ") && !strings.Contains(w.amount, "%") && !strings.Contains(w.amount, " to ") {
		return " is"
	}
	return " are"
}

// often splits how often into "a year", said with the amount, and all else.
func often(c *pva.Case, s pva.Schedule) (each, rest string) {
	ordinals := []string{"second", "third", "fourth", "fifth", "sixth", "seventh", "eighth", "ninth", "tenth"}
	switch n := s.OneYearIn; {
	case n <= 1:
		each = " a " + c.TimeUnit
	case n-2 < len(ordinals):
		rest = " every " + ordinals[n-2] + " " + c.TimeUnit
	default:
		rest = " one " + c.TimeUnit + " in " + Grouped(int64(n))
	}
	return each, rest
}

func takeNoun(c *pva.Case, h pva.Harvest) amountWords {
	var w amountWords
	w.each, w.rest = often(c, h.Schedule)
	// With a share other than 1 what is taken is not what is counted.
	what := func(n string) string {
		switch {
		case h.Share == 1:
			return n
		case n == "1":
			return n + " animal"
		}
		return n + " animals"
	}
	switch h.Rule {
	case "constant":
		w.amount = what(Plain(h.Take.Value))
		if h.Take.Value == 0 {
			w.amount, w.each = "none", ""
		}
	case "fraction":
		w.amount = percentOf(h.Fraction.Value)
		if h.Rate.Set {
			w.amount = Plain(h.Rate.Value) + " per head"
		}
	case "above":
		w.amount = "all above " + Plain(h.Spare.Value)
		if f := h.Fraction.Or(1); f != 1 {
			w.amount = percentOf(f) + " of those above " + Plain(h.Spare.Value)
		}
		if w.each != "" { // "100 a year" would be read together
			w.each, w.rest = "", " every "+c.TimeUnit
		}
	case "ladder":
		takes := make([]float64, len(h.Points))
		for j, p := range h.Points {
			takes[j] = p[1]
		}
		w.amount = what(between(takes))
		w.rest += " depending on the number seen"
	case "by_year":
		w.amount = what(between(h.Takes))
		w.rest += " by a list"
	}
	if y := yearsWords(c, h.Schedule); y != "" {
		w.rest += " " + y
	}
	return w
}

// TakeWords is take rule i as a noun phrase: "8 a year from 2027 to 2056"; where
// it is named, its name and where it stops follow in brackets.
func TakeWords(c *pva.Case, i int, named bool) string {
	h := c.Harvest[i]
	w := takeNoun(c, h)
	s := w.amount + w.each + w.rest
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
		return "from " + word + f(y.From) + " to " + word + f(y.To)
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

// addPhrase says what is added: "2 a year are added, and 15 every second year
// while fewer than 40 stand".
func addPhrase(c *pva.Case) string {
	var adds []string
	for _, s := range c.Stocking {
		if s.Add == 0 {
			continue
		}
		w := amountWords{amount: Plain(s.Add)}
		w.each, w.rest = often(c, s.Schedule)
		if y := yearsWords(c, s.Schedule); y != "" {
			w.rest += " " + y
		}
		if s.OnlyBelow.Set {
			w.rest += " while fewer than " + Plain(s.OnlyBelow.Value) + " stand"
		}
		verb := ""
		if len(adds) == 0 {
			verb = w.verb() + " added"
		}
		adds = append(adds, w.amount+w.each+verb+w.rest)
	}
	if len(adds) < 2 {
		return strings.Join(adds, "")
	}
	return strings.Join(adds[:len(adds)-1], ", ") + ", and " + adds[len(adds)-1]
}

// fallenTo is what falling means, for titles: "20 or fewer", or "none".
func fallenTo(c *pva.Case) string {
	if c.Question.Threshold < 1 {
		return "none"
	}
	return Plain(c.Question.Threshold) + " or fewer"
}
