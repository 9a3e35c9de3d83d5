package pva

import (
	"fmt"
	"math"
	"strconv"
)

// checks faults what no single key can show: keys that exclude or need each
// other, lists out of order, references to nothing. Whether a capacity can be
// reached is checked in package rates, which has the formulas.
func (b *builder) checks() {
	c := b.c
	b.checkQuestion()
	b.checkSide("births", c.Births.Crowding, c.Births.Per, c.Births.Calendar)
	b.checkSide("deaths", c.Deaths.Crowding, c.Deaths.Per, c.Deaths.Calendar)
	b.checkBirths()
	b.checkDeaths()
	for i := range c.Catastrophe {
		b.checkCatastrophe(i)
	}
	for i := range c.Harvest {
		b.checkHarvest(i)
	}
	for i := range c.Stocking {
		b.checkStocking(i)
	}
	b.checkDates()
	b.checkRun()
	b.checkLater()
}

func (b *builder) has(path string) bool { _, ok := b.given[path]; return ok }

// good says whether the key is given and has no fault of its own.
func (b *builder) good(path string) bool { return b.has(path) && !b.bad[path] }

func (b *builder) value(path string) string {
	if e, ok := b.given[path]; ok {
		return quoted(e.Value)
	}
	return ""
}

// both faults two keys of which only one may be given; neither, if one is needed.
func (b *builder) both(one, other string, needed bool, fix string) {
	switch h1, h2 := b.has(one), b.has(other); {
	case h1 && h2:
		b.ofKey(other, b.value(other), "is given beside "+b.c.Display(one), fix)
	case !h1 && !h2 && needed:
		b.missing(one, fix)
	}
}

func (b *builder) checkQuestion() {
	if b.c.Question.Watch == "always" && b.c.Births.Breeding == "pulse" {
		b.fault("question.watch", `"always"`, "needs breeding = \"flow\"", `a pulse population changes once a year: use watch = "census"`)
	}
	// "census" with substeps etc. is always fine; "always" runs event by event.
	if s := b.c.Run.Substeps; b.c.Question.Watch == "always" && s != "auto" && s != "events" {
		b.fault("run.substeps", b.value("run.substeps"), "cannot go with watch = \"always\"", `use "auto" or "events", or watch = "census"`)
	}
}

func (b *builder) checkSide(side string, cr Crowding, per float64, cal Calendar) {
	if per != 1 && per != 100 && per != 1000 && !b.bad[side+".per"] {
		b.fault(side+".per", b.value(side+".per"), "is not 1, 100 or 1000", "quote the rate per head, per 100 or per 1000")
	}
	if cr.Form != "none" && cr.Form != "" {
		b.both(side+".crowding.capacity", side+".crowding.scale", true, "give either capacity or scale")
	}
	if cr.Form == "theta" && !cr.Exponent.Set && !b.has(side+".crowding.exponent") {
		b.missing(side+".crowding.exponent", "the theta form needs an exponent (1 is the linear form)")
	}
	for i := 1; i < len(cal.Steps); i++ {
		at := side + ".steps." + strconv.Itoa(i+1) + ".from"
		before := side + ".steps." + strconv.Itoa(i) + ".from"
		if b.good(at) && b.good(before) && cal.Steps[i].From <= cal.Steps[i-1].From {
			b.fault(at, strconv.Itoa(cal.Steps[i].From), fmt.Sprintf("is not after the step before it (%d)", cal.Steps[i-1].From), "list the steps by date")
		}
	}
	if cal.Cycle.Amplitude != 0 && cal.Cycle.Period == 0 {
		if path := side + ".cycle.period"; b.has(path) && !b.bad[path] {
			b.fault(path, b.value(path), "is not above 0", "give the period of the cycle in years")
		} else if !b.has(path) {
			b.missing(path, "give the period of the cycle in years")
		}
	}
}

