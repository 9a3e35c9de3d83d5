package reports

import (
	"math"
	"strconv"
	"strings"

	"ebbline/pva"
)

// modelPart states the model of this very case in words and formulas, under the
// headings of the ODD protocol (Grimm et al. 2006, 2020). What the case does not
// use is not mentioned; numbers in force stand in the formulas.
func modelPart(c *pva.Case, meta Meta) Part {
	m := &model{c: c, meta: meta}
	p := Part{Name: PartModel, Lead: "The model as this case uses it, under the headings of the ODD protocol (Grimm et al. 2006, 2020)."}
	for _, f := range []func() Section{m.purpose, m.entities, m.schedule, m.concepts, m.initial, m.inputData} {
		p.Sections = append(p.Sections, f())
	}
	p.Sections = append(p.Sections, m.submodels()...)
	p.Sections = append(p.Sections, Section{"References", []Paragraph{{grimm2006, Reference}, {grimm2020, Reference}, {caswell, Reference}, {lande, Reference}, {mccarthy, Reference}}})
	return p
}

type model struct {
	c    *pva.Case
	meta Meta
}

func (m *model) pulse() bool { return m.c.Births.Breeding == "pulse" }

// said gathers paragraphs.
type said struct{ p []Paragraph }

func (s *said) say(text string)     { s.p = append(s.p, Paragraph{Text: text}) }
func (s *said) formula(text string) { s.p = append(s.p, Paragraph{Text: text, Kind: Formula}) }

func (m *model) purpose() Section {
	c := m.c
	var s said
	text := "To answer: " + Question(c)
	if c.Purpose != "" {
		text += " Purpose as stated: " + c.Purpose + "."
	}
	s.say(text)
	s.say("Patterns that a reviewer can hold the model against: the growth of the mean path, the spread of counts between " + c.TimeUnit + "s, and the take made.")
	return Section{"1. Purpose and patterns", s.p}
}

func (m *model) entities() Section {
	c := m.c
	var s said
	unit := "counted in " + c.Counts
	if c.UnitSize != 1 {
		unit += ", a unit standing for " + Plain(c.UnitSize) + " animals"
	}
	s.say("One population, held as a whole number N of counting units (" + unit + "). There are no ages, sexes or places. One step is a " + c.TimeUnit + "; the horizon is " +
		counted(int64(c.Question.Horizon), c.TimeUnit) + m.calendar() + ".")
	with, rhs := "births b and deaths d per head", "dN/dt = (b(N,t) - d(N,t)) N"
	if len(c.Harvest) > 0 {
		with, rhs = with+", removals h", rhs+" - h(N,t)"
	}
	if len(c.Stocking) > 0 {
		with, rhs = with+", additions a", rhs+" + a(N,t)"
	}
	s.say("In the mean, with " + with + " per " + c.TimeUnit + ":")
	s.formula(rhs)
	if m.pulse() {
		s.say("Read as a pulse: one step of mortality, then one of breeding, each a draw of whole animals (Caswell 2001).")
	} else {
		s.say("Read as a flow: births and deaths happen one by one through the " + c.TimeUnit + ", a Markov chain in continuous time at the " + c.TimeUnit + "'s rates (Caswell 2001).")
	}
	s.say(m.growth())
	return Section{"2. Entities, state variables and scales", s.p}
}

func (m *model) calendar() string {
	if !m.c.Start.Year.Set {
		return ""
	}
	return ", from " + dateOf(m.c, 1) + " to " + dateOf(m.c, m.c.Question.Horizon)
}

// growth is the yearly growth of the stated rates, without crowding, scarcity or
// noise, under both readings of the year, so that a rate meant for the other is seen.
func (m *model) growth() string {
	b := m.c.Births.Rate / m.c.Births.Per
	d, f := m.deathRate(), m.deathFraction()
	factor := map[string]string{}
	factor["flow"] = Significant(math.Exp(b-d), 5)
	factor["pulse"] = Significant((1-f)*(1+b), 5)
	how := "survivors breed"
	if m.pulse() && m.c.Births.Parents == "all" {
		factor["pulse"] = Significant(1-f+b, 5)
		how = "all breed"
	}
	if math.IsInf(d, 1) {
		factor["flow"] = "0"
	}
	return "Growth of the mean path at the stated rates" + m.before() + ": times " + factor["pulse"] + " a " + m.c.TimeUnit + " read as a pulse (" + how + "), times " +
		factor["flow"] + " read as a flow. The case is read as a " + m.c.Births.Breeding + "."
}

