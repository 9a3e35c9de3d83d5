package assess

import (
	"context"
	"fmt"

	"ebbline/pva"
	"ebbline/pva/estimate"
	"ebbline/pva/exact"
	"ebbline/pva/rates"
)

// disagree is the two-sided tail probability below which simulation and exact
// answer cannot both be right: at most one run in 10^9 would be so by chance.
const disagree = 1e-9

// substepsTooCoarse is the shift by sub-steps beyond which holding a simulated
// count against the exact risk would say nothing.
const substepsTooCoarse = 0.01

// addExact puts the exact answer beside the case, its baseline and its options,
// in that order, as long as their work, known beforehand and never timed, stays
// within the budget; and holds each simulated count against it.
func addExact(ctx context.Context, a *pva.Assessment, set []variant, wish ExactWish) error {
	if wish == ExactNever {
		return nil
	}
	left := float64(exact.Cheap)
	option := 0
	for _, v := range set {
		if v.role == aDriver {
			continue
		}
		answer, err := exactOf(ctx, v.model, wish, &left)
		if err != nil {
			return err
		}
		o := a.Outcome
		switch v.role {
		case theCase:
			a.Exact = answer
		case theBaseline:
			a.BaselineExact, o = answer, a.Baseline
		case anOption:
			a.Options[option].Exact, o = answer, a.Options[option].Outcome
			option++
		}
		if answer.Reason != "" {
			continue
		}
		tail := exactTail(o.Risk, answer, rates.BoundSubsteps(v.model))
		if v.role == theCase {
			a.ExactTail = tail
		}
		a.Unreliable = a.Unreliable || tail < disagree
	}
	return nil
}

// exactOf is the exact answer of one model, or the reason for none.
func exactOf(ctx context.Context, m *rates.Model, wish ExactWish, left *float64) (*pva.ExactAnswer, error) {
	ops, ok, reason := exact.Cost(m)
	switch {
	case !ok:
		return &pva.ExactAnswer{Reason: reason}, nil
	case wish == ExactIfCheap && ops > *left:
		return &pva.ExactAnswer{Reason: fmt.Sprintf("it takes more work than is added unasked (about %.0f times 2 seconds); --exact computes it", ops/exact.Cheap)}, nil
	}
	*left -= ops
	return exact.Solve(ctx, m, exact.Options{})
}

// exactTail is the two-sided probability of a simulated count as far off as
// this one, under the exact risk widened by its stated error and by what
// sub-steps may shift.
func exactTail(p pva.Proportion, e *pva.ExactAnswer, s *pva.SubstepBound) float64 {
	slack := e.Error
	if s != nil && s.RiskBound > substepsTooCoarse {
		return 1 // too wide a margin to hold one against the other; warned of
	}
	if s != nil {
		slack += s.RiskBound
	}
	return estimate.BinomialTailWidened(p.Count, p.Of, e.Risk, slack)
}
