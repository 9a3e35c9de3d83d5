package rng

import "fmt"

// MaxCount is the largest number that NegativeBinomial and BirthGeometrics
// return; a larger draw is cut to it. At sizes below 1e-3 and means near the
// largest allowed one draw can exceed any 64-bit count.
const MaxCount = 1 << 62

const (
	maxNegativeMean = 1e12
	maxSize         = 1e12
)

// NegativeBinomial draws from the negative binomial law of the given mean m and
// variance m + m^2/size, for a mean from 0 to 1e12 and a size (which need not
// be whole) from 1e-6 to 1e12. A mean of 0 uses no words. It panics on
// anything else.
//
// A Poisson number whose mean is m times a gamma number of mean 1 (Greenwood &
// Yule 1920, J. R. Stat. Soc. 83:255).
func NegativeBinomial(s *Stream, mean, size float64) int64 {
	if !(mean >= 0 && mean <= maxNegativeMean) {
		panic(fmt.Sprintf("rng: negative binomial mean %v is not from 0 to 1e12", mean))
	}
	if !(size >= minShape && size <= maxSize) {
		panic(fmt.Sprintf("rng: negative binomial size %v is not from 1e-6 to 1e12", size))
	}
	if mean == 0 {
		return 0
	}
	return poissonAny(s, gammaTimes(s, size, mean/size))
}

// poissonAny is Poisson for a mean of any size that a gamma number may give:
// below 2^-1022 it is 0; above 2^53 the counts are rounded to doubles.
func poissonAny(s *Stream, mean float64) int64 {
	switch {
	case mean <= MaxMean:
		return Poisson(s, mean)
	case mean >= MaxCount:
		return MaxCount
	}
	k := poissonReject(s, mean)
	if k >= MaxCount {
		return MaxCount
	}
	return int64(k)
}
