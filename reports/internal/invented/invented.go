// Package invented makes an assessment for the tests of reports: an invented
// population in an invented place, run through a few lines of arithmetic so that
// its counts agree with one another. It is no model of anything, and no program
// code imports it.
package invented

import (
	"math"
	"math/rand/v2"

	"ebbline/pva"
	"ebbline/pva/estimate"
)

func entry(path string, v pva.Value, source string) pva.Entry {
	return pva.Entry{Path: path, Value: v, Source: source, Origin: pva.FromCase}
}

// Entries are those of the invented case.
func Entries() []pva.Entry {
	n, t := pva.Num, pva.Text
	survey := "nest survey 2014-2023, table 2"
	return []pva.Entry{
		entry("case.title", t("Marsh heron, Quillmere reserve: control permit (invented)"), ""),
		entry("case.prepared", t("Example Ecology"), ""),
		entry("case.purpose", t("review of a control permit"), ""),
		entry("case.counts", t("adult females"), ""),
		entry("case.count_years", n(24), ""),
		entry("question.threshold", n(20), ""),
		entry("question.horizon", n(50), ""),
		entry("question.limit", n(0.05), ""),
		entry("start.abundance", n(180), "August count 2026"),
		entry("start.cv", n(0.1), "August count 2026"),
		entry("start.year", n(2027), ""),
		entry("births.breeding", t("pulse"), ""),
		{Path: "births.rate", Value: n(0.45), Source: survey, Note: "daughters alive at the August count, per adult female", Origin: pva.FromCase},
		entry("births.year_sd", n(0.12), ""),
		entry("births.crowding.form", t("linear"), ""),
		entry("births.crowding.capacity", n(900), "assumed"),
		entry("births.scarcity.form", t("saturating"), ""),
		entry("births.scarcity.half_at", n(3), "assumed"),
		entry("deaths.fraction", n(0.27), "ring recoveries 2005-2021"),
		entry("deaths.year_sd", n(0.05), "ring recoveries 2005-2021"),
		entry("catastrophe.1.name", t("summer drought"), ""),
		entry("catastrophe.1.chance", n(0.04), "gauge at Quill weir, 1950-2024"),
		entry("catastrophe.1.kills", n(0.35), ""),
		entry("catastrophe.1.births_times", n(0.5), "assumed"),
		entry("harvest.1.name", t("control"), ""),
		entry("harvest.1.rule", t("constant"), ""),
		entry("harvest.1.take", n(8), "permit application, page 4"),
		entry("harvest.1.when", t("end"), ""),
		entry("harvest.1.stop_below", n(60), "permit application, page 4"),
		entry("ceiling.abundance", n(1500), "assumed"),
		entry("run.replicates", n(10000), ""),
		entry("run.seed", n(20270101), ""),
		entry("option.1.name", t("half the control"), ""),
		entry("option.1.set.harvest.1.take", n(4), ""),
		entry("option.2.name", t("stop below 90"), ""),
		entry("option.2.set.harvest.1.stop_below", n(90), ""),
	}
}

// Case builds the invented case with further entries, which replace those of the
// same path. It panics on a fault, which is a bug of the test.
func Case(more ...pva.Entry) *pva.Case {
	entries := Entries()
	for _, m := range more {
		kept := entries[:0:0]
		for _, e := range entries {
			if e.Path != m.Path {
				kept = append(kept, e)
			}
		}
		entries = append(kept, m)
	}
	c, faults := pva.Build(entries)
	if len(faults) > 0 {
		panic(faults)
	}
	return c
}

// variant is one set of numbers that the arithmetic is run with.
type variant struct{ take, stop, noise, drought float64 }

// tally runs the arithmetic; every variant sees the same random numbers.
func tally(c *pva.Case, replicates int, v variant, main []int) (*pva.Tally, []int) {
	h := c.Question.Horizon
	t := pva.NewTally(h)
	t.Replicates = int64(replicates)
	fellAt := make([]int, replicates)
	for r := range replicates {
		rnd := rand.New(rand.NewPCG(uint64(r), 7))
		n := math.Round(c.Start.Abundance * math.Exp(0.1*rnd.NormFloat64()))
		fell, smallest := 0, int64(math.MaxInt64)
		for y := 1; y <= h; y++ {
			weather, luck, strike := rnd.NormFloat64(), rnd.NormFloat64(), rnd.Float64()
			if strike < v.drought {
				n *= 0.6
			}
			n = n*math.Exp(0.085*(1-n/900)+v.noise*weather) + luck*math.Sqrt(math.Max(n, 0))*0.8
			n = math.Max(0, math.Round(n))
			made, closed := v.take, false
			if n < v.stop {
				made, closed = 0, v.take > 0
			}
			made = math.Min(made, n)
			n -= made
			year := &t.Years[y-1]
			smallest = min(smallest, int64(n))
			if n <= c.Question.Threshold && fell == 0 {
				fell = y
			}
			if fell > 0 {
				year.Fallen++
			}
			if n == 0 {
				year.Extinct++
			}
			if closed {
				year.Closed++
			}
			year.Abundance.Add(int64(n))
			year.Take.Add(int64(made))
			year.Sum.Add(int64(n))
			year.TakeSum.Add(int64(made))
			if main != nil && (fell > 0) != (main[r] > 0 && main[r] <= y) {
				if fell > 0 {
					year.OnlyThis++
				} else {
					year.OnlyCase++
				}
			}
		}
		t.Smallest.Add(smallest)
		t.LogPairs += int64(h - 1)
		t.LogGrowth.Add(int64(math.Round(math.Log((n+1)/c.Start.Abundance) * pva.FixedPoint)))
		batch := &t.Batch[r%pva.Batches]
		batch.Replicates++
		if fell > 0 {
			batch.Fallen++
		}
		fellAt[r] = fell
	}
	return t, fellAt
}