// before names what the stated rates leave aside in this case.
func (m *model) before() string {
	c := m.c
	var parts []string
	add := func(used bool, name string) {
		if used {
			parts = append(parts, name)
		}
	}
	add(c.Births.Crowding.Form != "none" || c.Deaths.Crowding.Form != "none", "crowding")
	add(c.Births.Scarcity.Form != "none", "scarcity")
	add(hasCalendar(c.Births.Calendar) || hasCalendar(c.Deaths.Calendar), "the calendar")
	add(c.Births.YearSD > 0 || c.Deaths.YearSD > 0, "weather")
	add(len(c.Catastrophe) > 0, "catastrophes")
	add(len(c.Harvest) > 0, "take")
	add(len(c.Stocking) > 0, "additions")
	if len(parts) == 0 {
		return ""
	}
	return ", before " + listed(parts)
}

// deathRate is the death rate per head, deathFraction the fraction a year.
func (m *model) deathRate() float64 {
	if m.c.Deaths.Fraction.Set {
		return -math.Log1p(-m.c.Deaths.Fraction.Value)
	}
	return m.c.Deaths.Rate.Value / m.c.Deaths.Per
}

func (m *model) deathFraction() float64 { return -math.Expm1(-m.deathRate()) }

// schedule is the order of the year.
func (m *model) schedule() Section {
	c := m.c
	var s said
	s.say("In every " + c.TimeUnit + ", in this order:")
	step := 0
	next := func(text string) {
		step++
		s.say(strconv.Itoa(step) + ". " + text)
	}
	next("The weather of the " + c.TimeUnit + " is drawn." + m.strike())
	m.rulesAt("start", next)
	if m.pulse() {
		if c.Births.Parents == "all" {
			next("Births and deaths: all that are there breed, then those die that do not survive.")
		} else {
			next("Births and deaths: first deaths, then the survivors breed.")
		}
	} else {
		next("Births and deaths through the " + c.TimeUnit + m.streams() + ".")
	}
	m.rulesAt("end", next)
	if c.Ceiling.Set {
		next("The ceiling: N = min(N, " + Plain(c.Ceiling.Value) + ").")
	}
	next("Census: N is recorded. The population has fallen from the first census with N <= " + Plain(c.Question.Threshold) + "; it is extinct at a census with N = 0.")
	if c.Question.Watch == "always" {
		s.say("The threshold is watched always: at the start and after every event and action within the " + c.TimeUnit + ".")
	}
	s.say("A replicate that has fallen goes on to the horizon. One that passes " + Plain(c.Run.StopAbove) + " is outgrown: it stops, counts as not fallen afterwards and as above every percentile, and is left out of means.")
	return Section{"3. Process overview and scheduling", s.p}
}

func (m *model) strike() string {
	if len(m.c.Catastrophe) == 0 {
		return ""
	}
	return " Catastrophes strike; those they kill go first."
}

// rulesAt lists harvest and then stocking rules of one moment.
func (m *model) rulesAt(when string, next func(string)) {
	for i, h := range m.c.Harvest {
		if h.When == when {
			next("Take: " + nameOr(h.Name, "take "+strconv.Itoa(i+1)) + ".")
		}
	}
	for i, x := range m.c.Stocking {
		if x.When == when {
			next("Additions: " + nameOr(x.Name, "additions "+strconv.Itoa(i+1)) + ".")
		}
	}
}

func (m *model) streams() string {
	var names []string
	for i, h := range m.c.Harvest {
		if h.When == "through" {
			names = append(names, nameOr(h.Name, "take "+strconv.Itoa(i+1)))
		}
	}
	for i, x := range m.c.Stocking {
		if x.When == "through" {
			names = append(names, nameOr(x.Name, "additions "+strconv.Itoa(i+1)))
		}
	}
	if len(names) == 0 {
		return ""
	}
	return ", with the streams of " + listed(names)
}

