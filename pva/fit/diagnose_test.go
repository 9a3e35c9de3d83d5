package fit

import (
	"math"
	"testing"
)

// TestOutlyingAmongLike: a single change among changes that are all alike is the
// most outlying there can be: its studentised residual has no bound, and it is
// found, whatever rounding leaves of the spread of the others.
func TestOutlyingAmongLike(t *testing.T) {
	unbounded := 0
	for _, counts := range []int{8, 10, 13, 20, 33} {
		for at := 1; at < counts; at++ {
			for _, factor := range []float64{0.25, 0.3, 1.7, 8} {
				s := &Series{File: "like.csv", TimeUnit: "year"}
				n := 96.0
				for i := range counts {
					if i == at {
						n *= factor
					}
					s.Counts = append(s.Counts, Count{Year: float64(2000 + i), Count: n})
				}
				p, err := prepare(s, ZerosRefused)
				if err != nil {
					t.Fatal(err)
				}
				d, err := fitDrift(p, 0.95)
				if err != nil {
					t.Fatal(err)
				}
				found := diagnose(p, d, 0.95).Outlying
				if len(found) != 1 || found[0].To != float64(2000+at) || found[0].Down != (factor < 1) || !(found[0].P < 1e-6) {
					t.Fatalf("%d counts, the change to count %d by %g: %+v", counts, at, factor, found)
				}
				if math.IsInf(found[0].T, 0) {
					unbounded++
					if found[0].P != 0 || (found[0].T < 0) != found[0].Down {
						t.Errorf("%+v", found[0])
					}
				}
			}
		}
	}
	if unbounded == 0 {
		t.Error("rounding left some spread in every series: an unbounded residual was not tried")
	}
}

// TestRunningSums holds the slope method against figures computed in R from the
// published series (E. E. Holmes 2001, PNAS 98:5072-5077; eight digits there).
func TestRunningSums(t *testing.T) {
	for name, want := range map[string]RunningSums{
		"grizzly.csv":                  {0.019756413, 0.0066033513, [4]float64{0.003673979, 0.010558607, 0.018045296, 0.023189587}},
		"lynx_1821_1934.csv":           {0.016869568, 1.1160835, [4]float64{0.44587899, 1.5315847, 2.7858514, 3.7480683}},
		"hare_1900_1920.csv":           {-0.054264831, 0.23662443, [4]float64{0.11446744, 0.36496566, 0.62839677, 0.81540517}},
		"whooping_crane_1976_1993.csv": {0.042887654, 0.011880647, [4]float64{0.0035135671, 0.013371569, 0.026810989, 0.038635917}},
	} {
		got := fitted(t, name, Options{}).Diagnostics.RunningSums
		if got == nil {
			t.Errorf("%s: none", name)
			continue
		}
		agree(t, name+" drift", got.Mu, want.Mu)
		agree(t, name+" variance", got.Variance, want.Variance)
		for k := range want.ByLag {
			agree(t, name+" variance at a lag", got.ByLag[k], want.ByLag[k])
		}
	}
	for _, name := range []string{"adder_1981_1995.csv", "kirtlands_warbler_selected.csv"} {
		if got := fitted(t, name, Options{}).Diagnostics.RunningSums; got != nil {
			t.Errorf("%s has gaps, and yet %+v", name, got)
		}
	}
}

// TestAutocorrelationPublished holds the lag-1 correlation of log growth beside
// the first-order autoregression fitted by maximum likelihood in R (arima). The
// two estimate one thing and differ by terms of the order of 1/n (P. J. Brockwell
// & R. A. Davis 1991, Time Series: Theory and Methods, ch. 8); 2/n is allowed,
// and the interval holds the other estimate.
func TestAutocorrelationPublished(t *testing.T) {
	for name, want := range map[string]float64{
		"grizzly.csv": -0.28164335, "lynx_1821_1934.csv": 0.56053652, "hare_1900_1920.csv": 0.48800906, "whooping_crane_1976_1993.csv": 0.42780561,
	} {
		r := fitted(t, name, Options{})
		e := r.Diagnostics.Autocorrelation
		if !(math.Abs(e.Value-want) <= 2/float64(r.Drift.Intervals)) || !(e.Low < want && want < e.High) {
			t.Errorf("%s: %.4f (%.4f to %.4f), by likelihood %.4f", name, e.Value, e.Low, e.High, want)
		}
	}
}