// Assessment is the whole invented answer: baseline, options, drivers, an exact
// answer set near the simulated one, and warnings.
func Assessment(c *pva.Case, replicates int) *pva.Assessment {
	level := c.Question.Confidence
	full := variant{take: 8, stop: 60, noise: 0.19, drought: 0.04}
	if _, any := c.Takes(); !any {
		full.take = 0
	}
	main, fellAt := tally(c, replicates, full, nil)
	a := &pva.Assessment{Case: c, Seed: c.Run.Seed, Replicates: int64(replicates), Asked: int64(replicates), Outcome: estimate.Outcome(c, main)}
	beside := func(v variant) (*pva.Outcome, pva.Difference) {
		t, _ := tally(c, replicates, v, fellAt)
		return estimate.Outcome(c, t), estimate.Against(t, level)
	}
	none := full
	none.take = 0
	if permitted, _ := c.Takes(); permitted {
		base, d := beside(none)
		added := estimate.Reversed(d)
		a.Baseline, a.Added = base, &added
		for i, v := range []variant{{4, 60, full.noise, full.drought}, {8, 90, full.noise, full.drought}} {
			if i >= len(c.Option) {
				break
			}
			o, d := beside(v)
			a.Options = append(a.Options, pva.Alternative{Name: c.Option[i].Name, Set: c.Option[i].Set, Outcome: o, Difference: d, Verdict: estimate.Verdict(c.Question.Limit, o.Risk)})
		}
	}
	calm, dry := full, full
	calm.noise, dry.drought = 0.02, 0
	for _, w := range []struct {
		name string
		v    variant
	}{{"bad weather", calm}, {"catastrophes", dry}, {"the take", none}} {
		o, d := beside(w.v)
		a.Drivers = append(a.Drivers, pva.Driver{Without: w.name, Risk: o.Risk, Difference: d})
	}
	a.Verdict = estimate.Verdict(c.Question.Limit, a.Outcome.Risk)
	a.ToDecide = estimate.ToDecide(c.Question.Limit, a.Outcome.Risk, level)
	a.Warnings = []pva.Warning{{Key: "question.horizon", Text: "50 years is more than a fifth of the 24 years of counts (Fieberg & Ellner 2000)"}}
	return a
}

// Exact puts an exact answer beside the simulated one, as close as chance would have it.
func Exact(a *pva.Assessment) {
	near := func(o *pva.Outcome) *pva.ExactAnswer {
		e := &pva.ExactAnswer{Error: 2e-9, Method: "transition-matrix", States: 1501, Nodes: 64}
		for _, y := range o.Years {
			e.Fallen = append(e.Fallen, y.Fallen.Estimate*0.99)
			e.Extinct = append(e.Extinct, y.Extinct.Estimate*0.98)
			e.Mean = append(e.Mean, y.Mean*1.001)
		}
		e.Risk, e.Extinction = e.Fallen[len(e.Fallen)-1], e.Extinct[len(e.Extinct)-1]
		return e
	}
	a.Exact = near(a.Outcome)
	if a.Baseline != nil {
		a.BaselineExact = near(a.Baseline)
	}
	a.ExactTail = 0.78
	a.Verdict = estimate.VerdictExact(a.Case.Question.Limit, a.Exact.Risk, a.Exact.Error)
}

// Plain is a case with as little in it as a case may have: no take, no limit, no
// calendar year, no title.
func Plain() *pva.Case {
	n := func(path string, v float64) pva.Entry { return entry(path, pva.Num(v), "") }
	c, faults := pva.Build([]pva.Entry{
		n("question.threshold", 0), n("question.horizon", 30), n("start.abundance", 25),
		entry("births.breeding", pva.Text("flow"), ""), n("births.rate", 0.4), n("deaths.rate", 0.42),
	})
	if len(faults) > 0 {
		panic(faults)
	}
	return c
}
