package sweep

import (
	"cmp"
	"math"
	"slices"

	"ebbline/pva"
	"ebbline/pva/estimate"
)

// Outcome is what is derived from the tally of one cell, at the case's
// confidence. Means are over the replicate-years before any outgrew: an assessment
// averages year by year, which is the same where none does.
type Outcome struct {
	Cell       int
	Set        []pva.Setting
	Values     []float64 // of a grid, one a dimension
	Replicates int64
	Risk       pva.Proportion // fallen by the horizon
	ByQuarter  [checkpoints]pva.Proportion
	QuarterAt  [checkpoints]int // model years
	Extinction pva.Proportion
	Outgrown   int64

	TakeMean, TakeTotalMean float64 // a year, and over the horizon
	ShortfallMean           float64 // a year
	ExtraMean               float64 // a year
	ClosedYears             float64 // mean number over the horizon
	LastMean                float64 // N at the last census
	SmallestMean            float64 // expected minimum abundance (McCarthy & Thompson 2001)

	Difference pva.Difference  // its risk minus the case's
	Baseline   *pva.Proportion // the risk without the take
	Added      *pva.Difference // its risk minus its baseline's
	Verdict    pva.Verdict
	Unsolved   bool // no scale reaches its capacity: the case's scales are kept
	// Best marks a cell that no other beats: none takes as much at less risk,
	// or more at no more risk.
	Best bool
}

// Result is a study as far as it is known.
type Result struct {
	Study      *Study
	Seed       uint64
	Replicates int64
	Case       *Outcome   // as stated; nil if nothing is complete
	Cells      []*Outcome // by cell; nil where it is not complete
	Complete   int
	Unsolved   int
	Units      int // of this shard
	UnitsDone  int
	// SubstepShift is the most that sub-steps are estimated to shift a
	// probability of the cells; 0 without sub-steps.
	SubstepShift float64
}

// Whole says whether every cell is complete.
func (r *Result) Whole() bool { return r.Complete == len(r.Cells) }

func (r *Runner) result() *Result {
	s := r.study
	out := &Result{Study: s, Seed: s.Base.Run.Seed, Replicates: s.Base.Run.Replicates, Cells: make([]*Outcome, s.n), Units: r.units()}
	for u, done := range r.done {
		if done && r.mine(u) {
			out.UnitsDone++
		}
	}
	for g := range r.plan.groups {
		if r.state[g].ranges < r.plan.ranges {
			continue
		}
		if out.Case == nil {
			out.Case = derive(factsOf(s.base), &r.state[g].tallies[0])
			out.Case.Cell = -1
		}
		for place, i := range r.plan.groups[g].cells {
			o := r.outcome(g, place)
			out.Cells[i] = o
			out.Complete++
			if o.Unsolved {
				out.Unsolved++
			}
		}
	}
	markBest(out.Cells)
	out.SubstepShift = s.shift()
	return out
}

// outcome is the cell at a place of a group.
func (r *Runner) outcome(g, place int) *Outcome {
	gr := r.plan.groups[g]
	i := gr.cells[place]
	about := r.study.facts[i]
	t := &r.state[g].tallies[1+len(gr.baselines)+place]
	o := derive(about, t)
	o.Cell, o.Set, o.Values, o.Unsolved = i, r.study.cell(i), r.study.Values(i), about.unsolved
	o.Difference = paired(t.OnlyThis, t.OnlyCase, o.Risk, about.confidence)
	for b, places := range gr.baselines {
		for _, p := range places {
			if p == place {
				base := &r.state[g].tallies[1+b]
				risk := estimate.Proportion(base.Fallen[checkpoints-1], base.Replicates, about.confidence)
				// The other way round first, as an assessment does, so that the
				// two agree to the last bit.
				added := estimate.Reversed(paired(t.OnlyBase, t.OnlyThisNotBase, risk, about.confidence))
				o.Baseline, o.Added = &risk, &added
			}
		}
	}
	return o
}

func paired(onlyThis, onlyOther int64, this pva.Proportion, level float64) pva.Difference {
	both := this.Count - onlyThis
	return estimate.Paired(onlyThis, onlyOther, both, this.Of-both-onlyThis-onlyOther, level)
}

// derive turns a tally into figures.
func derive(about facts, t *Tally) *Outcome {
	level, horizon := about.confidence, about.horizon
	o := &Outcome{Replicates: t.Replicates, Outgrown: t.Outgrown}
	for k, n := range t.Fallen {
		o.ByQuarter[k] = estimate.Proportion(n, t.Replicates, level)
		o.QuarterAt[k] = checkpoint(k, horizon)
	}
	o.Risk = o.ByQuarter[checkpoints-1]
	o.Extinction = estimate.Proportion(t.Extinct, t.Replicates, level)
	kept := float64(t.KeptYears) // NaN where all outgrew at once: 0/0
	o.TakeMean = t.Take.Float() / kept
	o.TakeTotalMean = o.TakeMean * float64(horizon)
	o.ShortfallMean = t.Shortfall.Float() / kept
	o.ExtraMean = t.Extra.Float() / kept
	o.ClosedYears = float64(t.Closed) / kept * float64(horizon)
	o.LastMean = t.Last.Float() / float64(t.Replicates-t.Outgrown)
	o.SmallestMean = t.Smallest.Float() / float64(t.SmallestOf)
	o.Verdict = estimate.Verdict(about.limit, o.Risk)
	return o
}

// markBest marks the cells on the efficient frontier of yield against risk.
func markBest(cells []*Outcome) {
	any := false
	for _, o := range cells {
		any = any || o != nil && o.TakeMean > 0
	}
	if !any {
		return
	}
	order := make([]*Outcome, 0, len(cells))
	for _, o := range cells {
		if o != nil && !math.IsNaN(o.TakeMean) {
			order = append(order, o)
		}
	}
	// By rising risk, the largest take first among equals: a cell is on the
	// frontier if it takes more than all before it.
	sortOutcomes(order)
	most := math.Inf(-1)
	for _, o := range order {
		if o.TakeMean > most {
			o.Best, most = true, o.TakeMean
		}
	}
}

func sortOutcomes(order []*Outcome) {
	slices.SortFunc(order, func(a, b *Outcome) int {
		return cmp.Or(cmp.Compare(a.Risk.Count, b.Risk.Count), cmp.Compare(b.TakeMean, a.TakeMean), cmp.Compare(a.Cell, b.Cell))
	})
}