func nameOr(name, other string) string {
	if name != "" {
		return name
	}
	return other
}

func (m *model) concepts() Section {
	c := m.c
	var s said
	s.say("Stochasticity. Chance enters as " + listed(m.chances()) + ". All random numbers of a replicate follow from the seed, its number and their purpose alone; cases that are compared share their weather, catastrophes and surveys.")
	if m.pulse() {
		s.say("Noise and growth: in a pulse, noise in the birth rate lowers the mean log growth below the growth of the mean.")
	} else {
		s.say("Noise and growth: in a flow, noise in the birth rate leaves the mean log growth as it is.")
	}
	var crowd []string
	if c.Births.Crowding.Form != "none" {
		crowd = append(crowd, "births per head fall with N")
	}
	if c.Deaths.Crowding.Form != "none" {
		crowd = append(crowd, "deaths per head rise with N")
	}
	if c.Births.Scarcity.Form != "none" {
		crowd = append(crowd, "births per head fall when few are left (the Allee effect)")
	}
	if len(crowd) > 0 {
		s.say("Interaction. " + sentence(listed(crowd)) + ".")
	} else {
		s.say("Interaction. None: births and deaths per head do not depend on N.")
	}
	s.say("Observation. Risk by " + c.TimeUnit + ", abundance, the smallest census (its mean is the expected minimum abundance of McCarthy & Thompson 2001) and the take are recorded at every census.")
	return Section{"4. Design concepts", s.p}
}

func (m *model) chances() []string {
	c := m.c
	out := []string{"births and deaths of whole animals"}
	if c.Births.YearSD > 0 || c.Deaths.YearSD > 0 {
		out = append(out, "weather, common to all animals")
	}
	if len(c.Catastrophe) > 0 {
		out = append(out, "catastrophes")
	}
	if c.Start.CV > 0 {
		out = append(out, "the error of the first count")
	}
	for _, h := range c.Harvest {
		if h.SurveyCV > 0 {
			out = append(out, "the error of surveys")
			break
		}
	}
	if len(c.Harvest) > 0 {
		out = append(out, "the rounding of the take")
	}
	return out
}

func (m *model) initial() Section {
	c := m.c
	var s said
	if c.Start.CV > 0 {
		s.say("N0 is a log-normal draw per replicate with mean " + Plain(c.Start.Abundance) + " and coefficient of variation " + Plain(c.Start.CV) + ", rounded at random to a whole number. Year 0 is no census.")
	} else {
		s.say("N0 = " + Plain(c.Start.Abundance) + roundedStart(c.Start.Abundance) + ". Year 0 is no census.")
	}
	return Section{"5. Initialization", s.p}
}

func roundedStart(v float64) string {
	if v == math.Trunc(v) {
		return ""
	}
	return ", rounded at random to a whole number per replicate"
}

func (m *model) inputData() Section {
	c := m.c
	var s said
	s.say("The numbers under Inputs; the model reads no series while it runs.")
	if len(c.Uncertain) > 0 {
		s.say("Uncertain inputs: " + listed(m.uncertain()) + ". " + Grouped(int64(c.Run.Draws)) + " draws are shared out over the replicates.")
	}
	return Section{"6. Input data", s.p}
}

func (m *model) uncertain() []string {
	var out []string
	for _, u := range m.c.Uncertain {
		t := u.Key + " (" + u.Law
		if u.SD.Set {
			t += ", SD " + Plain(u.SD.Value)
		}
		if u.Low.Set {
			t += ", low " + Plain(u.Low.Value)
		}
		if u.Mode.Set {
			t += ", mode " + Plain(u.Mode.Value)
		}
		if u.High.Set {
			t += ", high " + Plain(u.High.Value)
		}
		out = append(out, t+")")
	}
	return out
}

// times joins factors of a formula.
func times(factors ...string) string {
	var kept []string
	for _, f := range factors {
		if f != "" {
			kept = append(kept, f)
		}
	}
	return strings.Join(kept, " * ")
}
