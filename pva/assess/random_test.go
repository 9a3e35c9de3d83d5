package assess

import (
	"fmt"
	"math"

	"ebbline/pva"

	"pgregory.net/rapid"
)

// randomCases draws small cases over the whole grammar of the case file: both
// readings of the year, every form, law and rule, in combinations that nobody
// would think of. Populations are small and horizons short, so that a plain
// simulator and an exact solver can follow. rapid's Example(i) makes case i the
// same on every run.
var randomCases = rapid.Custom(func(t *rapid.T) *pva.Case {
	for {
		if c := drawCase(t); c != nil {
			return c
		}
	}
})

type draft struct {
	t       *rapid.T
	entries []pva.Entry
	flow    bool
	horizon int
}

func (d *draft) num(path string, v float64) {
	d.entries = append(d.entries, pva.Entry{Path: path, Value: pva.Num(v), Origin: pva.FromCase})
}
func (d *draft) word(path, v string) {
	d.entries = append(d.entries, pva.Entry{Path: path, Value: pva.Text(v), Origin: pva.FromCase})
}

// in draws a number between two bounds on a grid of a hundredth of the span.
func (d *draft) in(label string, lo, hi float64) float64 {
	return lo + (hi-lo)*float64(rapid.IntRange(0, 100).Draw(d.t, label))/100
}
func (d *draft) whole(label string, lo, hi int) int { return rapid.IntRange(lo, hi).Draw(d.t, label) }
func (d *draft) maybe(label string, percent int) bool {
	return rapid.IntRange(1, 100).Draw(d.t, label) <= percent
}
func (d *draft) one(label string, of ...string) string {
	return rapid.SampledFrom(of).Draw(d.t, label)
}

// drawCase is one draft, nil if the draft is no valid case (a capacity out of
// reach, say).
func drawCase(t *rapid.T) *pva.Case {
	d := &draft{t: t, flow: rapid.Bool().Draw(t, "flow")}
	d.horizon = d.whole("horizon", 2, 7)
	d.num("question.threshold", float64(d.whole("threshold", 0, 6)))
	d.num("question.horizon", float64(d.horizon))
	d.num("start.abundance", d.in("abundance", 3, 28))
	if d.maybe("start spread", 25) {
		d.num("start.cv", d.in("start.cv", .05, .4))
	}
	d.births()
	d.deaths()
	if d.maybe("weather", 50) {
		d.num("weather.correlation", rapid.SampledFrom([]float64{-1, -.5, 0, .4, 1}).Draw(t, "correlation"))
		if d.maybe("memory", 30) {
			d.num("weather.memory", rapid.SampledFrom([]float64{-.4, .3, .7}).Draw(t, "memory"))
		}
	}
	for i := 1; i <= d.whole("catastrophes", 0, 2); i++ {
		d.catastrophe(fmt.Sprintf("catastrophe.%d.", i))
	}
	for i := 1; i <= d.whole("harvests", 0, 2); i++ {
		d.harvest(fmt.Sprintf("harvest.%d.", i))
	}
	if d.maybe("stocking", 35) {
		d.stocking("stocking.1.")
	}
	if d.maybe("ceiling", 30) {
		d.num("ceiling.abundance", float64(d.whole("ceiling.at", 12, 40)))
	}
	if d.flow {
		d.word("run.substeps", "events")
		if d.maybe("always", 40) {
			d.word("question.watch", "always")
		}
	}
	d.num("run.stop_above", 400)
	c, faults := pva.Build(d.entries)
	if len(faults) > 0 {
		return nil
	}
	if _, err := variants(c); err != nil {
		return nil
	}
	return c
}

func (d *draft) births() {
	rate := d.in("births.rate", .05, .9)
	d.num("births.rate", rate)
	if d.maybe("births vary", 50) {
		d.num("births.year_sd", rate*d.in("births.sd", .1, .6))
	}
	if d.flow {
		d.word("births.breeding", "flow")
	} else {
		d.word("births.breeding", "pulse")
		d.word("births.parents", d.one("parents", "survivors", "all"))
		law := d.one("offspring", "poisson", "at-most-one", "clumped")
		d.word("births.offspring", law)
		if law == "clumped" {
			d.num("births.clumping", d.in("clumping", .3, 4))
		}
	}
	d.crowding("births", "none", "linear", "theta", "ricker", "hyperbolic")
	switch d.one("scarcity", "none", "none", "proportional", "saturating") {
	case "proportional":
		d.word("births.scarcity.form", "proportional")
		d.num("births.scarcity.at", d.in("at", 15, 40))
	case "saturating":
		d.word("births.scarcity.form", "saturating")
		d.num("births.scarcity.half_at", d.in("half_at", 1, 8))
	}
	d.calendar("births")
}

func (d *draft) deaths() {
	spread := d.maybe("deaths vary", 50)
	if d.maybe("deaths as fraction", 50) {
		m := d.in("deaths.fraction", .05, .6)
		d.num("deaths.fraction", m)
		if spread {
			d.num("deaths.year_sd", math.Sqrt(m*(1-m))*d.in("deaths.sd", .1, .55))
		}
	} else {
		r := d.in("deaths.rate", .05, .7)
		d.num("deaths.rate", r*100)
		d.num("deaths.per", 100)
		if spread {
			d.num("deaths.year_sd", r*100*d.in("deaths.sd", .1, .6))
		}
	}
	d.crowding("deaths", "none", "none", "linear", "theta")
	d.calendar("deaths")
}

