package fit

import (
	"errors"
	"math"
)

// Drift is exponential growth with drift: ln N does Brownian motion with mean
// Mu and variance Variance a year. Fitted to the log ratios W of counts an
// interval tau apart by regression of W/sqrt(tau) on sqrt(tau) through the
// origin (B. Dennis, P. L. Munholland & J. M. Scott 1991, Ecol. Monogr.
// 61:115-143).
type Drift struct {
	Intervals  int      // number of changes from count to count
	Span       float64  // time from first to last count
	Mu         Estimate // mean log growth a year; interval of Student's t
	Variance   Estimate // unbiased; interval of chi-squared
	VarianceML float64  // maximum likelihood: divisor Intervals
	Lambda     float64  // growth factor of the mean, exp(mu + VarianceML/2)
	LogLik     float64  // of ln N, given the first count
	AICc       float64  // two parameters

	residual []float64 // W/sqrt(tau) - mu sqrt(tau)
	leverage []float64
}

// errStill is a series without any variation.
var errStill = errors.New("counts: growth never varies, so it has no variance to estimate; check that these are counts and not figures made by a model")

func fitDrift(p *prepared, confidence float64) (*Drift, error) {
	q := p.steps()
	d := &Drift{Intervals: q, Span: p.span()}
	mu := (p.y[q] - p.y[0]) / d.Span
	rss := 0.0
	for i := 0; i < q; i++ {
		tau := p.tau(i)
		e := (p.y[i+1] - p.y[i] - mu*tau) / math.Sqrt(tau)
		rss += e * e
		d.residual = append(d.residual, e)
		d.leverage = append(d.leverage, tau/d.Span)
	}
	if rss < 1e-20*float64(q) {
		return nil, errStill
	}
	nu := float64(q - 1)
	v := rss / nu
	d.VarianceML = rss / float64(q)
	se := math.Sqrt(v / d.Span)
	t := twoSided(nu, confidence)
	d.Mu = Estimate{mu, mu - t*se, mu + t*se, se}
	low, high := varianceInterval(v, nu, confidence)
	d.Variance = Estimate{v, low, high, v * math.Sqrt(2/nu)}
	d.Lambda = math.Exp(mu + d.VarianceML/2)
	for i := 0; i < q; i++ {
		d.LogLik -= 0.5 * (math.Log(2*math.Pi*d.VarianceML*p.tau(i)) + d.residual[i]*d.residual[i]/d.VarianceML)
	}
	aicc, err := AICc(d.LogLik, 2, q)
	if err != nil {
		aicc = math.NaN()
	}
	d.AICc = aicc
	return d, nil
}