func (b *builder) checkBirths() {
	br := b.c.Births
	if br.Breeding == "flow" {
		for _, key := range []string{"births.parents", "births.offspring", "births.clumping"} {
			if b.has(key) {
				b.useless(key, `with breeding = "flow"`, `remove it, or choose breeding = "pulse"`)
			}
		}
	}
	if br.Offspring == "clumped" && !br.Clumping.Set && !b.has("births.clumping") {
		b.missing("births.clumping", "clumped young need a size parameter")
	}
	switch br.Scarcity.Form {
	case "proportional":
		if !b.has("births.scarcity.at") {
			b.missing("births.scarcity.at", "say at which N births per head are the stated rate")
		}
	case "saturating":
		if !b.has("births.scarcity.half_at") {
			b.missing("births.scarcity.half_at", "say at which N births per head are half the stated rate")
		}
	}
	if br.YearSD > 0 && br.Rate == 0 && !b.bad["births.rate"] && b.has("births.rate") {
		b.fault("births.year_sd", b.value("births.year_sd"), "varies a birth rate of 0", "give a rate above 0 or remove the year_sd")
	}
}

func (b *builder) checkDeaths() {
	d := b.c.Deaths
	b.both("deaths.rate", "deaths.fraction", true, "give deaths either as a rate per head or as a fraction a year")
	if d.Fraction.Set && d.Per != 1 {
		b.useless("deaths.per", "with a fraction", "remove it: a fraction is of those alive")
	}
	if d.Fraction.Set && d.Fraction.Value == 1 && b.c.Births.Breeding == "flow" {
		b.fault("deaths.fraction", "1", "cannot be reached in a flow year", `give a fraction below 1, or breeding = "pulse"`)
	}
	b.spread("deaths.year_sd", d.Fraction, d.YearSD)
	if d.Rate.Set && d.Rate.Value == 0 && d.YearSD > 0 {
		b.fault("deaths.year_sd", b.value("deaths.year_sd"), "varies a death rate of 0", "give a rate above 0 or remove the year_sd")
	}
}

// spread faults a standard deviation that no law on 0 to 1 with that mean can have.
func (b *builder) spread(path string, mean Optional, sd float64) {
	if !mean.Set || sd == 0 {
		return
	}
	if most := mean.Value * (1 - mean.Value); sd*sd >= most {
		b.fault(path, b.value(path), fmt.Sprintf("is too large for a fraction with mean %v", mean.Value), fmt.Sprintf("give less than %.4g", math.Sqrt(most)))
	}
}

func (b *builder) checkCatastrophe(i int) {
	row := "catastrophe." + strconv.Itoa(i+1) + "."
	c := b.c.Catastrophe[i]
	b.both(row+"chance", row+"once_in", true, "give either the chance in a year or once_in")
	b.spread(row+"kills_sd", Optional{c.Kills, true}, c.KillsSD)
}

func (b *builder) checkHarvest(i int) {
	row := "harvest." + strconv.Itoa(i+1) + "."
	h := b.c.Harvest[i]
	through := h.When == "through"
	needs := map[string]string{"constant": "take", "above": "spare", "ladder": "points", "by_year": "takes"}
	if key := needs[h.Rule]; key != "" && !b.has(row+key) && !b.under[row+key] {
		b.missing(row+key, fmt.Sprintf("rule = %q needs it", h.Rule))
	}
	if h.Rule == "fraction" {
		b.both(row+"fraction", row+"rate", true, "give the fraction taken (or, through the year, a rate)")
		if h.Rate.Set && !through {
			b.fault(row+"rate", b.value(row+"rate"), "needs when = \"through\"", "at the start or end of a year give a fraction")
		}
		if through && h.Fraction.Set && h.Fraction.Value == 1 {
			b.fault(row+"fraction", "1", "cannot be taken through the year", "give a fraction below 1")
		}
	}
	for j := range h.Points {
		for k := 0; k < 2; k++ {
			if p := row + "points." + strconv.Itoa(j+1) + "." + strconv.Itoa(k+1); !b.has(p) {
				b.missing(p, "a point is [abundance, take]")
			}
		}
		at := row + "points." + strconv.Itoa(j+1) + ".1"
		if j > 0 && b.good(at) && b.good(row+"points."+strconv.Itoa(j)+".1") && h.Points[j][0] <= h.Points[j-1][0] {
			b.fault(at, fmt.Sprint(h.Points[j][0]), fmt.Sprintf("is not above the abundance before it (%v)", h.Points[j-1][0]), "list the points by abundance")
		}
	}
	noises := 0
	for _, on := range []bool{h.TakeCV > 0, h.TakeNoise == "poisson", h.TakeNoise == "each-animal"} {
		if on {
			noises++
		}
	}
	if noises > 1 {
		b.ofKey(row+"take_noise", b.value(row+"take_noise"), "is given beside take_cv", "choose one error of the take")
	}
	if h.TakeNoise == "each-animal" && h.Rule != "fraction" {
		b.fault(row+"take_noise", `"each-animal"`, "needs rule = \"fraction\"", "each animal is taken with the same chance only under a fraction")
	}
	if through {
		if b.c.Births.Breeding == "pulse" {
			b.fault(row+"when", `"through"`, "needs breeding = \"flow\"", "a pulse year has no through: take at the start or end")
		}
		if h.Rule == "above" || h.Rule == "ladder" {
			b.fault(row+"rule", strconv.Quote(h.Rule), "cannot run through the year", "use constant, by_year or fraction, or when = \"start\" or \"end\"")
		}
		for _, key := range []string{"survey_cv", "survey_every", "take_cv", "take_noise"} {
			if b.has(row + key) {
				b.useless(row+key, `with when = "through"`, "remove it: a take through the year is a stream on the true population")
			}
		}
	}
}

