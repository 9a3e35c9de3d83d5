package rng

import (
	"fmt"
	"math"
	"math/bits"

	"ebbline/rng/portable"
)

const (
	// MaxTrials is the largest n of Binomial: above it a double does not hold
	// every whole number.
	MaxTrials = 1 << 53

	// Crossings, measured; see BenchmarkBinomialWays.
	binomialWordsTo   = 6    // up to here one word a trial
	binomialFewTo     = 128  // up to here the ways of few trials
	binomialDigitsTo  = 447  // up to here by the digits of p
	binomialInverseTo = 0.25 // below this np no other way is quicker
	binomialScatterTo = 0.25 // below this np^2 two hits seldom meet, quicker than digits
	binomialMeetTo    = 0.6  // the same against rejection

	// binomialLeast is the smallest p whose digits all lie within a word of 64.
	binomialLeast = 0x1p-11
)

// Binomial draws the number of successes in n independent trials of chance p,
// for n from 0 to MaxTrials and p from 0 to 1. With n = 0, p = 0 or p = 1 it
// uses no words. It panics on anything else.
//
// With q the smaller of p and 1-p: where a success is so rare that there is seldom
// one it inverts the distribution function; of many trials of which few succeed it
// scatters Poisson hits; up to 447 trials it compares with p digit by binary digit
// what stands for a uniform number of each; beyond, it uses Hormann's transformed
// rejection.
func Binomial(s *Stream, n int64, p float64) int64 {
	switch {
	case !(p > 0 && p < 1 && n > 0 && n <= MaxTrials):
		return binomialEdge(n, p)
	case n > binomialFewTo:
		if p <= 0.5 {
			return binomialMany(s, n, p)
		}
		return n - binomialMany(s, n, 1-p) // 1 - p is exact
	case p < binomialLeast:
		return binomialInverse(s, n, p)
	case n <= binomialWordsTo:
		return binomialWords(s, n, p)
	case float64(float64(n)*p) < binomialInverseTo:
		return binomialInverse(s, n, p)
	}
	return binomialDigits(s, n, p)
}

func binomialEdge(n int64, p float64) int64 {
	switch {
	case !(p >= 0 && p <= 1):
		panic(fmt.Sprintf("rng: binomial chance %v is not from 0 to 1", p))
	case n < 0 || n > MaxTrials:
		panic(fmt.Sprintf("rng: binomial number of trials %d is not from 0 to 2^53", n))
	case p == 1:
		return n
	}
	return 0
}

// binomialMany is for n > 128 and p <= 1/2. Digits come only where p is above
// 0.02, and rejection only where np is above 16.
func binomialMany(s *Stream, n int64, p float64) int64 {
	np := float64(float64(n) * p)
	switch {
	case np < binomialInverseTo:
		return binomialInverse(s, n, p)
	case float64(np*p) < binomialScatterTo:
		return binomialScatter(s, n, p)
	case n <= binomialDigitsTo:
		return binomialDigits(s, n, p)
	case float64(np*p) < binomialMeetTo:
		return binomialScatter(s, n, p)
	}
	return binomialReject(s, n, p)
}

// binomialWords gives every trial a uniform word and counts those below p, for
// p from 2^-11 to below 1: p is then a whole multiple of 2^-64, and the chance
// is p exactly.
func binomialWords(s *Stream, n int64, p float64) int64 {
	limit := uint64(float64(p * 0x1p64))
	x := int64(0)
	for ; n > 0; n-- {
		if s.pcg.Uint64() < limit {
			x++
		}
	}
	return x
}

// binomialDigits does the same, but draws the uniform numbers a binary digit at
// a time: at a digit 1 of p the trials with digit 0 are successes and leave, at
// a digit 0 those with digit 1 are failures and leave. As long as more than 32
// trials are undecided only their number is kept; then a bit of a mask stands
// for each, and a word holds two digits of all; and when the mask must be nearly
// empty, those left get the rest of their digits in one word. A trial that agrees
// with p to the end is not below it.
func binomialDigits(s *Stream, n int64, p float64) int64 {
	digits := uint64(float64(p * 0x1p64))
	x := int64(0)
	for n > 32 {
		h := halves(s, n)
		x += (n - h) & (int64(digits) >> 63)
		n = h
		digits <<= 1
	}
	open := uint64(1)<<uint(n) - 1
	for i := bits.Len64(uint64(n)); i > 0; i -= 2 {
		w := s.pcg.Uint64()
		one := uint64(int64(digits) >> 63) // all bits set at a digit 1
		x += int64(bits.OnesCount64(open &^ w & one))
		open &= w ^ ^one
		w >>= 32
		one = uint64(int64(digits<<1) >> 63)
		x += int64(bits.OnesCount64(open &^ w & one))
		open &= w ^ ^one
		digits <<= 2
	}
	for ; open != 0; open &= open - 1 {
		if s.pcg.Uint64() < digits {
			x++
		}
	}
	return x
}

// binomialInverse inverts the distribution function from 0 upwards, for p <=
// 1/2 and small np: it subtracts the probabilities of 1, 2, ... from the chance
// of more than 0, which keeps its relative accuracy however small it is.
func binomialInverse(s *Stream, n int64, p float64) int64 {
	nf := float64(n)
	w := s.pcg.Uint64()
	u := float64(w) * 0x1p-64
	if u > float64(nf*p) { // the chance of any success is below np
		return 0
	}
	u = s.fine(w)
	l := float64(nf * portable.Log1p(-p))
	return min(n, walkUp(u, -portable.Expm1(l), portable.Exp(l), nf+1, p/(1-p)))
}

