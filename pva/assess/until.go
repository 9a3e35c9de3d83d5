package assess

import (
	"context"
	"errors"

	"ebbline/pva"
	"ebbline/pva/ensemble"
	"ebbline/pva/estimate"
	"ebbline/pva/exact"
	"ebbline/pva/rates"
)

// Settled is an assessment whose replicates were added until its verdict was
// settled. The intervals of its probabilities, and of differences of risks, are
// of confidence sequences (estimate.Sequence): each holds however often one looks
// and whenever one stops.
type Settled struct {
	*pva.Assessment
	Looks []Look
	// Decided is false if the most replicates allowed did not settle it.
	Decided bool
}

// Look is what was seen after so many replicates.
type Look struct {
	Risk    pva.Proportion
	Verdict pva.Verdict
}

// MostUntil is the number of replicates at which UntilDecided stops where none
// is given, in times those of the case.
const MostUntil = 256

// ErrNoLimit is returned for a case without a limit, which has no verdict.
var ErrNoLimit = errors.New("the case states no limit (question.limit), so that there is no verdict to wait for")

// UntilDecided assesses a case, doubling its replicates until the verdict is
// settled or there are most of them (0: MostUntil times those of the case). An
// exact answer that is added anyhow settles it at the first look. Batches are
// whole blocks, so that the first has up to 63 replicates more than the case
// asks for. If the context ends the assessment is of what is complete, with the
// context's error; nil if that is nothing.
func UntilDecided(ctx context.Context, c *pva.Case, opt Options, most int64) (*Settled, error) {
	if len(c.Uncertain) > 0 {
		return nil, ErrUncertain
	}
	if !c.Question.Limit.Set {
		return nil, ErrNoLimit
	}
	if most <= 0 {
		most = MostUntil * c.Run.Replicates
	}
	set, err := variants(c)
	if err != nil {
		return nil, err
	}
	engine, err := engineOf(c, set)
	if err != nil {
		return nil, err
	}
	s := &Settled{}
	var tallies []*pva.Tally
	var exactly *pva.Assessment // the first look, with the exact answers
	n, asked := int64(0), int64(0)
	batch := blocks(c.Run.Replicates)
	for {
		asked = n + batch
		plan := ensemble.Plan{First: n, Replicates: batch, Workers: opt.workers()}
		if opt.Progress != nil {
			before := n
			plan.Progress = func(done int64) { opt.Progress(before + done) }
		}
		more, runErr := ensemble.Run(ctx, engine, plan)
		if more == nil || len(more) > 0 && more[0].Replicates == 0 {
			if tallies == nil || ctx.Err() == nil {
				return nil, runErr
			}
			err = runErr
			break
		}
		if tallies == nil {
			tallies = more
		} else {
			for i := range tallies {
				tallies[i].Merge(more[i])
			}
		}
		n += more[0].Replicates
		last := tallies[0].Years[c.Question.Horizon-1]
		risk := sequence(pva.Proportion{Count: last.Fallen, Of: n}, c.Question.Confidence)
		s.Looks = append(s.Looks, Look{risk, estimate.Verdict(c.Question.Limit, risk)})
		if err = runErr; err != nil {
			break
		}
		if exactly == nil {
			exactly = gather(c, set, tallies)
			if err = addExact(ctx, exactly, set, opt.Exact); err != nil {
				break
			}
		}
		if s.Looks[len(s.Looks)-1].Verdict != pva.Undecided || known(exactly.Exact) || n >= most {
			break
		}
		batch = max(ensemble.Lanes, blocks(min(n, most-n)))
	}
	s.Assessment = s.state(c, set, tallies, exactly)
	s.Asked = asked
	if err == nil {
		s.Asked = s.Replicates
	}
	s.Warnings = append(Warnings(c, set[0].model), runWarnings(s.Assessment)...)
	if err == nil && !s.Decided {
		s.Warnings = append(s.Warnings, pva.Warning{Key: "run.replicates", Text: grouped.Sprintf("stopped undecided at %d replicates, the most that are added; to go on, begin with more (--replicates)", s.Replicates)})
	}
	return s, err
}

// blocks is a number of replicates rounded up to whole blocks.
func blocks(n int64) int64 { return (n + ensemble.Lanes - 1) / ensemble.Lanes * ensemble.Lanes }

func known(e *pva.ExactAnswer) bool { return e != nil && e.Reason == "" }

// state makes the assessment of all replicates, with the intervals of the
// sequence, and with the exact answers of the first look.
func (s *Settled) state(c *pva.Case, set []variant, tallies []*pva.Tally, first *pva.Assessment) *pva.Assessment {
	a := gather(c, set, tallies)
	a.Substeps = rates.BoundSubsteps(set[0].model)
	atEveryLook(a)
	if first != nil {
		a.Exact, a.BaselineExact = first.Exact, first.BaselineExact
		held := func(p pva.Proportion, e *pva.ExactAnswer, m *rates.Model) float64 {
			if !known(e) {
				return 1
			}
			return exactTail(p, e, rates.BoundSubsteps(m))
		}
		option := 0
		for _, v := range set {
			tail := 1.0
			switch v.role {
			case theCase:
				tail = held(a.Outcome.Risk, a.Exact, v.model)
				if known(a.Exact) {
					a.ExactTail = tail
				}
			case theBaseline:
				tail = held(a.Baseline.Risk, a.BaselineExact, v.model)
			case anOption:
				a.Options[option].Exact = first.Options[option].Exact
				tail = held(a.Options[option].Outcome.Risk, a.Options[option].Exact, v.model)
				option++
			}
			a.Unreliable = a.Unreliable || tail < disagree
		}
	}
	a.Sequential = true
	risk, name := a.Outcome.Risk.Estimate, "the simulated risk"
	if known(a.Exact) {
		risk, name = a.Exact.Risk, "the exact risk"
	}
	a.Closed = exact.ClosedForms(set[0].model, risk, name)
	decide(a)
	if a.ToDecide != 0 {
		a.ToDecide = estimate.ToDecideAtEveryLook(c.Question.Limit, a.Outcome.Risk, c.Question.Confidence)
	}
	s.Decided = a.Verdict != pva.Undecided
	return a
}

// atEveryLook gives an assessment the intervals of confidence sequences.
func atEveryLook(a *pva.Assessment) {
	level := a.Case.Question.Confidence
	difference := func(d *pva.Difference) {
		if d != nil {
			*d = estimate.PairedAtEveryLook(*d, level)
		}
	}
	estimate.AtEveryLook(a.Outcome, level)
	if a.Baseline != nil {
		estimate.AtEveryLook(a.Baseline, level)
	}
	difference(a.Added)
	for i := range a.Options {
		o := &a.Options[i]
		estimate.AtEveryLook(o.Outcome, level)
		difference(&o.Difference)
		difference(o.Added)
	}
	for i := range a.Drivers {
		d := &a.Drivers[i]
		d.Risk = sequence(d.Risk, level)
		difference(&d.Difference)
	}
}

// sequence is a proportion with the interval of a confidence sequence.
func sequence(p pva.Proportion, confidence float64) pva.Proportion {
	s := estimate.NewSequence(confidence)
	s.Update(p.Count, p.Of)
	return s.Proportion()
}
