package reports

import (
	"strconv"
	"strings"

	"ebbline/pva"
)

// submodels are the formulas of section 7 of the protocol, one heading a submodel.
func (m *model) submodels() []Section {
	out := []Section{m.births(), m.deaths()}
	if m.pulse() {
		out = append(out, m.pulseYear())
	} else {
		out = append(out, m.flowYear())
	}
	if w := m.weather(); len(w.Paragraphs) > 0 {
		out = append(out, w)
	}
	if len(m.c.Catastrophe) > 0 {
		out = append(out, m.catastrophes())
	}
	for i := range m.c.Harvest {
		out = append(out, m.take(i))
	}
	for i := range m.c.Stocking {
		out = append(out, m.additions(i))
	}
	for i := range out {
		out[i].Heading = "7." + strconv.Itoa(i+1) + " Submodel: " + strings.TrimPrefix(out[i].Heading, "7. Submodels: ")
	}
	return out
}

func (m *model) births() Section {
	c := m.c
	br := c.Births
	var s said
	var terms []string
	rate := Plain(br.Rate / br.Per)
	if br.YearSD > 0 {
		rate = "rate_b(y)"
	}
	terms = append(terms, rate)
	if br.Crowding.Form != "none" {
		terms = append(terms, "crowding_b(N)")
	}
	if br.Scarcity.Form != "none" {
		terms = append(terms, "scarcity_b(N)")
	}
	if hasCalendar(br.Calendar) {
		terms = append(terms, "calendar_b(y)")
	}
	if m.birthsStruck() {
		terms = append(terms, "catastrophe_b(y)")
	}
	s.say("Births per head and " + c.TimeUnit + " in model " + c.TimeUnit + " y = 1, 2, ...:")
	s.formula("b(N,y) = " + times(terms...))
	if br.Per != 1 {
		s.say("The birth rate is quoted as " + Plain(br.Rate) + " per " + Plain(br.Per) + " heads.")
	}
	if br.YearSD > 0 {
		s.formula("rate_b(y) = " + Plain(br.Rate/br.Per) + " * exp(sigma e_b - sigma^2/2),  sigma^2 = ln(1 + (" + Plain(br.YearSD/br.Per) + "/" + Plain(br.Rate/br.Per) + ")^2)")
		s.say("Log-normal, with mean " + Plain(br.Rate/br.Per) + " and standard deviation " + Plain(br.YearSD/br.Per) + " between " + c.TimeUnit + "s exactly, catastrophes apart.")
	}
	m.crowding(&s, "b", br.Crowding, m.meta.BirthsScale)
	switch br.Scarcity.Form {
	case "proportional":
		s.formula("scarcity_b(N) = N/" + Plain(br.Scarcity.At.Value))
	case "saturating":
		a := Plain(br.Scarcity.HalfAt.Value)
		s.formula("scarcity_b(N) = N/(" + a + " + N)")
		s.say("The Allee effect: half the births at N = " + a + ".")
	}
	m.calendarOf(&s, "b", br.Calendar)
	return Section{"7. Submodels: births", s.p}
}

func (m *model) birthsStruck() bool {
	for _, x := range m.c.Catastrophe {
		if x.BirthsTimes != 1 {
			return true
		}
	}
	return false
}

