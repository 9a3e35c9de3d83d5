package assess

import (
	"context"
	"fmt"
	"runtime"
	"strings"

	"ebbline/pva"
	"ebbline/pva/draws"
	"ebbline/pva/ensemble"
	"ebbline/pva/estimate"
	"ebbline/pva/exact"
)

// runUncertain assesses a case with uncertain inputs: every draw of them is a
// case of its own, run with the same number of replicates (the case's, rounded
// up to a multiple of the draws), and replicate r belongs to draw r mod draws.
// The tallies of the draws are pooled; intervals and verdicts are those between
// draws. If the context ends, the draws that are complete are kept.
func runUncertain(ctx context.Context, c *pva.Case, opt Options) (*pva.Assessment, error) {
	design, err := draws.New(c)
	if err != nil {
		return nil, err
	}
	set, err := statedVariants(c)
	if err != nil {
		return nil, err
	}
	r := newDrawnRun(c, design, set)
	workers := opt.Workers
	if workers <= 0 {
		workers = runtime.NumCPU()
	}
	plan := ensemble.Plan{Replicates: int64(design.Draws()) * ensemble.Lanes, Workers: workers}
	if opt.Progress != nil {
		plan.Progress = func(done int64) { opt.Progress(done / ensemble.Lanes * r.each) }
	}
	tallies, runErr := ensemble.Run(ctx, r, plan)
	if tallies == nil || tallies[0].Replicates == 0 {
		return nil, runErr
	}
	done := int(tallies[0].Replicates / ensemble.Lanes)
	for _, t := range tallies {
		t.Replicates = int64(done) * r.each
	}
	a := gather(c, set, tallies)
	a.Asked = int64(design.Draws()) * r.each
	a.Substeps = r.worstSubsteps(done)
	a.Exact = &pva.ExactAnswer{Reason: "inputs are uncertain: every draw of them is a case of its own (see Uncertainty)"}
	u := r.uncertainty(done)
	a.Uncertainty = u
	if runErr == nil {
		runErr = r.addExact(ctx, a, workers, opt.Exact)
	}
	r.between(a, done)
	r.figures(u, c)
	if s := u.Stated; s != nil && s.Reason == "" {
		a.Closed = exact.ClosedForms(set[0].model, s.Risk, "the exact risk at the stated values")
	}
	decideBetween(a)
	a.Warnings = append(Warnings(c, set[0].model), design.Warnings...)
	a.Warnings = append(append(a.Warnings, drawDoubts(u, c)...), runWarnings(a)...)
	return a, runErr
}

// statedVariants are the variants of a case with every input at its stated value.
func statedVariants(c *pva.Case) ([]variant, error) {
	for _, o := range c.Option {
		for _, s := range o.Set {
			if strings.HasPrefix(s.Path, "uncertain") {
				return nil, fmt.Errorf("option %s: %s: an option cannot have laws of its own; leave it out, or assess that case by itself", o.Name, s.Path)
			}
		}
	}
	stated, err := without(c, "uncertain", "uncertain_pair")
	if err != nil {
		return nil, err
	}
	return variants(stated)
}

// without is a case less some of its array tables.
func without(c *pva.Case, tables ...string) (*pva.Case, error) {
	settings := make([]pva.Setting, len(tables))
	for i, t := range tables {
		settings[i] = pva.Setting{Path: t, Value: pva.Value{Kind: pva.ListKind}}
	}
	out, faults := c.With(settings)
	if len(faults) > 0 {
		return nil, faults
	}
	return out, nil
}

// drawDoubts are what the draws themselves give to warn of.
func drawDoubts(u *pva.Uncertainty, c *pva.Case) []pva.Warning {
	var out []pva.Warning
	warn := func(key, format string, a ...any) {
		out = append(out, pva.Warning{Key: key, Text: fmt.Sprintf(format, a...)})
	}
	if asked := int64(u.Asked) * u.Each; asked != c.Run.Replicates {
		warn("run.replicates", "%d is not a multiple of the %d draws: rounded up to %d", c.Run.Replicates, u.Asked, asked)
	}
	if float64(u.Redrawn) > mostRedrawn*float64(u.Draws) {
		warn("uncertain", "%d of %d draws had a value that the case cannot have and were drawn anew, so that the laws are not what is stated", u.Redrawn, u.Draws)
	}
	if u.Unsolved > 0 {
		warn("uncertain", "in %d of %d draws no scale of crowding reaches the capacity: they keep the scale that the stated values have", u.Unsolved, u.Draws)
	}
	if u.Case.FitTail < badFit {
		warn("uncertain", "the beta law fitted to the draws does not fit at the limit (tail probability %.1g): the share of draws within the limit is not to be relied on; --exact does without the fit where the case has an exact answer", u.Case.FitTail)
	}
	if u.Each < 2 {
		warn("run.draws", "one replicate a draw cannot tell what the inputs do from chance: give fewer draws or more replicates")
	}
	return out
}

