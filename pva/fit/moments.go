package fit

import (
	"math"

	"gonum.org/v1/gonum/integrate/quad"
)

// The nodes of the two normal series of the weather (C. Hermite's rule).
const (
	nodesPlain   = 21
	nodesCrowded = 7
)

var (
	plainZ, plainW     = hermite(nodesPlain)
	crowdedZ, crowdedW = hermite(nodesCrowded)
)

func hermite(n int) (z, w []float64) {
	z, w = make([]float64, n), make([]float64, n)
	quad.Hermite{}.FixedLocations(z, w, math.Inf(-1), math.Inf(1))
	for i := range z {
		z[i] *= math.Sqrt2
		w[i] /= math.Sqrt(math.Pi)
	}
	return z, w
}

// yearLog is the log growth over one time unit that begins at n, with the
// year's births per head b and death rate d and without demographic noise.
func (m *matched) yearLog(n, b, d float64) float64 {
	if !m.flow {
		return -d + math.Log1p(b*m.crowding.Births(n*math.Exp(-d)))
	}
	if !m.crowded {
		return b - d
	}
	// The mean path of ln N through the year, by the classical Runge-Kutta rule.
	const steps = 4
	const h = 1.0 / steps
	slope := func(x float64) float64 { return b*m.crowding.Births(n*math.Exp(x)) - d }
	x := 0.0
	for i := 0; i < steps; i++ {
		k1 := slope(x)
		k2 := slope(x + h/2*k1)
		k3 := slope(x + h/2*k2)
		k4 := slope(x + h*k3)
		x += h / 6 * (k1 + 2*k2 + 2*k3 + k4)
	}
	return x
}

// deathsAt sets the logit-normal law of spread v and mean 1 - survival.
func (m *matched) deathsAt(v float64) {
	m.v = v
	m.u = math.Log((1 - m.survival) / m.survival)
	if v == 0 {
		return
	}
	lo, hi := m.u-1-v*v, m.u+1+v*v
	for i := 0; i < 100 && hi-lo > 1e-13*(1+math.Abs(lo)); i++ {
		m.u = (lo + hi) / 2
		if first, _ := logitMoments(m.u, v); first < 1-m.survival {
			lo = m.u
		} else {
			hi = m.u
		}
	}
}

// logitMoments are the mean and second moment of 1/(1+exp(-(u+vz))), z standard
// normal, by the trapezoid rule on -9 to 9, which converges geometrically (L. N.
// Trefethen & J. A. C. Weideman 2014, SIAM Review 56:385).
func logitMoments(u, v float64) (first, second float64) {
	h := math.Min(0.15, 0.5/v)
	n := int(math.Ceil(9 / h))
	for i := -n; i <= n; i++ {
		z := float64(i) * h
		w := h / math.Sqrt(2*math.Pi) * math.Exp(-z*z/2)
		x := 1 / (1 + math.Exp(-(u + v*z)))
		first += w * x
		second += w * x * x
	}
	return first, second
}

// deathSD is the standard deviation of the death fraction between years.
func (m *matched) deathSD() float64 {
	if m.v == 0 {
		return 0
	}
	first, second := logitMoments(m.u, m.v)
	return math.Sqrt(math.Max(0, second-first*first))
}

// birthSD is the standard deviation of the birth rate between years.
func (m *matched) birthSD() float64 { return m.birth * math.Sqrt(math.Expm1(m.sigma*m.sigma)) }

// moments are the mean of the log growth from n over the weather, its variance,
// and the parts of it that births and deaths make alone.
func (m *matched) moments(n float64) (first, total, births, deaths float64) {
	z, w := plainZ, plainW
	if m.crowded {
		z, w = crowdedZ, crowdedW
	}
	var byBirth, byDeath [nodesPlain]float64
	second := 0.0
	var b [nodesPlain]float64
	for i := range z {
		b[i] = m.birth * math.Exp(m.sigma*z[i]-m.sigma*m.sigma/2)
	}
	for j := range z {
		d := math.Log1p(math.Exp(m.u + m.v*z[j]))
		for i := range z {
			g := m.yearLog(n, b[i], d)
			byBirth[i] += w[j] * g
			byDeath[j] += w[i] * g
			first += w[i] * w[j] * g
			second += w[i] * w[j] * g * g
		}
	}
	for i := range z {
		births += w[i] * (byBirth[i] - first) * (byBirth[i] - first)
		deaths += w[i] * (byDeath[i] - first) * (byDeath[i] - first)
	}
	return first, math.Max(0, second-first*first), births, deaths
}

// demographic is the demographic variance per head of log growth: the variance
// of the population after a year over its squared mean, times n. In a pulse
// year S of n survive and each has a Poisson number of young; in a flow year it
// is the linear birth-death process (N. T. J. Bailey 1964, The Elements of
// Stochastic Processes, ch. 8). It follows R. Lande, S. Engen & B.-E. Saether
// 2003, Stochastic Population Dynamics in Ecology and Conservation, ch. 1, in
// taking growth to be lowered by half of it over n (from memory).
func (m *matched) demographic(n float64) float64 {
	s := m.survival
	if !m.flow {
		b := m.birth * m.crowding.Births(n*s)
		return b/(s*(1+b)*(1+b)) + (1-s)/s
	}
	b, d := m.birth*m.crowding.Births(n), -math.Log(s)
	r := b - d
	if math.Abs(r) < 1e-9 {
		return b + d
	}
	return (b + d) * -math.Expm1(-r) / r
}
