package rng

import "fmt"

// BirthGeometrics draws the sum of k independent geometric numbers with
// P(j) = (1-beta) beta^j, j = 0, 1, ...: the births beyond the k survivors of a
// linear birth-death process. k is from 0 to MaxTrials and beta from 0 to
// below 1, with k beta/(1-beta) at most 1e15; with k = 0 or beta = 0 it uses no
// words. It panics on anything else.
//
// The sum is negative binomial of size k, and is drawn as a Poisson number
// whose mean is beta/(1-beta) times a gamma number of shape k. The chain of
// binomials Bin(k, beta), Bin(of that, beta), ... (those that reach 1, 2, ...)
// has the same law, but was two to eight times slower at every k from 50 on
// (BenchmarkBirthGeometrics).
func BirthGeometrics(s *Stream, k int64, beta float64) int64 {
	if !(k > 0 && k <= MaxTrials && beta > 0 && beta < 1) {
		return geometricsEdge(k, beta)
	}
	odds := beta / (1 - beta)
	if float64(float64(k)*odds) > MaxMean {
		panic(fmt.Sprintf("rng: the sum of %d geometrics of parameter %v has a mean above 1e15", k, beta))
	}
	return poissonAny(s, float64(gammaLarge(s, float64(k))*odds))
}

func geometricsEdge(k int64, beta float64) int64 {
	if !(beta >= 0 && beta < 1) {
		panic(fmt.Sprintf("rng: geometric parameter %v is not from 0 to below 1", beta))
	}
	if k < 0 || k > MaxTrials {
		panic(fmt.Sprintf("rng: number of geometrics %d is not from 0 to 2^53", k))
	}
	return 0
}