func (d *draft) crowding(side string, forms ...string) {
	form := d.one(side+" crowding", forms...)
	if form == "none" {
		return
	}
	d.word(side+".crowding.form", form)
	if form == "theta" {
		d.num(side+".crowding.exponent", d.in("exponent", .5, 3))
	}
	if d.maybe(side+" capacity", 50) {
		d.num(side+".crowding.capacity", 20)
	} else {
		d.num(side+".crowding.scale", d.in(side+" scale", 15, 80))
	}
}

func (d *draft) calendar(side string) {
	switch d.one(side+" calendar", "none", "none", "none", "trend", "steps", "cycle", "by_year") {
	case "trend":
		d.num(side+".trend", d.in("trend", -.15, .15))
	case "steps":
		d.num(side+".steps.1.from", float64(d.whole("step", 1, 4)))
		d.num(side+".steps.1.factor", d.in("factor", .5, 1.5))
	case "cycle":
		d.num(side+".cycle.amplitude", d.in("amplitude", -.8, .8))
		d.num(side+".cycle.period", d.in("period", 2, 5))
		d.num(side+".cycle.phase", d.in("phase", 0, 2))
	case "by_year":
		for i := 1; i <= 3; i++ {
			d.num(fmt.Sprintf("%s.by_year.%d", side, i), d.in("by_year", .4, 1.6))
		}
	}
}

func (d *draft) catastrophe(row string) {
	d.num(row+"chance", d.in("chance", .05, .4))
	kills := d.in("kills", 0, .8)
	d.num(row+"kills", kills)
	if kills > .1 && d.maybe("kills vary", 30) {
		d.num(row+"kills_sd", math.Sqrt(kills*(1-kills))*d.in("kills_sd", .1, .6))
	}
	if d.maybe("births struck", 50) {
		d.num(row+"births_times", d.in("births_times", 0, 1.5))
	}
}

func (d *draft) harvest(row string) {
	rules := []string{"constant", "fraction", "above", "ladder", "by_year"}
	when := d.one("when", "start", "end")
	if d.flow && d.maybe("through", 40) {
		when = "through"
		rules = []string{"constant", "fraction", "by_year"}
	}
	rule := d.one("rule", rules...)
	d.word(row+"rule", rule)
	d.word(row+"when", when)
	switch rule {
	case "constant":
		d.num(row+"take", d.in("take", .5, 5))
	case "fraction":
		d.num(row+"fraction", d.in("fraction", .02, .5))
	case "above":
		d.num(row+"spare", d.in("spare", 2, 15))
		d.num(row+"fraction", d.in("above", .2, 1))
	case "ladder":
		for i, p := range [][2]float64{{4, 0}, {12, d.in("rung", 1, 3)}, {25, d.in("top", 3, 7)}} {
			d.num(fmt.Sprintf("%spoints.%d.1", row, i+1), p[0])
			d.num(fmt.Sprintf("%spoints.%d.2", row, i+1), p[1])
		}
	case "by_year":
		for i := 1; i <= 3; i++ {
			d.num(fmt.Sprintf("%stakes.%d", row, i), d.in("takes", 0, 5))
		}
	}
	d.word(row+"years", d.one("years", "-", "-", "2-", "-3", "2-4"))
	if d.maybe("one year in", 25) {
		d.num(row+"one_year_in", 2)
	}
	if d.maybe("stop below", 40) {
		d.num(row+"stop_below", float64(d.whole("stop_below", 3, 15)))
	}
	if d.maybe("leave", 30) {
		d.num(row+"leave", d.in("leave.at", 1, 9))
	}
	if d.maybe("share", 25) {
		d.num(row+"share", d.in("share.of", .3, 1.4))
	}
	if d.maybe("extra deaths", 25) {
		d.num(row+"extra_deaths", d.in("extra", .1, .9))
	}
	if when == "through" {
		return
	}
	if d.maybe("survey", 25) {
		d.num(row+"survey_cv", d.in("survey_cv", .1, .5))
	}
	if d.maybe("seldom surveyed", 15) {
		d.num(row+"survey_every", 2)
	}
	switch d.one("take error", "none", "none", "cv", "poisson", "each-animal") {
	case "cv":
		d.num(row+"take_cv", d.in("take_cv", .1, .6))
	case "poisson":
		d.word(row+"take_noise", "poisson")
	case "each-animal":
		if rule == "fraction" {
			d.word(row+"take_noise", "each-animal")
		}
	}
}

func (d *draft) stocking(row string) {
	when := d.one("add when", "start", "end")
	if d.flow && d.maybe("add through", 50) {
		when = "through"
	} else if d.maybe("add noise", 40) {
		d.word(row+"noise", "poisson")
	}
	d.word(row+"when", when)
	d.num(row+"add", d.in("add", .3, 3))
	if d.maybe("only below", 40) {
		d.num(row+"only_below", float64(d.whole("below", 5, 20)))
	}
	if d.maybe("add one year in", 20) {
		d.num(row+"one_year_in", 2)
	}
}
