// Package assess makes one whole assessment: the case, the same case without
// the take, its options and the runs that show what drives the risk, all on the
// same replicates; the exact answer beside them where it is cheap; the verdict
// and the doubts. The command line, sweeps and tests call it.
//
// A case with uncertain inputs is assessed draw by draw of them (package draws).
package assess

import (
	"context"
	"errors"
	"fmt"
	"runtime"
	"strconv"

	"ebbline/pva"
	"ebbline/pva/ensemble"
	"ebbline/pva/estimate"
	"ebbline/pva/exact"
	"ebbline/pva/rates"
	"ebbline/pva/year"
)

// Options say how to run an assessment; they change nothing that is reported
// but the exact answer beside it.
type Options struct {
	Workers  int              // 0: as many as there are cores
	Progress func(done int64) // replicates finished; called from any goroutine; may be nil
	Exact    ExactWish
}

// ExactWish says whether the exact answer is wanted.
type ExactWish uint8

// The exact answer is added where it is cheap, always where possible, or never.
const (
	ExactIfCheap ExactWish = iota
	ExactAlways
	ExactNever
)

// ErrUncertain is returned by UntilDecided for a case with [[uncertain]] tables.
var ErrUncertain = errors.New("the case marks inputs as uncertain ([[uncertain]]), and more replicates of the same draws may never settle its verdict: assess it with more draws (run.draws, and replicates in proportion) instead")

// Run assesses a case. If the context ends it returns what is complete, with
// the context's error; with nothing complete the assessment is nil.
func Run(ctx context.Context, c *pva.Case, opt Options) (*pva.Assessment, error) {
	if len(c.Uncertain) > 0 {
		return runUncertain(ctx, c, opt)
	}
	set, err := variants(c)
	if err != nil {
		return nil, err
	}
	engine, err := engineOf(c, set)
	if err != nil {
		return nil, err
	}
	tallies, runErr := ensemble.Run(ctx, engine, ensemble.Plan{Replicates: c.Run.Replicates, Workers: opt.workers(), Progress: opt.Progress})
	if tallies == nil {
		return nil, runErr
	}
	if tallies[0].Replicates == 0 {
		return nil, runErr
	}
	a := gather(c, set, tallies)
	a.Substeps = rates.BoundSubsteps(set[0].model)
	if runErr == nil {
		if err := addExact(ctx, a, set, opt.Exact); err != nil {
			runErr = err
		}
	}
	risk, name := a.Outcome.Risk.Estimate, "the simulated risk"
	if known(a.Exact) {
		risk, name = a.Exact.Risk, "the exact risk"
	}
	a.Closed = exact.ClosedForms(set[0].model, risk, name)
	decide(a)
	a.Warnings = append(Warnings(c, set[0].model), runWarnings(a)...)
	return a, runErr
}

// engineOf simulates the variants side by side.
func engineOf(c *pva.Case, set []variant) (*year.Engine, error) {
	models := make([]*rates.Model, len(set))
	for i, v := range set {
		models[i] = v.model
	}
	return year.New(c.Run.Seed, models...)
}

// workers is the number asked for, or one a core.
func (o Options) workers() int {
	if o.Workers > 0 {
		return o.Workers
	}
	return runtime.NumCPU()
}

// role is what a variant is run for.
type role uint8

const (
	theCase role = iota
	theBaseline
	anOption
	aDriver
)

// variant is one of the cases that an assessment simulates side by side.
type variant struct {
	role  role
	name  string
	set   []pva.Setting
	c     *pva.Case
	model *rates.Model
}

// variants lists what is simulated: the case first, the baseline second where
// there is one, then the options, then what drives the risk.
func variants(c *pva.Case) ([]variant, error) {
	out := []variant{{role: theCase, c: c}}
	if permitted, _ := c.Takes(); permitted && c.Run.Baseline {
		out = append(out, variant{role: theBaseline, c: c.Baseline()})
	}
	for _, o := range c.Option {
		oc, faults := c.With(o.Set)
		if len(faults) > 0 {
			return nil, fmt.Errorf("option %s: %w", o.Name, faults)
		}
		out = append(out, variant{role: anOption, name: o.Name, set: o.Set, c: oc})
	}
	for _, d := range drivers(c) {
		dc, faults := c.With(d.set)
		if len(faults) > 0 {
			return nil, fmt.Errorf("without %s: %w", d.name, faults)
		}
		out = append(out, variant{role: aDriver, name: d.name, set: d.set, c: dc})
	}
	for i := range out {
		m, faults := rates.New(out[i].c)
		if len(faults) > 0 {
			if out[i].name != "" {
				return nil, fmt.Errorf("%s: %w", out[i].name, pva.Faults(faults))
			}
			return nil, pva.Faults(faults)
		}
		out[i].model = m
	}
	return out, nil
}

