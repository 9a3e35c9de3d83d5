package rng

import "fmt"

// BinomialLaw, PoissonLaw and NegativeBinomialLaw are laws whose parameters
// have been checked, for numbers that come from outside. Drawing from one can't
// fail. The zero values draw 0.
type (
	BinomialLaw struct {
		n int64
		p float64
	}
	PoissonLaw          struct{ mean float64 }
	NegativeBinomialLaw struct{ mean, size float64 }
)

// NewBinomial returns the law of the successes in n trials of chance p, or an
// error unless n is from 0 to MaxTrials and p from 0 to 1.
func NewBinomial(n int64, p float64) (BinomialLaw, error) {
	if n < 0 || n > MaxTrials {
		return BinomialLaw{}, fmt.Errorf("binomial law: %d trials (want 0 to 2^53)", n)
	}
	if !(p >= 0 && p <= 1) {
		return BinomialLaw{}, fmt.Errorf("binomial law: %v is not a chance (want 0 to 1)", p)
	}
	return BinomialLaw{n, p}, nil
}

// Draw draws from the law as Binomial does.
func (l BinomialLaw) Draw(s *Stream) int64 { return Binomial(s, l.n, l.p) }

// NewPoisson returns the Poisson law, or an error unless the mean is from 0 to
// MaxMean.
func NewPoisson(mean float64) (PoissonLaw, error) {
	if !(mean >= 0 && mean <= MaxMean) {
		return PoissonLaw{}, fmt.Errorf("poisson law: mean %v (want 0 to 1e15)", mean)
	}
	return PoissonLaw{mean}, nil
}

// Draw draws from the law as Poisson does.
func (l PoissonLaw) Draw(s *Stream) int64 { return Poisson(s, l.mean) }

// NewNegativeBinomial returns the negative binomial law, or an error unless the
// mean is from 0 to 1e12 and the size from 1e-6 to 1e12.
func NewNegativeBinomial(mean, size float64) (NegativeBinomialLaw, error) {
	if !(mean >= 0 && mean <= maxNegativeMean) {
		return NegativeBinomialLaw{}, fmt.Errorf("negative binomial law: mean %v (want 0 to 1e12)", mean)
	}
	if !(size >= minShape && size <= maxSize) {
		return NegativeBinomialLaw{}, fmt.Errorf("negative binomial law: size %v (want 1e-6 to 1e12)", size)
	}
	return NegativeBinomialLaw{mean, size}, nil
}

// Draw draws from the law as NegativeBinomial does.
func (l NegativeBinomialLaw) Draw(s *Stream) int64 {
	if l == (NegativeBinomialLaw{}) {
		return 0
	}
	return NegativeBinomial(s, l.mean, l.size)
}
