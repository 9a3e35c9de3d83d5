package rates

import (
	"fmt"
	"math"
	"strconv"

	"ebbline/rng/portable"
)

// LogNormal is a rate with a given mean and standard deviation between years:
// Mean * exp(Sigma e - Sigma^2/2), e standard normal (Aitchison & Brown 1957).
type LogNormal struct{ Mean, Sigma float64 }

// NewLogNormal matches mean and sd exactly: Sigma^2 = ln(1 + (sd/mean)^2).
func NewLogNormal(mean, sd float64) LogNormal {
	if sd == 0 || mean == 0 {
		return LogNormal{Mean: mean}
	}
	cv := sd / mean
	return LogNormal{mean, math.Sqrt(portable.Log1p(cv * cv))}
}

// Draw is the rate of a year with standard normal e.
func (l LogNormal) Draw(e float64) float64 {
	if l.Sigma == 0 {
		return l.Mean
	}
	return l.Mean * l.Factor(e)
}

// Factor is exp(Sigma e - Sigma^2/2), a factor of mean 1.
func (l LogNormal) Factor(e float64) float64 {
	return portable.Exp(float64(l.Sigma*e) - float64(float64(l.Sigma*l.Sigma)/2))
}

// Fraction is a fraction with a given mean and standard deviation between
// years: logit-normal, 1/(1 + exp(-(U + V e))) (Aitchison & Shen 1980). V = 0
// is the constant Mean.
type Fraction struct{ Mean, U, V float64 }

// NewFraction matches mean and sd to 1e-10 by adaptive quadrature. It refuses
// sd^2 >= mean (1-mean), which no law on 0 to 1 can have.
func NewFraction(mean, sd float64) (Fraction, error) {
	if sd == 0 {
		return Fraction{Mean: mean}, nil
	}
	if sd*sd >= mean*(1-mean) {
		return Fraction{}, fmt.Errorf("a fraction with mean %v cannot have a standard deviation of %v (less than %.4g)", mean, sd, math.Sqrt(mean*(1-mean)))
	}
	return matchedFraction(mean, sd)
}

func matchFraction(mean, sd float64) (Fraction, error) {
	// For each V the U that gives the mean is found by bisection; the variance
	// then grows with V, so that V is found by bisection too.
	centre := func(v float64) float64 {
		reach := 40 + float64(8*v)
		lo, hi := -reach, reach
		for i := 0; i < 200 && hi-lo > 1e-15*(1+math.Abs(lo)); i++ {
			mid := (lo + hi) / 2
			if m, _ := logitMoments(mid, v); m < mean {
				lo = mid
			} else {
				hi = mid
			}
		}
		return (lo + hi) / 2
	}
	sdOf := func(v float64) float64 {
		_, second := logitMoments(centre(v), v)
		return math.Sqrt(math.Max(0, second-float64(mean*mean)))
	}
	lo, hi := 0.0, 1.0
	for sdOf(hi) < sd {
		lo, hi = hi, 2*hi
		if hi > 1e4 {
			return Fraction{}, fmt.Errorf("a fraction with mean %v and standard deviation %v is too close to all or nothing", mean, sd)
		}
	}
	for i := 0; i < 100 && hi-lo > 1e-14*hi; i++ {
		mid := (lo + hi) / 2
		if sdOf(mid) < sd {
			lo = mid
		} else {
			hi = mid
		}
	}
	v := (lo + hi) / 2
	return Fraction{mean, centre(v), v}, nil
}

// Draw is the fraction of a year with standard normal e.
func (f Fraction) Draw(e float64) float64 {
	if f.V == 0 {
		return f.Mean
	}
	return portable.Logistic(f.U + float64(f.V*e))
}

// Survive is 1 - Draw(e), with full relative accuracy where almost all die.
func (f Fraction) Survive(e float64) float64 {
	if f.V == 0 {
		return 1 - f.Mean
	}
	return portable.Logistic(-f.U - float64(f.V*e))
}

// logitMoments are the first two moments of the logit-normal law by the
// trapezoid rule on -9 to 9, which converges geometrically for a function
// analytic in a strip (Trefethen & Weideman 2014, SIAM Review 56:385): here to
// a distance pi/v from the real line, so that the step follows from v. The
// step is small enough for errors below 1e-15.
func logitMoments(u, v float64) (first, second float64) {
	h := math.Min(0.15, 0.5/math.Max(v, 1e-9))
	n := int(math.Ceil(9 / h))
	for i := -n; i <= n; i++ {
		z := float64(i) * h
		w := portable.Exp(-z * z / 2)
		x := portable.Logistic(u + float64(v*z))
		first += float64(w * x)
		second += float64(w * x * x)
	}
	scale := h / math.Sqrt(2*math.Pi)
	return first * scale, second * scale
}

func itoa(n int) string { return strconv.Itoa(n) }
