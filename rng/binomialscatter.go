package rng

import (
	"math"

	"ebbline/rng/portable"
)

// binomialScatter draws a binomial number whose successes are few among many
// trials, for 0 < p <= 1/2. Let every trial be hit a Poisson number of times, of
// mean -ln(1-p): it is hit at all with chance p, each on its own. The hits of all
// trials together are Poisson too, and fall on the trials evenly, so that the
// number of trials hit is the number of places taken by so many balls thrown
// into n boxes (Feller 1968, An Introduction to Probability Theory, vol. 1, ch.
// II.5 and VI). That is nearly always the number of balls itself, which one word
// settles; from the first ball that meets a taken box on, every ball is thrown.
func binomialScatter(s *Stream, n int64, p float64) int64 {
	nf := float64(n)
	hits := poissonAny(s, float64(nf*-portable.Log1p(-p)))
	if hits < 2 {
		return hits
	}
	h := float64(hits)
	u := s.Float64()
	// The chance that no two meet is above 1 - h(h-1)/(2n).
	if u <= 1-float64(h*(h-1))/(2*nf) {
		return hits
	}
	apart, taken := 1.0, 0.0 // chance that the first `taken` balls lie apart
	for ; taken < h && u <= apart; taken++ {
		apart *= 1 - taken/nf
	}
	if u <= apart {
		return hits
	}
	// Ball number `taken` is the first that met a taken box.
	balls := taken
	for taken--; balls < h; balls++ {
		if float64(s.Float64()*nf) >= taken {
			taken++
		}
	}
	return int64(math.Min(taken, nf))
}
