package assess

import (
	"fmt"
	"math"

	"ebbline/pva"
	"ebbline/pva/rates"

	"golang.org/x/text/language"
	"golang.org/x/text/message"
)

// grouped writes numbers in groups of three, as the reports do.
var grouped = message.NewPrinter(language.English)

// Warnings are the doubts about a case that a reviewer would raise before any
// replicate is run.
func Warnings(c *pva.Case, m *rates.Model) []pva.Warning {
	var out []pva.Warning
	warn := func(key, format string, a ...any) {
		out = append(out, pva.Warning{Key: key, Text: grouped.Sprintf(format, a...)})
	}
	for _, e := range c.Entries() {
		if (e.Path == "question.threshold" || e.Path == "question.horizon") && e.Source == "assumed" {
			warn(e.Path, "is assumed, and nobody has stated it: the whole answer hangs on it")
		}
	}
	if c.Start.Abundance <= c.Question.Threshold {
		warn("start.abundance", "the population starts at or below the threshold, so that it falls at the first census unless it grows at once")
	}
	if n := c.CountYears; n.Set && float64(c.Question.Horizon) > n.Value/5 {
		warn("question.horizon", "a horizon of %d years rests on %g years of counts; a precise risk needs counts over five times the horizon or more (Fieberg & Ellner 2000)", c.Question.Horizon, n.Value)
	}
	if c.Births.YearSD == 0 && c.Deaths.YearSD == 0 {
		warn("births.year_sd", "no year-to-year variation is given, which understates the risk of a population of any size (Lande 1993)")
	}
	if c.Ceiling.Set && c.Ceiling.Value <= c.Question.Threshold {
		warn("ceiling.abundance", "the ceiling is at or below the threshold, so that the population has fallen at the first census whatever happens")
	}
	if c.UnitSize > 1 {
		warn("case.unit_size", "a unit stands for %g animals, and chance in births and deaths is drawn for units: demographic noise is overstated", c.UnitSize)
	}
	for i, k := range c.Catastrophe {
		if k.Prob() > 0.5 {
			warn(c.Display(fmt.Sprintf("catastrophe.%d.chance", i+1)), "strikes more often than one year in two: that is weather, not a catastrophe")
		}
		wide(warn, c.Display(fmt.Sprintf("catastrophe.%d.kills_sd", i+1)), k.Kills, k.KillsSD)
	}
	if c.Deaths.Fraction.Set {
		wide(warn, "deaths.year_sd", c.Deaths.Fraction.Value, c.Deaths.YearSD)
	}
	for i, h := range c.Harvest {
		if _, ever := h.FirstScheduled(c); !ever {
			warn(c.Display(fmt.Sprintf("harvest.%d.years", i+1)), "%s is never scheduled within the horizon", h.Years.Text)
		}
	}
	for i, o := range c.Option {
		if oc, faults := c.With(o.Set); len(faults) == 0 && (oc.Question.Horizon != c.Question.Horizon || oc.Question.Threshold != c.Question.Threshold || oc.Question.Watch != c.Question.Watch) {
			warn(c.Display(fmt.Sprintf("option.%d.set", i+1)), "the option puts another question (threshold, horizon or watch): its risk is not comparable with the case's")
		}
	}
	return append(out, m.Warnings()...)
}

// wide warns of a fraction that swings between nearly none and nearly all.
func wide(warn func(string, string, ...any), key string, mean, sd float64) {
	if most := mean * (1 - mean); sd > 0 && sd*sd > most/2 {
		warn(key, "a standard deviation of %g around %g (at most %.3g is possible) means years of almost none and years of almost all", sd, mean, math.Sqrt(most))
	}
}

// runWarnings are the doubts that only the run shows.
func runWarnings(a *pva.Assessment) []pva.Warning {
	var out []pva.Warning
	warn := func(key, format string, args ...any) {
		out = append(out, pva.Warning{Key: key, Text: grouped.Sprintf(format, args...)})
	}
	o := a.Outcome
	if o.Outgrown > 0 {
		warn("run.stop_above", "%d of %d replicates outgrew %g units and stopped; they count as not fallen and are left out of means", o.Outgrown, o.Replicates, a.Case.Run.StopAbove)
	}
	if o.Capped > 0 {
		warn("births.rate", "births above one per head were capped at one in %d replicate-years (at-most-one offspring)", o.Capped)
	}
	if a.Replicates < a.Asked {
		warn("run.replicates", "interrupted: %d of %d replicates are complete", a.Replicates, a.Asked)
	}
	if s := a.Substeps; s != nil && s.Substeps > 0 && s.RiskBound > 0.005 {
		warn("run.substeps", "sub-steps may shift a probability by about %.2g; more of them, or events, narrow that", s.RiskBound)
	}
	if a.Unreliable {
		warn("", "simulation and exact answer disagree beyond chance: one of the two is wrong, and this report is not to be relied on")
	}
	return out
}