func (m *model) deaths() Section {
	c := m.c
	d := c.Deaths
	var s said
	terms := []string{"rate_d(y)"}
	if d.YearSD == 0 && d.Rate.Set {
		terms[0] = Plain(d.Rate.Value / d.Per)
	}
	if d.Crowding.Form != "none" {
		terms = append(terms, "crowding_d(N)")
	}
	if hasCalendar(d.Calendar) {
		terms = append(terms, "calendar_d(y)")
	}
	s.say("Deaths per head and " + c.TimeUnit + ":")
	s.formula("d(N,y) = " + times(terms...))
	switch {
	case d.Fraction.Set && d.YearSD > 0:
		s.formula("rate_d(y) = -ln(1 - m_y),  m_y = 1/(1 + exp(-(u + v e_d)))")
		s.say("The " + c.TimeUnit + "'s death fraction m_y is logit-normal; u and v are solved so that its mean is " + Plain(d.Fraction.Value) + " and its standard deviation " + Plain(d.YearSD) + ".")
	case d.Fraction.Set:
		s.formula("rate_d(y) = -ln(1 - " + Plain(d.Fraction.Value) + ")")
	case d.YearSD > 0:
		mean, sd := Plain(d.Rate.Value/d.Per), Plain(d.YearSD/d.Per)
		s.formula("rate_d(y) = " + mean + " * exp(sigma e_d - sigma^2/2),  sigma^2 = ln(1 + (" + sd + "/" + mean + ")^2)")
	}
	if d.Rate.Set && d.Per != 1 {
		s.say("The death rate is quoted as " + Plain(d.Rate.Value) + " per " + Plain(d.Per) + " heads.")
	}
	m.crowding(&s, "d", d.Crowding, m.meta.DeathsScale)
	m.calendarOf(&s, "d", d.Calendar)
	return Section{"7. Submodels: deaths", s.p}
}

// crowding writes one side's form with its scale in force.
func (m *model) crowding(s *said, side string, k pva.Crowding, solved pva.Optional) {
	if k.Form == "none" {
		return
	}
	l := "L"
	if k.Scale.Set {
		l = Plain(k.Scale.Value)
	} else if solved.Set {
		l = Significant(solved.Value, 6)
	}
	name := "crowding_" + side + "(N) = "
	exponent := Plain(k.Exponent.Value)
	forms := map[string]string{
		"linear": "max(0, 1 - N/" + l + ")", "theta": "max(0, 1 - (N/" + l + ")^" + exponent + ")",
		"ricker": "exp(-N/" + l + ")", "hyperbolic": "1/(1 + N/" + l + ")",
	}
	after := map[string]string{"linear": "Verhulst 1838", "theta": "Gilpin & Ayala 1973", "ricker": "Ricker 1954", "hyperbolic": "Beverton & Holt 1957"}[k.Form]
	if side == "d" {
		forms = map[string]string{"linear": "1 + N/" + l, "theta": "1 + (N/" + l + ")^" + exponent}
		after = ""
	}
	s.formula(name + forms[k.Form])
	text := ""
	if after != "" {
		text = "The " + k.Form + " form (" + after + "). "
	}
	if k.Capacity.Set {
		text += "The scale "
		if solved.Set {
			text += l + " "
		} else {
			text += "L "
		}
		text += "is solved from the carrying capacity: with every other part at 1, growth is zero at N = " + Plain(k.Capacity.Value) + "."
		if m.c.Births.Crowding.Capacity.Set && m.c.Deaths.Crowding.Capacity.Set {
			text += " Births and deaths each close half the gap."
		}
	}
	if text != "" {
		s.say(strings.TrimSpace(text))
	}
}

// calendarOf writes the parts of a calendar that are in use.
func (m *model) calendarOf(s *said, side string, cal pva.Calendar) {
	if !hasCalendar(cal) {
		return
	}
	var parts []string
	if cal.Trend != 0 {
		parts = append(parts, "(1 + "+Plain(cal.Trend)+")^(y-1)")
	}
	if len(cal.Steps) > 0 {
		parts = append(parts, "step(y)")
	}
	if cal.Cycle.Amplitude != 0 {
		parts = append(parts, "(1 + "+Plain(cal.Cycle.Amplitude)+" * sin(2 pi (y - "+Plain(cal.Cycle.Phase)+")/"+Plain(cal.Cycle.Period)+"))")
	}
	if len(cal.ByYear) > 0 {
		parts = append(parts, "factor(y)")
	}
	s.formula("calendar_" + side + "(y) = " + times(parts...))
	if len(cal.Steps) > 0 {
		words := make([]string, len(cal.Steps))
		for i, st := range cal.Steps {
			words[i] = Plain(st.Factor) + " from " + Format{Kind: Dates}.Show(float64(st.From))
		}
		s.say("step(y) is 1 at first, then " + listed(words) + "; a later step replaces an earlier one.")
	}
	if len(cal.ByYear) > 0 {
		s.say("factor(y) is a list of " + strconv.Itoa(len(cal.ByYear)) + " factors, one a " + m.c.TimeUnit + ", " + between(cal.ByYear) + "; the last one is held.")
	}
}