// badFit is the tail probability of the fitted law below which it is doubted.
const badFit = 0.01

// mostRedrawn is the share of draws beyond which redrawing is warned of.
const mostRedrawn = 0.05

// decideBetween holds every risk against the limit by its interval between
// draws: that of the exact risks where there are some.
func decideBetween(a *pva.Assessment) {
	limit := a.Case.Question.Limit
	verdict := func(r *pva.DrawnRisk) (pva.Verdict, pva.Proportion) {
		p := r.Pooled
		if len(r.Exact) > 0 {
			p.Estimate, p.Low, p.High = r.Mean.Estimate, r.Mean.Low, r.Mean.High
		}
		return estimate.Verdict(limit, p), p
	}
	u := a.Uncertainty
	var p pva.Proportion
	if a.Verdict, p = verdict(&u.Case); a.Verdict == pva.Undecided {
		a.ToDecide = estimate.DrawsToDecide(limit, p)
	}
	for i := range a.Options {
		a.Options[i].Verdict, _ = verdict(&u.Options[i])
	}
}

// between replaces the intervals of an assessment, which are those of
// independent replicates, by intervals between draws.
func (r *drawnRun) between(a *pva.Assessment, done int) {
	level := a.Case.Question.Confidence
	option := 0
	var baseline int
	for v := range r.set {
		switch r.set[v].role {
		case theCase:
			r.widen(v, a.Outcome, level)
		case theBaseline:
			baseline = v
			r.widen(v, a.Baseline, level)
			d := estimate.PooledDifference(*a.Added, r.fallen[0][:done], r.fallen[v][:done], r.each, level)
			a.Added = &d
		case anOption:
			o := &a.Options[option]
			option++
			r.widen(v, o.Outcome, level)
			o.Difference = estimate.PooledDifference(o.Difference, r.fallen[v][:done], r.fallen[0][:done], r.each, level)
			if o.Added != nil {
				d := estimate.PooledDifference(*o.Added, r.fallen[v][:done], r.fallen[baseline][:done], r.each, level)
				o.Added = &d
			}
		}
	}
	driver := 0
	for v := range r.set {
		if r.set[v].role != aDriver {
			continue
		}
		d := &a.Drivers[driver]
		driver++
		d.Risk = r.years[v][len(r.years[v])-1].fallen.Pooled(r.each, level)
		d.Difference = estimate.PooledDifference(d.Difference, r.fallen[v][:done], r.fallen[0][:done], r.each, level)
	}
	if a.Baseline != nil { // the driver "the take" comes last
		d := &a.Drivers[driver]
		d.Risk, d.Difference = a.Baseline.Risk, estimate.Reversed(*a.Added)
	}
}

// widen gives an outcome of a variant its intervals between draws. For the law
// of the smallest census counts by draw are not kept: its intervals are stretched
// as much as the risk's own.
func (r *drawnRun) widen(v int, o *pva.Outcome, level float64) {
	for y := range o.Years {
		sums := &r.years[v][y]
		o.Years[y].Fallen = sums.fallen.Pooled(r.each, level)
		o.Years[y].Extinct = sums.extinct.Pooled(r.each, level)
		if closed := &o.Years[y].Closed; closed.Of == int64(sums.closed.Draws)*r.each {
			*closed = sums.closed.Pooled(r.each, level)
		}
	}
	alone := o.Risk
	last := o.Years[len(o.Years)-1]
	o.Risk, o.Extinction = last.Fallen, last.Extinct
	by := (o.Risk.High - o.Risk.Low) / (alone.High - alone.Low)
	for i := range o.Smallest {
		p := &o.Smallest[i].Risk
		if *p == alone {
			*p = o.Risk
			continue
		}
		*p = estimate.Widened(*p, by)
	}
}

// worstSubsteps is the widest bound over the draws on what sub-steps may shift.
func (r *drawnRun) worstSubsteps(done int) *pva.SubstepBound {
	var worst *pva.SubstepBound
	for _, b := range r.substeps[:done] {
		if worst == nil || b != nil && b.RiskBound > worst.RiskBound {
			worst = b
		}
	}
	return worst
}