type driver struct {
	name string
	set  []pva.Setting
}

// drivers are the paired runs with one source of chance taken out; the run
// without the take is the baseline.
func drivers(c *pva.Case) []driver {
	var out []driver
	var still []pva.Setting
	if c.Births.YearSD > 0 {
		still = append(still, pva.Setting{Path: "births.year_sd", Value: pva.Num(0)})
	}
	if c.Deaths.YearSD > 0 {
		still = append(still, pva.Setting{Path: "deaths.year_sd", Value: pva.Num(0)})
	}
	if len(still) > 0 {
		out = append(out, driver{"bad weather", still})
	}
	var never []pva.Setting
	for i, k := range c.Catastrophe {
		if k.Prob() > 0 {
			never = append(never, pva.Setting{Path: "catastrophe." + strconv.Itoa(i+1) + ".chance", Value: pva.Num(0)})
		}
	}
	if len(never) > 0 {
		out = append(out, driver{"catastrophes", never})
	}
	return out
}

// gather turns tallies into outcomes and paired differences.
func gather(c *pva.Case, set []variant, tallies []*pva.Tally) *pva.Assessment {
	level := c.Question.Confidence
	a := &pva.Assessment{Case: c, Seed: c.Run.Seed, Replicates: tallies[0].Replicates, Asked: c.Run.Replicates}
	for i, v := range set {
		o := estimate.Outcome(v.c, tallies[i])
		switch v.role {
		case theCase:
			a.Outcome = o
		case theBaseline:
			a.Baseline = o
			added := estimate.Reversed(estimate.Against(tallies[i], level))
			a.Added = &added
		case anOption:
			alt := pva.Alternative{Name: v.name, Case: v.c, Set: v.set, Outcome: o, Difference: estimate.Against(tallies[i], level)}
			if a.Baseline != nil {
				added := againstSecond(tallies[i], level)
				alt.Added = &added
			}
			a.Options = append(a.Options, alt)
		case aDriver:
			a.Drivers = append(a.Drivers, pva.Driver{Without: v.name, Risk: o.Risk, Difference: estimate.Against(tallies[i], level)})
		}
	}
	if a.Baseline != nil {
		a.Drivers = append(a.Drivers, pva.Driver{Without: "the take", Risk: a.Baseline.Risk, Difference: estimate.Reversed(*a.Added)})
	}
	return a
}

// againstSecond is the paired difference of a tally's risk from that of the
// run's second variant, the baseline.
func againstSecond(t *pva.Tally, level float64) pva.Difference {
	last := t.Years[len(t.Years)-1]
	both := last.Fallen - last.OnlyThisNotSecond
	return estimate.Paired(last.OnlyThisNotSecond, last.OnlySecond, both, t.Replicates-both-last.OnlyThisNotSecond-last.OnlySecond, level)
}

// decide holds every risk against the limit: the exact one where there is one.
func decide(a *pva.Assessment) {
	limit, level := a.Case.Question.Limit, a.Case.Question.Confidence
	verdict := func(exact *pva.ExactAnswer, p pva.Proportion) pva.Verdict {
		if exact != nil && exact.Reason == "" {
			return estimate.VerdictExact(limit, exact.Risk, exact.Error)
		}
		return estimate.Verdict(limit, p)
	}
	a.Verdict = verdict(a.Exact, a.Outcome.Risk)
	if a.Verdict == pva.Undecided {
		a.ToDecide = estimate.ToDecide(limit, a.Outcome.Risk, level)
	}
	for i := range a.Options {
		o := &a.Options[i]
		o.Verdict = verdict(o.Exact, o.Outcome.Risk)
	}
}
