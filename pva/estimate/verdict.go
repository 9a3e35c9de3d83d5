package estimate

import "ebbline/pva"

// Verdict holds an interval against the permit's limit: within if all of it is
// at or below the limit, above if all of it is above, and otherwise undecided.
// Without a limit there is no verdict.
func Verdict(limit pva.Optional, p pva.Proportion) pva.Verdict {
	switch {
	case !limit.Set:
		return pva.NoVerdict
	case p.High <= limit.Value:
		return pva.Within
	case p.Low > limit.Value:
		return pva.AboveLimit
	}
	return pva.Undecided
}

// VerdictExact is the verdict on a risk known to within err.
func VerdictExact(limit pva.Optional, risk, err float64) pva.Verdict {
	return Verdict(limit, pva.Proportion{Estimate: risk, Low: risk - err, High: risk + err})
}

// ToDecide is about how many replicates in all would settle an undecided
// verdict if the estimate stayed where it is: Wilson's interval leaves the limit
// L outside once (p - L)² > z² L (1-L) / n, and that n is returned, rounded up.
// It is -1 (never) where the estimate equals the limit to within rounding, which
// would take more than 2^62, and where there is no estimate or no limit.
func ToDecide(limit pva.Optional, p pva.Proportion, confidence float64) int64 {
	if !limit.Set {
		return -1
	}
	gap, z := p.Estimate-limit.Value, twoSided(confidence)
	return wholeUp(z * z * limit.Value * (1 - limit.Value) / (gap * gap))
}