func (b *builder) checkStocking(i int) {
	row := "stocking." + strconv.Itoa(i+1) + "."
	s := b.c.Stocking[i]
	if s.When == "through" {
		if b.c.Births.Breeding == "pulse" {
			b.fault(row+"when", `"through"`, "needs breeding = \"flow\"", "a pulse year has no through: add at the start or end")
		}
		if b.has(row + "noise") {
			b.useless(row+"noise", `with when = "through"`, "remove it: immigration through the year is a Poisson stream already")
		}
	}
}

// checkDates faults a schedule or step that can never act because its dates are
// of the other kind: calendar years without start.year, or model years with it.
func (b *builder) checkDates() {
	type span struct {
		path string
		Years
	}
	var spans []span
	for side, steps := range [][]Step{b.c.Births.Steps, b.c.Deaths.Steps} {
		for i, s := range steps {
			path := [...]string{"births", "deaths"}[side] + ".steps." + strconv.Itoa(i+1) + ".from"
			spans = append(spans, span{path, Years{From: s.From, OpenTo: true}})
		}
	}
	for i, h := range b.c.Harvest {
		spans = append(spans, span{"harvest." + strconv.Itoa(i+1) + ".years", h.Years})
	}
	for i, s := range b.c.Stocking {
		spans = append(spans, span{"stocking." + strconv.Itoa(i+1) + ".years", s.Years})
	}
	if !b.good("question.horizon") || b.bad["start.year"] {
		return
	}
	for _, y := range spans {
		path := y.path
		if !b.good(path) {
			continue
		}
		first := b.c.Label(1)
		switch last := b.c.Label(b.c.Question.Horizon); {
		case !b.c.Start.Year.Set && !y.OpenFrom && y.From > last:
			b.fault(path, b.value(path), fmt.Sprintf("lies after the last year, year %d", last), "give start.year if dates are calendar years, or an earlier year")
		case b.c.Start.Year.Set && !y.OpenTo && y.To < first:
			b.fault(path, b.value(path), fmt.Sprintf("lies before the first year, %d", first), "give calendar years, as start.year is given")
		}
	}
}

func (b *builder) checkRun() {
	r := b.c.Run
	if s := r.Substeps; s != "auto" && s != "events" {
		if n, err := strconv.Atoi(s); (err != nil || n < 1 || n > 1000000) && !b.bad["run.substeps"] {
			b.fault("run.substeps", b.value("run.substeps"), "is not \"auto\", \"events\" or a whole number from 1", "leave it out: auto chooses by the expected number of events")
		}
	}
	if b.has("run.substeps") && r.Substeps != "auto" && b.c.Births.Breeding == "pulse" {
		b.useless("run.substeps", `with breeding = "pulse"`, `remove it, or choose breeding = "flow"`)
	}
	if b.c.Start.Abundance > r.StopAbove {
		b.fault("start.abundance", b.value("start.abundance"), "is above run.stop_above", "raise stop_above")
	}
	if b.c.Question.Threshold >= r.StopAbove {
		b.fault("question.threshold", b.value("question.threshold"), "is not below run.stop_above", "raise stop_above")
	}
}
