// Package estimate turns the whole-number tallies of a run into what is
// reported: probabilities with their intervals, paired differences, the outcome
// of a case, the verdict against a permit's limit, and intervals that stay
// honest under repeated looks.
//
// It draws no random numbers, reads and writes nothing, and changes no tally.
// It refuses (by panic, as these are bugs of the caller) counts that cannot be:
// more events than trials, negative counts, a confidence outside (0, 1).
// Packages assess, sweep and fit call it, and the reports use its intervals.
package estimate

import (
	"fmt"
	"math"

	"ebbline/pva"
)

// Proportion is count events among of trials, with Wilson's interval. With no
// trials the estimate is NaN and the interval is all of [0, 1].
func Proportion(count, of int64, confidence float64) pva.Proportion {
	low, high := Wilson(count, of, confidence)
	return pva.Proportion{
		Count: count, Of: of,
		Estimate: share(count, of), Low: low, High: high,
	}
}

// share is x/n, NaN if n is 0.
func share(x, n int64) float64 {
	if n == 0 {
		return math.NaN()
	}
	return float64(x) / float64(n)
}

// twoSided is the standard normal quantile z with P(|Z| <= z) = confidence.
func twoSided(confidence float64) float64 {
	if !(confidence > 0 && confidence < 1) {
		panic(fmt.Sprintf("estimate: confidence %v is not between 0 and 1", confidence))
	}
	return math.Sqrt2 * math.Erfinv(confidence)
}

// mustCount panics unless 0 <= x <= n.
func mustCount(x, n int64) {
	if x < 0 || x > n {
		panic(fmt.Sprintf("estimate: %d events in %d trials", x, n))
	}
}
