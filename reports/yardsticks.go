package reports

import (
	"math"
	"strconv"

	"ebbline/pva"
	"ebbline/pva/estimate"
)

// yardstickTables hold the answer against published yardsticks, where the case
// states what they need.
func yardstickTables(a *pva.Assessment) []*Table {
	var out []*Table
	if t := criterionTable(a); t != nil {
		out = append(out, t)
	}
	if t := removalTable(a); t != nil {
		out = append(out, t)
	}
	return out
}

// criterionTable is criterion E of the Red List, for a case with a generation length.
func criterionTable(a *pva.Assessment) *Table {
	generation := a.Case.Yardsticks.GenerationLength
	if !generation.Set {
		return nil
	}
	rows, err := estimate.CriterionE(extinctionCurve(a), generation.Value)
	if err != nil {
		return nil
	}
	pct := Format{Percents, tableDigits(a.Outcome.Replicates)}
	b := newTable("criterion_e", "Red List criterion E (IUCN 2001, version 3.1)").
		column("category", "Category", "", Format{}).column("threshold", "Risk of extinction, at least", "", Format{Percents, 0}).
		column("horizon", "Within", "years", Format{Decimal, 1}).column("risk", "Risk here", "", pct).column("low", "Low", "", pct).column("high", "High", "", pct).
		column("standing", "Threshold", "", Format{})
	for _, r := range rows {
		cells := map[string]Cell{"category": text(r.Name), "threshold": num(r.Threshold), "horizon": num(r.Horizon), "standing": text(string(r.Standing))}
		if r.Standing == estimate.Unknown {
			cells["standing"] = text("unknown: " + r.Reason)
		} else {
			cells["risk"], cells["low"], cells["high"] = num(r.Risk.Estimate), num(r.Risk.Low), num(r.Risk.High)
		}
		b.row(r.Name, cells)
	}
	b.t.Note = "Generation length " + Plain(generation.Value) + " years. The criterion " + estimate.CriterionEConditions + ". Whether a taxon qualifies is for its assessors. Source: " + estimate.CriterionESource + "."
	return b.t
}

// extinctionCurve is the chance of none left by each year: the largest so far of
// the chance of none left at a census, which where nothing is added is the same.
func extinctionCurve(a *pva.Assessment) []estimate.YearRisk {
	var out []estimate.YearRisk
	var worst pva.Proportion
	for i, y := range a.Outcome.Years {
		p := y.Extinct
		if a.Case.Question.Threshold < 1 {
			p = y.Fallen
		}
		if i == 0 || p.Estimate >= worst.Estimate {
			worst = p
		}
		out = append(out, estimate.YearRisk{Year: i + 1, Estimate: worst.Estimate, Low: worst.Low, High: worst.High})
	}
	return out
}

// removalTable is the potential biological removal, for a case that states a
// largest growth rate, beside what the case takes in its first year.
func removalTable(a *pva.Assessment) *Table {
	c := a.Case
	y := c.Yardsticks
	if !y.MaxGrowth.Set {
		return nil
	}
	recovery := y.RecoveryFactor.Or(0.5)
	r, err := estimate.PotentialRemoval(c.Start.Abundance, c.Start.CV, y.MaxGrowth.Value, recovery)
	if err != nil {
		return nil
	}
	b := newTable("potential_removal", "Potential biological removal (Wade 1998)").column("what", "", "", Format{}).column("value", "Value", "", Format{Decimal, 2})
	b.row("minimum", map[string]Cell{"what": text("Minimum abundance, the 20th percentile of the count, " + c.Counts), "value": num(r.LeastAbundance)})
	b.row("growth", map[string]Cell{"what": text("Largest yearly growth rate"), "value": num(y.MaxGrowth.Value)})
	b.row("recovery", map[string]Cell{"what": text("Recovery factor" + map[bool]string{true: "", false: " (not stated: 0.5)"}[y.RecoveryFactor.Set]), "value": num(recovery)})
	b.row("removal", map[string]Cell{"what": text("Potential biological removal, " + c.Counts + " a year"), "value": num(r.Animals)})
	if _, any := c.Takes(); any && !math.IsNaN(a.Outcome.Years[0].TakeMean) {
		b.row("take", map[string]Cell{"what": text("Taken in year " + strconv.Itoa(c.Label(1)) + " in this case, on average"), "value": num(a.Outcome.Years[0].TakeMean)})
	}
	b.t.Note = estimate.RemovalConditions + " Source: " + estimate.RemovalSource + "."
	return b.t
}