func (m *model) pulseYear() Section {
	c := m.c
	var s said
	if c.Births.Parents == "all" {
		s.say("All N that are there breed, each with b(N,y) young in the mean; then mortality:")
	} else {
		s.say("First mortality; then the S survivors breed, each with b(S,y) young in the mean:")
	}
	s.formula("S ~ Binomial(N, 1 - m(N,y)),  m = 1 - exp(-d)")
	parents := map[string]string{"all": "N", "survivors": "S"}[c.Births.Parents]
	switch c.Births.Offspring {
	case "poisson":
		s.formula("B ~ Poisson(b " + parents + ")")
	case "at-most-one":
		s.formula("B ~ Binomial(" + parents + ", min(1, b))")
		s.say("At most one young a head; a mean above one is capped and counted.")
	case "clumped":
		s.formula("B negative binomial with mean b " + parents + " and variance b " + parents + " (1 + b/" + Plain(c.Births.Clumping.Value) + ")")
	}
	s.formula("N = S + B")
	s.say("A birth is a new counting unit alive at the next census.")
	return Section{"7. Submodels: the " + c.TimeUnit + " as a pulse", s.p}
}

func (m *model) flowYear() Section {
	var s said
	s.formula("N -> N+1 at rate b(N,y) N;  N -> N-1 at rate d(N,y) N")
	if m.c.Run.Substeps != "events" && m.c.Question.Watch != "always" {
		s.say("Where events are many, the " + m.c.TimeUnit + " is cut into sub-steps with rates held within each (substeps = " + m.c.Run.Substeps + "); how far this can shift the answer is under Checks.")
	} else {
		s.say("Every birth and death is an event of its own.")
	}
	return Section{"7. Submodels: the " + m.c.TimeUnit + " as a flow", s.p}
}

func (m *model) weather() Section {
	c := m.c
	b, d := c.Births.YearSD > 0, c.Deaths.YearSD > 0
	var s said
	if b || d {
		which := "Standard normal series e_b and e_d, one value a " + c.TimeUnit + " each, common to all animals"
		if !d {
			which = "A standard normal series e_b, one value a " + c.TimeUnit + ", common to all animals"
		} else if !b {
			which = "A standard normal series e_d, one value a " + c.TimeUnit + ", common to all animals"
		}
		s.say(which + ":")
		if c.Weather.Memory != 0 {
			w := Plain(c.Weather.Memory)
			s.formula("e_y = " + w + " * e_{y-1} + sqrt(1 - " + w + "^2) * u_y")
			s.say("started in its stationary law.")
		} else {
			s.formula("e_y = u_y, independent from " + c.TimeUnit + " to " + c.TimeUnit)
		}
		if b && d {
			s.formula("corr(u_b, u_d) = " + Plain(c.Weather.Correlation))
		}
	}
	return Section{"7. Submodels: weather", s.p}
}

func (m *model) catastrophes() Section {
	var s said
	for i, x := range m.c.Catastrophe {
		t := sentence(nameOr(x.Name, "catastrophe "+strconv.Itoa(i+1))) + ": strikes with probability " + Significant(x.Prob(), 6) + " a " + m.c.TimeUnit + ", independent of the weather"
		if x.Kills > 0 {
			t += "; each animal is killed with probability " + Plain(x.Kills)
			if x.KillsSD > 0 {
				t += " in the mean, the fraction being logit-normal with standard deviation " + Plain(x.KillsSD)
			}
		}
		if x.BirthsTimes != 1 {
			t += "; the births of that " + m.c.TimeUnit + " are multiplied by " + Plain(x.BirthsTimes)
		}
		s.say(t + ".")
	}
	return Section{"7. Submodels: catastrophes", s.p}
}
