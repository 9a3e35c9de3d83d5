package fit

import (
	"math"
	"testing"

	"ebbline/pva/estimate"
	"ebbline/rng"
)

// level is the chance at which a right program fails one comparison here.
const level = 1e-8

// simulated is a series of log counts with known drift and variances; dates a
// year apart but for every fifth interval, which is three.
func simulated(s *rng.Stream, counts int, mu, process, observation float64) *prepared {
	p := &prepared{file: "simulated", unit: "year"}
	x, year := math.Log(200), 0.0
	for i := 0; i < counts; i++ {
		y := x + math.Sqrt(observation)*rng.Normal(s)
		p.year, p.y, p.n = append(p.year, year), append(p.y, y), append(p.n, math.Exp(y))
		tau := 1.0
		if i%5 == 4 {
			tau = 3
		}
		year += tau
		x += mu*tau + math.Sqrt(process*tau)*rng.Normal(s)
	}
	return p
}

// TestCoverage: over 2,000 simulated series the 95 % intervals of drift and
// variance cover the truth in 93 to 97 %. Both are exact for this model, so the
// count is also binomial with chance 0.95.
func TestCoverage(t *testing.T) {
	const series = 2000
	for _, truth := range []struct {
		mu, variance float64
		counts       int
	}{{-0.03, 0.04, 25}, {0.02, 0.15, 12}} {
		var mu, variance int64
		sum := 0.0
		for k := 0; k < series; k++ {
			d, err := fitDrift(simulated(rng.NewStream(17, uint64(k), rng.Resample), truth.counts, truth.mu, truth.variance, 0), 0.95)
			if err != nil {
				t.Fatal(err)
			}
			if d.Mu.Low <= truth.mu && truth.mu <= d.Mu.High {
				mu++
			}
			if d.Variance.Low <= truth.variance && truth.variance <= d.Variance.High {
				variance++
			}
			sum += d.Variance.Value / series
		}
		for what, n := range map[string]int64{"drift": mu, "variance": variance} {
			if n < 0.93*series || n > 0.97*series || estimate.BinomialTail(n, series, 0.95) < level {
				t.Errorf("%+v: the interval of the %s covers in %d of %d series", truth, what, n, int64(series))
			}
		}
		// The unbiased variance has the relative standard error sqrt(2/(q-1)).
		se := truth.variance * math.Sqrt(2/float64(truth.counts-2)/series)
		if !(math.Abs(sum-truth.variance) <= 5.73*se) {
			t.Errorf("%+v: variance %.5g in the mean (standard error %.2g)", truth, sum, se)
		}
	}
}

// TestCrowdingRecovered: 400 series that follow a Ricker curve give back its
// slope. Least squares of growth on abundance is biased towards too steep a
// slope (B. Dennis & M. L. Taper 1994), by about the standard error over 5 at
// 60 steps; half a standard error is allowed.
func TestCrowdingRecovered(t *testing.T) {
	const r, k, sd = 0.5, 300.0, 0.15
	sum, se := 0.0, 0.0
	for i := 0; i < 400; i++ {
		s := rng.NewStream(23, uint64(i), rng.Resample)
		n := 250.0
		var st steps
		for y := 0; y < 60; y++ {
			g := r*(1-n/k) + sd*rng.Normal(s)
			st.n, st.r = append(st.n, n), append(st.r, g)
			n *= math.Exp(g)
		}
		m := fitLine(RickerModel, st, 0.95)
		sum += m.Slope.Value / 400
		se += m.Slope.SE / 400
	}
	if bias := sum + r/k; !(math.Abs(bias) <= se/2) {
		t.Errorf("slope %.5g in the mean, want %.5g (standard error of one fit %.2g)", sum, -r/k, se)
	}
}

