package estimate

import (
	"fmt"
	"math"

	"ebbline/pva"
)

// Sequence is a confidence sequence for a chance: intervals that hold at every
// number of trials at once, so that looking as often as one likes, and stopping
// when one likes what one sees, leaves the chance that any of them ever misses
// the truth at or below 1 - confidence.
//
// The interval is the set of p at which the likelihood of the trials under a
// beta(1/2, 1/2) mixture is below 1/(1 - confidence) times that under p. That
// ratio is a martingale of mean 1 under the true p, so by Ville's inequality it
// ever gets there with probability at most 1 - confidence (H. Robbins 1970, Ann.
// Math. Stat. 41:1397-1409; S. R. Howard, A. Ramdas, J. McAuliffe & J. Sekhon
// 2021, Ann. Stat. 49:1055-1080). The weights 1/2 lose little at small chances,
// where limits of permits lie.
//
// Trials must be independent. An interval depends on the totals alone, not on
// the looks taken before; the intersection of all so far would be valid too, but
// would make the answer depend on how a run was cut, so it is not used.
type Sequence struct {
	x, n       int64
	confidence float64
}

// NewSequence starts a sequence at a confidence in (0, 1).
func NewSequence(confidence float64) *Sequence {
	twoSided(confidence)
	return &Sequence{confidence: confidence}
}

// Update adds trials and the successes among them.
func (s *Sequence) Update(successes, trials int64) {
	mustCount(successes, trials)
	if s.n += trials; s.n < 0 {
		panic(fmt.Sprintf("estimate: more than 2^63 trials after adding %d", trials))
	}
	s.x += successes
}

// Interval is the interval of all trials so far; [0, 1] before the first.
func (s *Sequence) Interval() (low, high float64) {
	low, high = 0, 1
	if s.n == 0 {
		return low, high
	}
	reach := s.reach()
	mle := share(s.x, s.n)
	if s.x > 0 {
		low = bisect(0, mle, func(p float64) bool { return divergence(s.x, s.n, p) >= reach })
	}
	if s.x < s.n {
		// Bisected in 1 - p, so that a limit near 1 is as accurate as one near 0.
		high = 1 - bisect(0, 1-mle, func(q float64) bool { return divergence(s.n-s.x, s.n, q) >= reach })
	}
	return low, high
}

// Proportion is the estimate so far with the interval of the sequence.
func (s *Sequence) Proportion() pva.Proportion {
	low, high := s.Interval()
	return pva.Proportion{Count: s.x, Of: s.n, Estimate: share(s.x, s.n), Low: low, High: high}
}

// reach is the divergence from the observed share at which p leaves the
// interval: ln(1/alpha) less the log mixture ratio at the observed share,
//
//	ln B(x+1/2, n-x+1/2) - ln B(1/2, 1/2) - x ln(x/n) - (n-x) ln((n-x)/n),
//
// written with Stirling's formula for the three gammas, so that the large terms
// are gone before any number is computed.
func (s *Sequence) reach() float64 {
	x, y, n := float64(s.x), float64(s.n-s.x), float64(s.n)
	ratio := halfStep(x) + halfStep(y) - n*math.Log1p(1/n) - 0.5*math.Log(n+1) +
		0.5*math.Log(2*math.Pi) - math.Log(math.Pi) +
		stirlingRest(x+0.5) + stirlingRest(y+0.5) - stirlingRest(n+1)
	return -math.Log1p(-s.confidence) - ratio
}

// halfStep is x ln((x + 1/2)/x), 0 at 0.
func halfStep(x float64) float64 {
	if x == 0 {
		return 0
	}
	return x * math.Log1p(0.5/x)
}
