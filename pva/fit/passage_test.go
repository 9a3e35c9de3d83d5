package fit

import (
	"math"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/stat/distuv"
)

// TestPassagePublished holds the first-passage law against values computed to
// 29 digits from the formulas of B. Dennis, P. L. Munholland & J. M. Scott 1991
// (Ecol. Monogr. 61:115-143) and R. Lande & S. H. Orzack 1988 (PNAS 85:7418).
func TestPassagePublished(t *testing.T) {
	rows := []struct {
		n0, ne, mu, variance, ever      float64
		by                              map[float64]float64
		mean, spread, median, likeliest float64
	}{
		{100, 1, -0.05, 0.04, 1, map[float64]float64{50: 0.093587078, 100: 0.65656368, 200: 0.98386833}, 92.103404, 1473.6545, 84.824599, 71.178973},
		{100, 10, 0.02, 0.05, 0.15848932, map[float64]float64{10: 0.00043399091, 20: 0.0079645791, 50: 0.050858952, 100: 0.097881019}, 115.12925, 14391.157, 75.752281, 32.524988},
		{50, 1, 0, 0.1, 1, map[float64]float64{20: 0.0056710611, 50: 0.080202924, 100: 0.21605356}, 0, 0, 0, 0},
		{99, 20, 0.02134027, 0.01305092, 0.005350895, map[float64]float64{20: 9.4680429e-05, 50: 0.0018461706, 100: 0.0041806736}, 74.946923, 2147.8063, 63.144862, 43.413016},
		{40, 10, -0.03, 0.09, 1, map[float64]float64{1: 6.0348387e-06, 5: 0.060400042, 10: 0.2211975, 20: 0.45371698, 50: 0.7401416}, 46.209812, 4620.9812, 22.871414, 6.9565122},
	}
	const digits = 6e-8 // half a unit of the eighth digit, at worst
	for _, r := range rows {
		p := Passage{math.Log(r.n0 / r.ne), r.mu, r.variance}
		agreeTo(t, "ever", p.Ever(), r.ever, digits)
		for at, want := range r.by {
			agreeTo(t, "by", p.By(at), want, digits)
			// The same from w and z (H. Hakoyama 2025, arXiv:2509.09965):
			// Phi(-w) + exp((z^2 - w^2)/2) Phi(-z).
			s := math.Sqrt(r.variance * at)
			w, z := (r.mu*at+p.Distance)/s, (p.Distance-r.mu*at)/s
			phi := distuv.UnitNormal.CDF
			agreeTo(t, "by, from w and z", p.By(at), phi(-w)+math.Exp((z*z-w*w)/2)*phi(-z), 1e-10)
			// And from the density.
			agreeTo(t, "by, from the density", p.By(at), p.Ever()*quad.Fixed(p.Density, 0, at, 400, nil, 0), 1e-7)
		}
		if r.mean == 0 {
			continue
		}
		agreeTo(t, "mean", p.Mean(), r.mean, digits)
		agreeTo(t, "variance", p.Spread(), r.spread, digits)
		agreeTo(t, "median", p.Quantile(0.5), r.median, digits)
		agreeTo(t, "mode", p.Mode(), r.likeliest, digits)
	}
}

// TestPassageExtremes: no factor overflows, and each limit is what it must be.
func TestPassageExtremes(t *testing.T) {
	for _, p := range []Passage{{5, -3, 1e-6}, {5, 3, 1e-6}, {700, -1e3, 1e-3}, {700, 1e3, 1e-3}, {1e-9, 0.5, 2}, {3, 0, 1e-300}, {3, -0.1, 1e300}} {
		last := 0.0
		for _, at := range []float64{0, 1e-9, 1, 50, 1e4, 1e9} {
			v := p.By(at)
			if !(v >= last-1e-12 && v <= 1) {
				t.Errorf("%+v by %g: %g after %g", p, at, v, last)
			}
			last = v
		}
		if e := p.Ever(); last > e*(1+1e-9)+1e-300 {
			t.Errorf("%+v: %g by 1e9, but ever %g", p, last, e)
		}
	}
	// A series of the census rises so steadily that its risk is 2.628641e-90
	// (R's pnorm; testdata/published/count_fits.json has it to ten digits).
	agreeTo(t, "fallen already", Passage{0, 1, 1}.By(5), 1, 0)
	agreeTo(t, "without variance", Passage{1, -0.1, 0}.By(11), 1, 0)
	if v := (Passage{1, -0.1, 0}).By(9); v != 0 {
		t.Errorf("without variance, too early: %g", v)
	}
	// ln Phi joins its series smoothly, and agrees with Mill's ratio bounds.
	for z := -29.9; z > -30.2; z -= 0.05 {
		want := -0.5*z*z - 0.5*math.Log(2*math.Pi) - math.Log(-z)
		if v := logPhi(z); !(v < want && v > want+math.Log1p(-1/(z*z))) {
			t.Errorf("ln Phi(%g) = %.12g is outside its bounds %.12g", z, v, want)
		}
	}
	agreeTo(t, "ln Phi(-30)", logPhi(-30.000001), logPhi(-29.999999)-30.0333*2e-6, 1e-9)
}

// TestRiskAtEndsOfDrift: how wide the answer is at the ends of the interval of
// drift, the variance held: chance of a fall to a tenth within 50 years
// (computed from the fits in R). It is the point of D. Ludwig 1999, Ecology
// 80:298-310.
func TestRiskAtEndsOfDrift(t *testing.T) {
	for name, want := range map[string][3]string{
		"grizzly.csv":                    {"0.0501", "0.000049", "7.8e-10"},
		"lynx_1821_1934.csv":             {"0.9243", "0.641022", "0.2937"},
		"hare_1900_1920.csv":             {"0.9991", "0.523769", "0.0106"},
		"adder_1981_1995.csv":            {"1.0000", "0.982727", "0.0375"},
		"kirtlands_warbler_selected.csv": {"0.6760", "0.058684", "0.000406"},
	} {
		d := fitted(t, name, Options{}).Drift
		for i, mu := range []float64{d.Mu.Low, d.Mu.Value, d.Mu.High} {
			got := Passage{math.Log(10), mu, d.Variance.Value}.By(50)
			digits, _, _ := strings.Cut(want[i], "e")
			n := len(strings.TrimLeft(strings.Replace(digits, ".", "", 1), "0"))
			rounded, _ := strconv.ParseFloat(strconv.FormatFloat(got, 'g', n, 64), 64)
			if printed, _ := strconv.ParseFloat(want[i], 64); rounded != printed {
				t.Errorf("%s at %g: %.6g, want %s", name, mu, got, want[i])
			}
		}
	}
}