// TestSplitRecovered: process and observation variance come back from series
// with both. Restricted likelihood leaves a bias far below the spread of the
// estimates; over 60 series of 80 counts the mean of each lies within 5.73
// standard errors of the truth plus that bias, taken as a tenth of the spread
// of one estimate. The profile's interval of the process variance covers by
// the likelihood's large-sample law, to which its count is held at the level.
func TestSplitRecovered(t *testing.T) {
	const series, process, observation = 60, 0.02, 0.01
	p, o := make([]float64, series), make([]float64, series)
	covered := 0
	for k := range p {
		s := fitSplit(simulated(rng.NewStream(31, uint64(k), rng.Resample), 80, 0.01, process, observation), true, 0.95)
		p[k], o[k] = s.Process.Value, s.Observation.Value
		if s.Process.Low <= process && process <= s.Process.High {
			covered++
		}
	}
	for _, e := range []struct {
		what  string
		x     []float64
		truth float64
	}{{"process", p, process}, {"observation", o, observation}} {
		sd := deviation(e.x)
		if !(math.Abs(mean(e.x)-e.truth) <= sd*(0.1+5.73/math.Sqrt(series))) {
			t.Errorf("%s variance %.5g in the mean, want %.5g (sd %.2g)", e.what, mean(e.x), e.truth, sd)
		}
	}
	t.Logf("process %.4g, observation %.4g, covered %d of %d", mean(p), mean(o), covered, series)
	if estimate.BinomialTail(int64(covered), series, 0.95) < level {
		t.Errorf("the profile interval of the process variance covers in %d of %d series", covered, series)
	}
}

// TestSplitStated: errors that are stated are taken out: the process variance
// is that of the state beneath, and with errors of 0 it is the drift model's.
func TestSplitStated(t *testing.T) {
	const series = 150
	v := make([]float64, series)
	for k := range v {
		p := simulated(rng.NewStream(41, uint64(k), rng.Resample), 40, 0, 0.02, 0.03)
		for range p.y {
			p.known = append(p.known, 0.03)
		}
		v[k] = fitSplit(p, true, 0.95).Process.Value
	}
	if sd := deviation(v); !(math.Abs(mean(v)-0.02) <= sd*(0.1+5.73/math.Sqrt(series))) {
		t.Errorf("process variance %.5g in the mean, want 0.02 (sd %.2g)", mean(v), sd)
	}
	p := simulated(rng.NewStream(43, 0, rng.Resample), 30, 0.02, 0.05, 0)
	p.known = make([]float64, 30)
	d, _ := fitDrift(p, 0.95)
	s := fitSplit(p, true, 0.95)
	agree(t, "process variance without errors", s.Process.Value, d.Variance.Value)
	agreeTo(t, "drift without errors", s.Mu.Value, d.Mu.Value, 1e-9)
}

