package assess

import (
	"context"
	"fmt"
	"math"
	"sync"
	"sync/atomic"

	"ebbline/pva"
	"ebbline/pva/estimate"
	"ebbline/pva/exact"
)

// uncertainty gathers the draws that are complete.
func (r *drawnRun) uncertainty(done int) *pva.Uncertainty {
	u := &pva.Uncertainty{Draws: done, Asked: r.design.Draws(), Each: r.each, Redrawn: r.design.Redrawn()}
	for _, in := range r.design.Inputs {
		u.Inputs = append(u.Inputs, pva.UncertainInput{Key: in.Key, Law: in.Words, Value: in.Value, Mean: in.Mean, SD: in.SD, Outside: in.Outside})
	}
	for d := range done {
		u.Values = append(u.Values, r.design.Values(d))
		if r.unsolved[d] {
			u.Unsolved++
		}
	}
	for v := range r.set {
		one := pva.DrawnRisk{Name: r.set[v].name, Fallen: r.fallen[v][:done], ExactReason: "not asked for"}
		switch r.set[v].role {
		case theCase:
			u.Case = one
		case theBaseline:
			u.Baseline = &one
		case anOption:
			u.Options = append(u.Options, one)
		}
	}
	return u
}

// drawnRisks calls f with each variant that has a risk over the draws.
func (r *drawnRun) drawnRisks(u *pva.Uncertainty, f func(v int, risk *pva.DrawnRisk)) {
	option := 0
	for v := range r.set {
		switch r.set[v].role {
		case theCase:
			f(v, &u.Case)
		case theBaseline:
			f(v, u.Baseline)
		case anOption:
			f(v, &u.Options[option])
			option++
		}
	}
}

// figures fills in what follows from the counts and the exact risks.
func (r *drawnRun) figures(u *pva.Uncertainty, c *pva.Case) {
	limit, level := c.Question.Limit, c.Question.Confidence
	r.drawnRisks(u, func(_ int, risk *pva.DrawnRisk) { estimate.DrawnRisk(risk, u.Each, limit, level) })
	outcome := u.Case.Exact
	if len(outcome) == 0 {
		for _, x := range u.Case.Fallen {
			outcome = append(outcome, float64(x))
		}
	}
	for j, link := range estimate.PartialRanks(u.Values, outcome, level) {
		u.Inputs[j].Link = link
	}
}

// addExact puts exact answers beside the simulated ones: that at the stated
// values, and those of every draw of the case, its baseline and its options, in
// this order, as long as their work stays within the budget. What the draws will
// take is judged, before they are begun, by what the stated values take.
func (r *drawnRun) addExact(ctx context.Context, a *pva.Assessment, workers int, wish ExactWish) error {
	if wish == ExactNever {
		return nil
	}
	left := float64(exact.Cheap)
	u := a.Uncertainty
	var err error
	if u.Stated, err = exactOf(ctx, r.set[0].model, wish, &left); err != nil {
		return err
	}
	r.drawnRisks(u, func(v int, risk *pva.DrawnRisk) {
		if err == nil {
			err = r.exactDraws(ctx, v, risk, workers, wish, &left)
		}
	})
	if err != nil {
		return err
	}
	r.drawnRisks(u, func(v int, risk *pva.DrawnRisk) {
		if len(risk.Exact) == 0 {
			return
		}
		tail := r.exactTail(v, risk)
		if v == 0 {
			a.ExactTail = tail
		}
		a.Unreliable = a.Unreliable || tail < disagree
	})
	return nil
}

// dearest is how many times the work of the stated values a draw may take.
const dearest = 20

// exactDraws solves every draw of a variant, or says why not.
func (r *drawnRun) exactDraws(ctx context.Context, v int, risk *pva.DrawnRisk, workers int, wish ExactWish, left *float64) error {
	ops, ok, reason := exact.Cost(r.set[v].model)
	total := ops * float64(len(risk.Fallen))
	switch {
	case !ok:
		risk.ExactReason = reason
		return nil
	case wish == ExactIfCheap && total > *left:
		risk.ExactReason = fmt.Sprintf("the draws together take more work than is added unasked (about %.0f times 2 seconds); --exact computes them", total/exact.Cheap)
		return nil
	case total > exact.Most:
		risk.ExactReason = fmt.Sprintf("the draws together take too much work (about %.0f times what is allowed): give fewer draws", math.Ceil(total/exact.Most))
		return nil
	}
	*left -= total
	answers := make([]*pva.ExactAnswer, len(risk.Fallen))
	errs := make([]error, len(answers))
	var next atomic.Int64
	var wg sync.WaitGroup
	for range workers {
		wg.Go(func() {
			for ctx.Err() == nil {
				d := int(next.Add(1)) - 1
				if d >= len(answers) {
					return
				}
				models, err := r.models(d)
				if err == nil {
					answers[d], err = exact.Solve(ctx, models[v], exact.Options{Most: math.Min(exact.Most, dearest*math.Max(ops, 1e7))})
				}
				errs[d] = err
			}
		})
	}
	wg.Wait()
	if err := ctx.Err(); err != nil {
		risk.ExactReason = "interrupted"
		return err
	}
	risks := make([]float64, len(answers))
	for d, e := range answers {
		switch {
		case errs[d] != nil:
			return errs[d]
		case e.Reason != "":
			risk.ExactReason = fmt.Sprintf("draw %d has none: %s", d+1, e.Reason)
			return nil
		}
		risks[d] = e.Risk
		risk.ExactError = math.Max(risk.ExactError, e.Error)
	}
	risk.Exact, risk.ExactReason = risks, ""
	return nil
}

// exactTail is the two-sided probability of a pooled count as far off as this
// one under the exact risks of the draws. Counts of draws with different risks
// add up to one with lighter tails than the binomial of their mean risk has
// (Hoeffding 1956, Ann. Math. Stat. 27:713), so that the binomial tail is never
// too small.
func (r *drawnRun) exactTail(v int, risk *pva.DrawnRisk) float64 {
	mean, _, _ := estimate.BetweenDraws(risk.Exact, 0.5)
	var count int64
	for _, x := range risk.Fallen {
		count += x
	}
	off := risk.ExactError
	if b := r.worstSubsteps(len(risk.Fallen)); b != nil && v == 0 {
		off += b.RiskBound
	} else if b != nil && b.Substeps > 0 {
		off = 1 // sub-steps of the other variants are not kept
	}
	return estimate.BinomialTailWidened(count, int64(len(risk.Fallen))*r.each, mean, math.Min(1, off))
}
