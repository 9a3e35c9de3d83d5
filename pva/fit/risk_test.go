package fit

import (
	"math"
	"sort"
	"strings"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"

	"ebbline/pva/estimate"
	"ebbline/rng"
)

// TestDrawnLaw: the draws of drift and variance have the laws that the
// estimates have around the truth, turned around: (mu* - mu)/se is Student's and
// nu v/v* chi-squared, both with nu degrees of freedom (gonum's laws). The
// largest distance between the shares of n draws and a law is above
// sqrt(ln(2/level)/2n) with a chance below level (P. Massart 1990, Ann. Probab.
// 18:1269-1283).
func TestDrawnLaw(t *testing.T) {
	p := simulated(rng.NewStream(3, 0, rng.Resample), 12, 0.01, 0.05, 0)
	d, _ := fitDrift(p, 0.95)
	const n = 20000
	mu, variance := drawDrifts(d, 5, n)
	nu := float64(d.Intervals - 1)
	student, chi := make([]float64, n), make([]float64, n)
	for k := range mu {
		student[k] = (mu[k] - d.Mu.Value) / math.Sqrt(d.Variance.Value/d.Span)
		chi[k] = nu * d.Variance.Value / variance[k]
	}
	most := math.Sqrt(math.Log(2/level) / (2 * n))
	for what, c := range map[string]struct {
		x   []float64
		cdf func(float64) float64
	}{"drift": {student, distuv.StudentsT{Mu: 0, Sigma: 1, Nu: nu}.CDF}, "variance": {chi, distuv.ChiSquared{K: nu}.CDF}} {
		sort.Float64s(c.x)
		for i, x := range c.x {
			if f := c.cdf(x); math.Abs(f-float64(i)/n) > most+1.0/n {
				t.Errorf("%s: %.4f of the draws are below %.4g, want %.4f (within %.4f)", what, float64(i)/n, x, f, most)
				break
			}
		}
	}
	again, _ := drawDrifts(d, 5, 10)
	for i, m := range again {
		if want, _ := drawDrifts(d, 5, n); m != want[i] {
			t.Fatalf("draw %d depends on how many there are", i)
		}
	}
}

// TestRiskCoverage: the 95 % interval of the risk is no exact one, being that of
// a figure made of drift and variance together. Measured over 20,000 series for
// each row, with 1,000 draws, it lies too low in 2.3 to 2.6 and too high in 2.6
// to 2.9 of 100 series. The interpolated percentile of only 200 draws leaves half
// a point more outside on either side: the misses of 1,500 series are held at the
// level to a band of 1.7 to 3.4 of 100. Intervals from series simulated with the
// fitted values lie too low in 9 to 10 of 100 in the rows of ten counts, and fail.
func TestRiskCoverage(t *testing.T) {
	const series = 1500
	for i, truth := range []struct {
		mu, variance, distance float64
		horizon, counts        int
	}{
		{0.02, 0.05, math.Log(4), 10, 10},
		{0.1, 0.05, math.Log(5), 10, 10},
		{-0.05, 0.04, math.Log(3), 12, 15},
		{0, 0.1, math.Log(5), 10, 25},
	} {
		var low, high int64
		for k := 0; k < series; k++ {
			p := simulated(rng.NewStream(71+uint64(i), uint64(k), rng.Resample), truth.counts, truth.mu, truth.variance, 0)
			d, err := fitDrift(p, 0.95)
			if err != nil {
				t.Fatal(err)
			}
			r := fitRisk(p, d, nil, Options{Threshold: p.last() * math.Exp(-truth.distance), Horizon: truth.horizon, Confidence: 0.95, Seed: uint64(k + 1), Resamples: 200})
			of := Passage{truth.distance, truth.mu, truth.variance}.By(float64(truth.horizon))
			if r.ByHorizon.High < of {
				low++
			}
			if r.ByHorizon.Low > of {
				high++
			}
		}
		t.Logf("%+v: the interval lies too low in %d, too high in %d of %d series", truth, low, high, series)
		for what, n := range map[string]int64{"too low": low, "too high": high} {
			if estimate.BinomialTailWidened(n, series, 0.0255, 0.0085) < level {
				t.Errorf("%+v: the interval lies %s in %d of %d series", truth, what, n, series)
			}
		}
	}
}

// TestFallenAlready: a threshold at or above the last count is told of.
func TestFallenAlready(t *testing.T) {
	for threshold, want := range map[float64]bool{0: false, 1e6: true} {
		r, err := Fit(noisySeries(3, .02, .01), Options{Threshold: threshold, Resamples: 100})
		if err != nil {
			t.Fatal(err)
		}
		said := false
		for _, d := range r.Doubts {
			said = said || strings.Contains(d.Text, "has fallen already")
		}
		if said != want || threshold == 0 && r.Options.Threshold != math.Floor(r.LastCount/10) {
			t.Errorf("threshold %v: %v, in force %v", threshold, r.Doubts, r.Options.Threshold)
		}
	}
}
