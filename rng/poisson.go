package rng

import (
	"fmt"
	"math"

	"ebbline/rng/portable"
)

const (
	// MaxMean is the largest mean of Poisson.
	MaxMean = 1e15

	// poissonRejectFrom is the mean from which on rejection takes over from the
	// sum of parts. Measured; see the benchmarks.
	poissonRejectFrom = 1024
)

// Poisson draws from the Poisson law of the given mean, from 0 to MaxMean. A
// mean of 0 uses no words. It panics on anything else.
//
// Below 1024 it adds independent parts of mean 128 (several), 8j, i/16 and what
// is left, from tables; above, it uses Hormann's transformed rejection.
func Poisson(s *Stream, mean float64) int64 {
	if !(mean > 0 && mean <= MaxMean) {
		if mean == 0 {
			return 0
		}
		panic(fmt.Sprintf("rng: Poisson mean %v is not from 0 to 1e15", mean))
	}
	if mean < poissonRejectFrom {
		return poissonParts(s, mean)
	}
	return int64(poissonReject(s, mean))
}

// poissonParts: the sum of independent Poisson numbers is a Poisson number of
// the summed mean. The parts are whole multiples of 1/16 and come from alias
// tables; the rest is below 1/16, exact, and seldom more than 0.
func poissonParts(s *Stream, mean float64) int64 {
	t := int(float64(mean * 16))
	rest := mean - float64(float64(t)*(1.0/16)) // exact
	x := int64(0)
	for ; t >= 2048; t -= 2048 {
		x += poissonCoarse[16].draw(s.pcg.Uint64())
	}
	if t >= 128 {
		x += poissonCoarse[t>>7].draw(s.pcg.Uint64())
	}
	if t &= 127; t > 0 {
		x += poissonFine[t].draw(s.pcg.Uint64())
	}
	if rest > 0 {
		w := s.pcg.Uint64()
		if w <= uint64(float64(rest*0x1p64)) { // P(more than 0) < rest
			x += poissonRest(s, w, rest)
		}
	}
	return x
}

// poissonRest inverts the distribution function from 0 upwards.
func poissonRest(s *Stream, word uint64, mean float64) int64 {
	u := s.fine(word)
	return walkUp(u, -portable.Expm1(-mean), portable.Exp(-mean), math.Inf(1), mean)
}

// poissonReject is algorithm PTRS of Hormann (1993, Insur. Math. Econ. 12:39),
// for means of 10 and more. It departs from the source in two things: the
// probability of k is computed by Loader's form, and the constant of the hat is
// 1.124 in place of 1.1239, with which the hat is too low by 4 parts in a million
// near a mean of 1024.
func poissonReject(s *Stream, mean float64) float64 {
	h := poissonHat(mean)
	for {
		u := float64(int64(s.pcg.Uint64())) * 0x1p-64
		v := (float64(int64(s.pcg.Uint64()>>12)) + 0.5) * 0x1p-52
		us := 0.5 - math.Abs(u)
		k := math.Floor(float64((float64(2*h.a)/us+h.b)*u) + h.c)
		if us >= 0.07 && v <= h.vr {
			return k
		}
		if us == 0 || k < 0 || us < 0.013 && v > us {
			continue
		}
		v = float64(v*h.poissonScale()) / (h.a/float64(us*us) + h.b)
		if v <= poissonProb(k, mean) {
			return k
		}
	}
}

func poissonHat(mean float64) hat {
	b := 0.931 + float64(2.53*math.Sqrt(mean))
	a := -0.059 + float64(0.02483*b)
	return hat{a: a, b: b, c: mean + 0.43, vr: 0.9277 - 3.6224/(b-2)}
}

// poissonScale is Hormann's 1/alpha.
func (h hat) poissonScale() float64 { return 1.124 + 1.1328/(h.b-3.4) }

// poissonProb is the probability of whole k >= 0.
func poissonProb(k, mean float64) float64 {
	if k == 0 {
		return portable.Exp(-mean)
	}
	return portable.Exp(-stirlingTail(k)-deviance(k, mean, k-mean)) / math.Sqrt(float64(2*math.Pi*k))
}