// TestFilter holds the Kalman filter against the likelihood of the changes from
// their whole covariance matrix, factored by Cholesky's rule written out here.
func TestFilter(t *testing.T) {
	p := simulated(rng.NewStream(51, 0, rng.Resample), 14, 0.03, 0.04, 0.02)
	p.known = make([]float64, 14)
	for i := range p.known {
		p.known[i] = 0.001 * float64(i)
	}
	const process, observation = 0.03, 0.015
	q := p.steps()
	a := make([][]float64, q)
	w := make([]float64, q)
	tau := make([]float64, q)
	for i := range a {
		a[i] = make([]float64, q)
		tau[i], w[i] = p.tau(i), p.y[i+1]-p.y[i]
		a[i][i] = process*tau[i] + 2*observation + p.known[i] + p.known[i+1]
		if i > 0 {
			a[i][i-1] = -(observation + p.known[i])
			a[i-1][i] = a[i][i-1]
		}
	}
	l := make([][]float64, q)
	logs := 0.0
	for i := range l {
		l[i] = make([]float64, q)
		for j := 0; j <= i; j++ {
			sum := a[i][j]
			for k := 0; k < j; k++ {
				sum -= l[i][k] * l[j][k]
			}
			if i == j {
				l[i][i] = math.Sqrt(sum)
				logs += 2 * math.Log(l[i][i])
			} else {
				l[i][j] = sum / l[j][j]
			}
		}
	}
	forward := func(b []float64) []float64 {
		x := make([]float64, q)
		for i := range x {
			x[i] = b[i]
			for k := 0; k < i; k++ {
				x[i] -= l[i][k] * x[k]
			}
			x[i] /= l[i][i]
		}
		return x
	}
	dot := func(x, y []float64) float64 {
		s := 0.0
		for i := range x {
			s += x[i] * y[i]
		}
		return s
	}
	lw, lt := forward(w), forward(tau)
	information := dot(lt, lt)
	mu := dot(lt, lw) / information
	squares := dot(lw, lw) - mu*mu*information
	logLik := -0.5 * (float64(q)*math.Log(2*math.Pi) + logs + squares)
	f := filter(p, process, observation)
	agreeTo(t, "mu", f.mu, mu, 1e-10)
	agreeTo(t, "its standard error", f.se, 1/math.Sqrt(information), 1e-10)
	agreeTo(t, "log likelihood", f.logLik, logLik, 1e-10)
	agreeTo(t, "restricted", f.reml, logLik-0.5*math.Log(information)+0.5*math.Log(2*math.Pi), 1e-10)
}

// TestProfileEnds: at each end of a profile interval the likelihood, greatest
// over everything else, has fallen by half of the 0.95 quantile of chi-squared
// with one degree of freedom, 3.841459 (any table).
func TestProfileEnds(t *testing.T) {
	r := fitted(t, "grizzly.csv", Options{})
	s := r.Split
	greatest := func(at func(x float64) float64) float64 {
		best := math.Inf(-1)
		for x := 0.0; x < 0.05; x += 1e-5 {
			if v := at(x); v > best { // both variances 0 have no likelihood
				best = v
			}
		}
		return best
	}
	// The greatest over a grid this fine is short of the true one by less than
	// 1e-4 here.
	for what, value := range map[string]float64{
		"process low":      greatest(func(x float64) float64 { return filter(r.p, s.Process.Low, x).reml }),
		"process high":     greatest(func(x float64) float64 { return filter(r.p, s.Process.High, x).reml }),
		"observation high": greatest(func(x float64) float64 { return filter(r.p, x, s.Observation.High).reml }),
		"share high": greatest(func(x float64) float64 { // 2 t2 / (s2 + 2 t2) held
			return filter(r.p, x, x*s.Share.High/(1-s.Share.High)/2).reml
		}),
	} {
		if fall := s.LogLik - value; !(math.Abs(fall-3.841459/2) < 1e-3) {
			t.Errorf("%s: the likelihood falls by %.5f, want %.5f", what, fall, 3.841459/2)
		}
	}
	if s.Observation.Low != 0 || s.Share.Low != 0 || s.Apart {
		t.Errorf("grizzly: without observation error the likelihood falls by little, and yet %+v", s)
	}
}

// TestOutlyingRarely: of series without any outlying change one in twenty has
// one, at most: the level holds for the largest of all changes.
func TestOutlyingRarely(t *testing.T) {
	var found int64
	const series = 600
	for k := 0; k < series; k++ {
		p := simulated(rng.NewStream(61, uint64(k), rng.Resample), 25, 0.01, 0.04, 0)
		d, _ := fitDrift(p, 0.95)
		if len(diagnose(p, d, 0.95).Outlying) > 0 {
			found++
		}
	}
	// Bonferroni's bound is close at this level: the chance lies in 0.0488 to
	// 0.05 (1 - (1 - 0.05/n)^n from below, for near independent residuals).
	if estimate.BinomialTailWidened(found, series, 0.0494, 0.0006) < level {
		t.Errorf("%d of %d series without an outlying change have one", found, int64(series))
	}
}
