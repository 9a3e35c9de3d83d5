package fit

import "math"

// filtered is what the Kalman filter leaves of a series: the log likelihood of
// its changes with the drift at its best value, that value, and the state at the
// last count.
type filtered struct {
	mu, se        float64
	logLik, reml  float64 // log likelihood; the restricted one
	squares, logs float64 // sum of e^2/F and of ln F over innovations e of variance F
	restrict      float64 // ln of the information on mu
	changes       int

	last   float64 // log abundance at the last count given all counts
	spread float64 // its variance, with what the drift adds by not being known
}

// filter runs the Kalman filter (R. E. Kalman 1960, J. Basic Eng. 82:35-45)
// over log counts: a state that drifts with mu and variance process a year,
// seen with errors of variance observation (plus the stated one of each
// count). The first state is unknown, so that the likelihood is that of the
// changes between counts: normal, with mean mu tau, variance process tau + the
// two errors, and covariance minus the error they share (B. Dennis, J. M.
// Ponciano, S. R. Lele, M. L. Taper & D. F. Staples 2006, Ecol. Monogr.
// 76:323-341; J.-Y. Humbert, L. S. Mills, J. S. Horne & B. Dennis 2009, Oikos
// 118:1940-1946, for intervals of any length). The drift is linear in the
// changes: the filter is run on the counts and on the dates at once, and mu
// follows by generalised least squares, and with it the last state and its mean
// squared error (P. de Jong 1991, Ann. Statist. 19:1073-1083). The restricted
// likelihood is that of D. F. Staples, M. L. Taper & B. Dennis 2004, Ecology
// 85:923-929.
func filter(p *prepared, process, observation float64) filtered {
	errorOf := func(i int) float64 {
		if p.known != nil {
			return observation + p.known[i]
		}
		return observation
	}
	f := filtered{changes: p.steps()}
	state, time := p.y[0], 0.0 // the state is state + mu time
	spread := errorOf(0)
	var ee, ed, dd float64
	for i := 0; i < f.changes; i++ {
		time += p.tau(i)
		spread += process * p.tau(i)
		v := spread + errorOf(i+1)
		e := p.y[i+1] - state
		ee += e * e / v
		ed += e * time / v
		dd += time * time / v
		f.logs += math.Log(v)
		gain := spread / v
		state += gain * e
		time -= gain * time
		spread *= errorOf(i+1) / v
	}
	f.mu = ed / dd
	f.se = 1 / math.Sqrt(dd)
	f.last = state + f.mu*time
	f.spread = spread + time*time*f.se*f.se
	f.squares = ee - ed*ed/dd
	f.restrict = math.Log(dd)
	n := float64(f.changes)
	f.logLik = -0.5 * (n*math.Log(2*math.Pi) + f.logs + f.squares)
	f.reml = f.logLik - 0.5*f.restrict + 0.5*math.Log(2*math.Pi)
	return f
}
