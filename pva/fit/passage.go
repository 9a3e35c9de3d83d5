package fit

import "math"

// Passage is the first time at which ln N, doing Brownian motion with drift Mu
// and variance Variance a year, has fallen by Distance: an inverse Gaussian law
// (B. Dennis, P. L. Munholland & J. M. Scott 1991, Ecol. Monogr. 61:115-143; R.
// Lande & S. H. Orzack 1988, PNAS 85:7418-7421). The motion is watched at every
// moment: a population that is counted once a year falls less often (B. E.
// Kendall 2009, Conserv. Lett. 2:216-225).
type Passage struct {
	Distance float64 // ln(start/threshold); 0 or below has fallen already
	Mu       float64
	Variance float64 // not below 0
}

// By is the chance of having fallen by time t: Phi((-x - mu t)/s) +
// exp(-2 mu x/variance) Phi((-x + mu t)/s), s = sqrt(variance t), the second
// term from logarithms so that neither factor overflows.
func (p Passage) By(t float64) float64 {
	x := p.Distance
	switch {
	case x <= 0:
		return 1
	case t <= 0:
		return 0
	case p.Variance == 0:
		if -p.Mu*t >= x {
			return 1
		}
		return 0
	}
	s := math.Sqrt(p.Variance * t)
	return math.Min(1, math.Exp(logPhi((-x-p.Mu*t)/s))+math.Exp(-2*p.Mu*x/p.Variance+logPhi((-x+p.Mu*t)/s)))
}

// Ever is the chance of ever falling: 1 unless the drift is upwards, and then
// (threshold/start)^(2 mu/variance).
func (p Passage) Ever() float64 {
	switch {
	case p.Distance <= 0 || p.Mu <= 0 && p.Variance > 0:
		return 1
	case p.Variance == 0:
		if p.Mu < 0 {
			return 1
		}
		return 0
	}
	return math.Exp(-2 * p.Mu * p.Distance / p.Variance)
}

// Mean is the mean time given that it falls, +Inf without drift.
func (p Passage) Mean() float64 { return p.Distance / math.Abs(p.Mu) }

// Spread is the variance of the time given that it falls, +Inf without drift.
func (p Passage) Spread() float64 {
	m := math.Abs(p.Mu)
	return p.Distance * p.Variance / (m * m * m)
}

// Mode is the likeliest time given that it falls.
func (p Passage) Mode() float64 {
	m := math.Abs(p.Mu)
	if m == 0 {
		return p.Distance * p.Distance / (3 * p.Variance)
	}
	v := m * p.Distance / p.Variance
	w := 3 / (2 * v)
	// sqrt(1 + w^2) - w, without the difference of near equal numbers.
	return p.Distance / m / (math.Sqrt(1+w*w) + w)
}

// Density is the density of the time at t given that it falls.
func (p Passage) Density(t float64) float64 {
	d := p.Distance - math.Abs(p.Mu)*t
	return p.Distance / math.Sqrt(2*math.Pi*p.Variance*t*t*t) * math.Exp(-d*d/(2*p.Variance*t))
}

// Quantile is the time by which a share q (between 0 and 1) of those that ever
// fall have fallen.
func (p Passage) Quantile(q float64) float64 {
	// Given that it falls, the law is that of the drift turned downwards.
	down := Passage{p.Distance, -math.Abs(p.Mu), p.Variance}
	lo, hi := 0.0, p.Distance*p.Distance/p.Variance+1
	for down.By(hi) < q && !math.IsInf(hi, 1) {
		lo, hi = hi, 2*hi
	}
	for i := 0; i < 200 && hi-lo > 1e-15*hi; i++ {
		if mid := lo + (hi-lo)/2; down.By(mid) < q {
			lo = mid
		} else {
			hi = mid
		}
	}
	return lo + (hi-lo)/2
}

// logPhi is the logarithm of the standard normal distribution function, also
// far below where the function itself is 0: there by the asymptotic series of
// Abramowitz & Stegun 1964, 26.2.12.
func logPhi(z float64) float64 {
	if z > -30 {
		return math.Log(0.5 * math.Erfc(-z/math.Sqrt2))
	}
	w := 1 / (z * z)
	return -0.5*z*z - math.Log(-z) - 0.5*math.Log(2*math.Pi) + math.Log1p(-w*(1-w*(3-w*(15-w*105))))
}
