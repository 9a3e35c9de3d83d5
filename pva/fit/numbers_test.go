package fit

import (
	"math"
	"testing"
)

// The Statistical Reference Datasets of the National Institute of Standards and
// Technology: certified values to 15 digits.

// TestReferenceUnivariate: NumAcc1 to NumAcc4 (mean, standard deviation, lag-1
// autocorrelation). Doubles hold the data of the last two to about 1e-9 and
// 1e-8 of their spread.
func TestReferenceUnivariate(t *testing.T) {
	alternating := func(base float64) []float64 {
		x := []float64{base + 0.2}
		for i := 0; i < 500; i++ {
			x = append(x, base+0.1, base+0.3)
		}
		return x
	}
	for _, r := range []struct {
		name           string
		x              []float64
		mean, sd, lag1 float64
		relative       float64
	}{
		{"NumAcc1", []float64{10000001, 10000003, 10000002}, 10000002, 1, -0.5, 1e-15},
		{"NumAcc2", alternating(1), 1.2, 0.1, -0.999, 1e-13},
		{"NumAcc3", alternating(1e6), 1000000.2, 0.1, -0.999, 1e-8},
		{"NumAcc4", alternating(1e7), 10000000.2, 0.1, -0.999, 1e-7},
	} {
		m := mean(r.x)
		agreeTo(t, r.name+" mean", m, r.mean, 1e-15)
		agreeTo(t, r.name+" sd", deviation(r.x), r.sd, r.relative)
		agreeTo(t, r.name+" autocorrelation", autocorrelation(r.x, m), r.lag1, r.relative)
	}
}

// TestReferenceLine: the straight line through Norris.
func TestReferenceLine(t *testing.T) {
	x := []float64{0.2, 337.4, 118.2, 884.6, 10.1, 226.5, 666.3, 996.3, 448.6, 777.0, 558.2, 0.4, 0.6, 775.5, 666.9, 338.0, 447.5, 11.6, 556.0, 228.1, 995.8, 887.6, 120.2, 0.3, 0.3, 556.8, 339.1, 887.2, 999.0, 779.0, 11.1, 118.3, 229.2, 669.1, 448.9, 0.5}
	y := []float64{0.1, 338.8, 118.1, 888.0, 9.2, 228.1, 668.5, 998.5, 449.1, 778.9, 559.2, 0.3, 0.1, 778.1, 668.8, 339.3, 448.9, 10.8, 557.7, 228.3, 998.0, 888.8, 119.6, 0.3, 0.6, 557.6, 339.3, 888.0, 998.5, 778.9, 10.2, 117.6, 228.9, 668.4, 449.2, 0.2}
	l := straight(x, y)
	agreeTo(t, "intercept", l.a, -0.262323073774029, 1e-11)
	agreeTo(t, "its standard error", l.sa, 0.232818234301152, 1e-11)
	agreeTo(t, "slope", l.b, 1.00211681802045, 1e-13)
	agreeTo(t, "its standard error", l.sb, 0.000429796848199937, 1e-11)
	agreeTo(t, "residual sd", l.sd, 0.884796396144373, 1e-11)
	agreeTo(t, "squared correlation", l.r2, 0.999993745883712, 1e-13)
	agreeTo(t, "residual sum of squares", l.rss, 26.6173985294224, 1e-11)
	sum := 0.0
	for _, h := range l.leverage {
		sum += h
	}
	agreeTo(t, "sum of leverages: the number of parameters", sum, 2, 1e-13)
}

// TestGolden: the search finds a minimum inside and at an edge.
func TestGolden(t *testing.T) {
	grid := []float64{0, 1, 2, 3, 4}
	x, _, _ := lowest(func(x float64) float64 { return math.Pow(x-2.3, 2) }, grid)
	if !(math.Abs(x-2.3) < 1e-7) {
		t.Errorf("found %g, want 2.3", x)
	}
	if x, fx, at := lowest(func(x float64) float64 { return x }, grid); x != 0 || fx != 0 || at != 0 {
		t.Errorf("found %g at %d, want the edge", x, at)
	}
	// Two dips: the lower one wins although the grid shows the other lower.
	two := func(x float64) float64 {
		return -0.5*math.Exp(-(x-1)*(x-1)) - 2*math.Exp(-4*(x-3.4)*(x-3.4))
	}
	if x, _, _ := lowest(two, grid); !(math.Abs(x-3.4) < 1e-3) {
		t.Errorf("found %g, want 3.4", x)
	}
}
