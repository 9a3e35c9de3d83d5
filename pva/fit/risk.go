package fit

import (
	"math"
	"sort"

	"ebbline/pva/estimate"
	"ebbline/rng"
)

// Risk is the chance that the drift model gives to a fall to a threshold.
type Risk struct {
	// Withheld is the reason why the risk and its interval are not to be used,
	// "" if they may be. Without an answer the figures are NaN.
	Withheld string

	Start     float64 // abundance at the last count
	Threshold float64 // fallen at or below this
	Horizon   int     // time units ahead
	ByHorizon Estimate
	Ever      Estimate
	Years     []estimate.YearRisk // one for each time unit to the horizon
	// Process is the risk by the horizon with the process variance of the
	// split in place of the whole variance, NaN without one.
	Process   float64
	Resamples int
}

// drawDrifts makes so many estimates of drift and variance from series
// simulated with the fitted ones at the dates of the counts: the parametric
// bootstrap (B. Efron 1979, Ann. Statist. 7:1-26). Series i uses the random
// numbers of (seed, i).
func drawDrifts(p *prepared, d *Drift, seed uint64, times int) (mu, variance []float64) {
	q := p.steps()
	tau := make([]float64, q)
	root := make([]float64, q)
	for i := range tau {
		tau[i] = p.tau(i)
		root[i] = math.Sqrt(d.Variance.Value * tau[i])
	}
	w := make([]float64, q)
	mu, variance = make([]float64, times), make([]float64, times)
	var s rng.Stream
	for k := range mu {
		s.Seed(seed, uint64(k), rng.Resample)
		sum := 0.0
		for i := range w {
			w[i] = d.Mu.Value*tau[i] + float64(root[i]*rng.Normal(&s))
			sum += w[i]
		}
		m := sum / d.Span
		rss := 0.0
		for i := range w {
			e := w[i] - float64(m*tau[i])
			rss += float64(e * e / tau[i])
		}
		mu[k], variance[k] = m, rss/float64(q-1)
	}
	return mu, variance
}

// fitRisk is the first-passage risk by each time unit with its percentile
// interval over the resampled drifts.
func fitRisk(p *prepared, d *Drift, split *Split, o Options) *Risk {
	r := &Risk{Start: p.last(), Threshold: o.Threshold, Horizon: o.Horizon, Resamples: o.Resamples, Process: math.NaN()}
	x := math.Log(r.Start / r.Threshold)
	own := Passage{x, d.Mu.Value, d.Variance.Value}
	mu, variance := drawDrifts(p, d, o.Seed, o.Resamples)
	sample := make([]float64, o.Resamples)
	around := func(value float64, of func(Passage) float64) Estimate {
		for k := range sample {
			sample[k] = of(Passage{x, mu[k], variance[k]})
		}
		sort.Float64s(sample)
		return Estimate{value, percentile(sample, (1-o.Confidence)/2), percentile(sample, (1+o.Confidence)/2), math.NaN()}
	}
	for t := 1; t <= o.Horizon; t++ {
		e := around(own.By(float64(t)), func(p Passage) float64 { return p.By(float64(t)) })
		r.Years = append(r.Years, estimate.YearRisk{Year: t, Estimate: e.Value, Low: e.Low, High: e.High})
		r.ByHorizon = e
	}
	r.Ever = around(own.Ever(), Passage.Ever)
	if split != nil && (split.Stated || split.Observation.Value > 0) {
		r.Process = Passage{x, split.Mu.Value, split.Process.Value}.By(float64(o.Horizon))
	}
	return r
}

// percentile is the q-th quantile of a sorted sample, between its neighbours in
// proportion (R. J. Hyndman & Y. Fan 1996, Am. Stat. 50:361-365, definition 7).
func percentile(sorted []float64, q float64) float64 {
	at := q * float64(len(sorted)-1)
	i := int(at)
	if i+1 >= len(sorted) {
		return sorted[len(sorted)-1]
	}
	return sorted[i] + (at-float64(i))*(sorted[i+1]-sorted[i])
}