// walkUp returns the smallest k with P(more than k) <= u, given more = P(more
// than 0), at = P(0), and P(k) = P(k-1) (top-k)/k ratio; top = +Inf stands for
// P(k) = P(k-1) ratio/k. No law that comes here has its mean above 10, so that
// 150 lies far beyond the last place of u; where rounding leaves more above 0 for
// ever, it ends there.
func walkUp(u, more, at, top, ratio float64) int64 {
	k := 0.0
	for u < more && k < 150 {
		k++
		step := ratio
		if top < math.MaxFloat64 {
			step = float64(ratio * (top - k))
		}
		at = float64(at*step) / k
		more -= at
	}
	return int64(k)
}

// binomialReject is algorithm BTRS of Hormann (1993, J. Stat. Comput. Simul.
// 46:101), valid for p <= 1/2 and np >= 10. It departs from the source in the last
// step only: the ratio of the probabilities of k and of the mode is computed
// by Loader's form.
func binomialReject(s *Stream, n int64, p float64) int64 {
	nf := float64(n)
	h := binomialHat(nf, p)
	for {
		u := float64(int64(s.pcg.Uint64())) * 0x1p-64
		v := (float64(int64(s.pcg.Uint64()>>12)) + 0.5) * 0x1p-52
		us := 0.5 - math.Abs(u)
		k := math.Floor(float64((float64(2*h.a)/us+h.b)*u) + h.c)
		if us >= 0.07 && v <= h.vr {
			return int64(k)
		}
		if us == 0 || k < 0 || k > nf {
			continue
		}
		m := math.Floor(float64((nf + 1) * p))
		v = float64(v*h.binomialScale()) / (h.a/float64(us*us) + h.b)
		if middle, margin := binomialBounds(k, m, nf, p); margin < 1 {
			if v <= float64(middle*(1-margin)) {
				return int64(k)
			}
			if float64(v*(1-margin)) > middle {
				continue
			}
		}
		if v <= binomialRatio(k, m, nf, p) {
			return int64(k)
		}
	}
}

// binomialBounds encloses the ratio of the probabilities of k and of the mode m:
// it lies between middle (1 - margin) and middle / (1 - margin) if the margin is
// below 1. By the normal law with its first correction for skewness (Edgeworth;
// Feller 1971, An Introduction to Probability Theory, vol. 2, ch. XVI) the
// logarithm of a probability is, but for a constant,
//
//	-d^2/(2 v) + (1-2p) (d^3/(6 v^2) - d/(2 v)), d = k - np, v = np (1-p),
//
// and up to 3.2 standard deviations out, at the n and p that come here, the ratio
// differs from that by less than (0.1 + 0.3 z^2 + 0.1 z^4)/v, z = d/sqrt(v), and
// by 0.76 of it at most where its test has looked. Further out there is no bound.
func binomialBounds(k, m, n, p float64) (middle, margin float64) {
	np := float64(n * p)
	v := float64(np * (1 - p))
	d, e := k-np, m-np
	z2 := float64(d*d) / v
	if z2 > 10.24 {
		return 0, 1
	}
	e2 := float64(e*e) / v
	bend := float64((1 - float64(2*p)) / v * (float64(float64(d*z2)-float64(e*e2))/6 - float64(0.5*(d-e))))
	return portable.Exp(bend - float64(0.5*(z2-e2))), (0.1 + float64(z2*(0.3+float64(0.1*z2)))) / v
}

// hat holds the constants of a transformed rejection in Hormann's letters:
// k = floor((2a/(1/2-|u|) + b) u + c), and vr, the bound of the quick test.
type hat struct{ a, b, c, vr, sd float64 }

func binomialHat(n, p float64) hat {
	np := float64(n * p)
	sd := math.Sqrt(float64(np * (1 - p)))
	b := 1.15 + float64(2.53*sd)
	a := -0.0873 + float64(0.0248*b) + float64(0.01*p)
	return hat{a, b, np + 0.5, 0.92 - 4.2/b, sd}
}

// binomialScale is Hormann's alpha.
func (h hat) binomialScale() float64 { return float64((2.83 + 5.1/h.b) * h.sd) }

// binomialRatio is P(k)/P(m) of Binomial(n, p) for 0 < m < n.
func binomialRatio(k, m, n, p float64) float64 {
	np := float64(n * p)
	nq := n - np
	shape := func(k float64) float64 {
		return stirlingTail(k) + stirlingTail(n-k) + deviance(k, np, k-np) + deviance(n-k, nq, np-k)
	}
	if k == 0 || k == n {
		// P(m) in full against q^n or p^n
		l := float64(n * portable.Log1p(-p))
		if k == n {
			l = float64(n * portable.Log(p))
		}
		pm := float64(math.Sqrt(n/float64(2*math.Pi*float64(m*(n-m)))) * portable.Exp(stirlingTail(n)-shape(m)))
		return portable.Exp(l) / pm
	}
	return float64(math.Sqrt(float64(m*(n-m))/float64(k*(n-k))) * portable.Exp(shape(m)-shape(k)))
}
