package reports

import (
	"strconv"
	"strings"
)

// take states one take rule as it is carried out, step by step.
func (m *model) take(i int) Section {
	c := m.c
	h := c.Harvest[i]
	var s said
	scheduled := "every " + c.TimeUnit
	if h.OneYearIn > 1 {
		scheduled = "one " + c.TimeUnit + " in " + strconv.Itoa(h.OneYearIn)
	}
	if w := yearsWords(c, h.Schedule); w != "" {
		scheduled += " " + w
	}
	existing := ""
	if h.Existing {
		existing = " It goes on with or without the permit and stays in the baseline."
	}
	s.say("Scheduled " + scheduled + ", " + map[string]string{"start": "at the start", "end": "at the end", "through": "through"}[h.When] +
		" " + map[bool]string{true: "the ", false: "of the "}[h.When == "through"] + c.TimeUnit + "." + existing)
	seen := "N"
	if h.SurveyCV > 0 {
		seen = "seen"
		s.formula("seen = N * exp(tau g - tau^2/2),  tau^2 = ln(1 + " + Plain(h.SurveyCV) + "^2),  g standard normal")
		if h.SurveyEvery > 1 {
			s.say("A survey is made in the first scheduled " + c.TimeUnit + " and then every " + strconv.Itoa(h.SurveyEvery) + "; its estimate is kept in between.")
		}
	}
	if h.When == "through" {
		m.stream(&s, i)
	} else {
		m.rule(&s, i, seen)
	}
	name := nameOr(h.Name, "take "+strconv.Itoa(i+1))
	return Section{"7. Submodels: " + name, s.p}
}

// rule is a take at the start or end of the year.
func (m *model) rule(s *said, i int, seen string) {
	h := m.c.Harvest[i]
	if h.StopBelow > 0 {
		s.say("Closed, with no take, while " + seen + " < " + Plain(h.StopBelow) + ".")
	}
	share := ""
	if h.Share != 1 {
		share = Plain(h.Share) + " * "
	}
	switch h.Rule {
	case "constant":
		s.formula("target = " + share + Plain(h.Take.Value))
	case "fraction":
		s.formula("target = " + share + Plain(h.Fraction.Value) + " * " + seen)
	case "above":
		f := ""
		if v := h.Fraction.Or(1); v != 1 {
			f = Plain(v) + " * "
		}
		s.formula("target = " + share + f + "max(0, " + seen + " - " + Plain(h.Spare.Value) + ")")
	case "ladder":
		points := make([]string, len(h.Points))
		for j, p := range h.Points {
			points[j] = "(" + Plain(p[0]) + ", " + Plain(p[1]) + ")"
		}
		s.formula("target = " + share + "ladder(" + seen + ")")
		s.say("The ladder is piecewise linear in " + seen + " through (abundance, take) " + strings.Join(points, ", ") + ", and flat outside.")
	case "by_year":
		s.formula("target = " + share + "takes(y)")
		takes := make([]string, 0, len(h.Takes))
		for _, t := range h.Takes {
			takes = append(takes, Plain(t))
		}
		s.say("The takes are " + strings.Join(takes, ", ") + " from the first scheduled " + m.c.TimeUnit + " on; the last one is held.")
	}
	if h.Share != 1 {
		s.say("One animal taken costs " + Plain(h.Share) + " counting units (" + m.c.Counts + ").")
	}
	switch {
	case h.TakeCV > 0:
		s.formula("intended = target * exp(tau g - tau^2/2),  tau^2 = ln(1 + " + Plain(h.TakeCV) + "^2), rounded at random keeping the mean")
	case h.TakeNoise == "poisson":
		s.formula("intended ~ Poisson(target)")
	case h.TakeNoise == "each-animal":
		s.formula("intended ~ Binomial(N, " + Plain(min(1, h.Fraction.Value*h.Share)) + ")")
	default:
		s.formula("intended = target, rounded at random keeping the mean")
	}
	if h.Leave > 0 {
		s.formula("made = min(intended, max(0, N - " + Plain(h.Leave) + "))")
	} else {
		s.formula("made = min(intended, N)")
	}
	s.say("The rest is shortfall and is recorded, as are closed " + m.c.TimeUnit + "s.")
	if h.ExtraDeaths > 0 {
		s.formula("extra deaths = " + Plain(h.ExtraDeaths) + " * made, rounded at random keeping the mean, at most what is left")
	}
}

// stream is a take through a flow year.
func (m *model) stream(s *said, i int) {
	h := m.c.Harvest[i]
	var rate string
	switch {
	case h.Rule == "constant":
		rate = Plain(h.Take.Value * h.Share)
	case h.Rule == "by_year":
		rate = "takes(y)"
		if h.Share != 1 {
			rate = Plain(h.Share) + " * takes(y)"
		}
	case h.Rate.Set:
		rate = Plain(h.Rate.Value*h.Share) + " N"
	default:
		rate = "-ln(1 - " + Plain(h.Fraction.Value) + ") N"
		if h.Share != 1 {
			rate = Plain(h.Share) + " * " + rate
		}
	}
	stop := ""
	if h.StopBelow > 0 {
		stop = " and N >= " + Plain(h.StopBelow)
	}
	s.formula("N -> N-1 at rate " + rate + "  while N > " + Plain(h.Leave) + stop)
	s.say("A stream of removals through the " + m.c.TimeUnit + " on the true N, one at a time.")
	if h.ExtraDeaths > 0 {
		s.say("Extra deaths are a second stream at " + Plain(h.ExtraDeaths) + " times that rate.")
	}
}

// additions states one rule of stocking.
func (m *model) additions(i int) Section {
	c := m.c
	x := c.Stocking[i]
	var s said
	scheduled := "every " + c.TimeUnit
	if x.OneYearIn > 1 {
		scheduled = "one " + c.TimeUnit + " in " + strconv.Itoa(x.OneYearIn)
	}
	if w := yearsWords(c, x.Schedule); w != "" {
		scheduled += " " + w
	}
	when := map[string]string{"start": "at the start of", "end": "at the end of", "through": "through"}[x.When]
	t := "Scheduled " + scheduled + ", " + when + " the " + c.TimeUnit
	if x.OnlyBelow.Set {
		t += ", only while N < " + Plain(x.OnlyBelow.Value)
	}
	s.say(t + ".")
	switch {
	case x.When == "through":
		s.formula("N -> N+1 at rate " + Plain(x.Add))
	case x.Noise == "poisson":
		s.formula("added ~ Poisson(" + Plain(x.Add) + ")")
	default:
		s.formula("added = " + Plain(x.Add) + ", rounded at random keeping the mean")
	}
	return Section{"7. Submodels: " + nameOr(x.Name, "additions "+strconv.Itoa(i+1)), s.p}
}
