package fit

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// Estimate is a figure with its interval and standard error; Low and High are
// NaN where it has none, SE is NaN where it has none.
type Estimate struct{ Value, Low, High, SE float64 }

// twoSided are the quantiles of Student's law with nu degrees of freedom at
// (1 +- confidence)/2: the upper one.
func twoSided(nu, confidence float64) float64 {
	return distuv.StudentsT{Mu: 0, Sigma: 1, Nu: nu}.Quantile((1 + confidence) / 2)
}

// normalQuantile is the upper two-sided quantile of the normal law.
func normalQuantile(confidence float64) float64 { return math.Sqrt2 * math.Erfinv(confidence) }

// twoSidedP is the chance of a Student's t beyond |t| on either side.
func twoSidedP(t, nu float64) float64 {
	return 2 * distuv.StudentsT{Mu: 0, Sigma: 1, Nu: nu}.CDF(-math.Abs(t))
}

// varianceInterval is the interval of a normal variance from its unbiased
// estimate with nu degrees of freedom.
func varianceInterval(v, nu, confidence float64) (low, high float64) {
	chi := distuv.ChiSquared{K: nu}
	return nu * v / chi.Quantile((1+confidence)/2), nu * v / chi.Quantile((1-confidence)/2)
}

// mean is the mean, by two passes, so that a large offset costs no digits.
func mean(x []float64) float64 {
	m := 0.0
	for _, v := range x {
		m += v
	}
	m /= float64(len(x))
	rest := 0.0
	for _, v := range x {
		rest += v - m
	}
	return m + rest/float64(len(x))
}

// deviation is the standard deviation, divisor n-1.
func deviation(x []float64) float64 {
	m, ss := mean(x), 0.0
	for _, v := range x {
		ss += (v - m) * (v - m)
	}
	return math.Sqrt(ss / float64(len(x)-1))
}

// autocorrelation is the lag-1 autocorrelation around centre.
func autocorrelation(x []float64, centre float64) float64 {
	num, den := 0.0, 0.0
	for i, v := range x {
		d := v - centre
		den += d * d
		if i > 0 {
			num += d * (x[i-1] - centre)
		}
	}
	return num / den
}

// line is a straight line y = a + b x by least squares.
type line struct {
	a, b     float64
	sa, sb   float64 // standard errors
	rss, sd  float64 // residual sum of squares; residual standard deviation
	r2       float64
	residual []float64
	leverage []float64
}

// straight fits a line by least squares, with x and y taken from their means so
// that a large offset costs no digits. There must be 3 points or more, and two
// of x that differ.
func straight(x, y []float64) line {
	n := float64(len(x))
	mx, my := mean(x), mean(y)
	var sxx, sxy, syy float64
	for i := range x {
		dx, dy := x[i]-mx, y[i]-my
		sxx += dx * dx
		sxy += dx * dy
		syy += dy * dy
	}
	l := line{b: sxy / sxx}
	l.a = my - l.b*mx
	for i := range x {
		e := (y[i] - my) - l.b*(x[i]-mx)
		l.rss += e * e
		l.residual = append(l.residual, e)
		l.leverage = append(l.leverage, 1/n+(x[i]-mx)*(x[i]-mx)/sxx)
	}
	l.sd = math.Sqrt(l.rss / (n - 2))
	l.sb = l.sd / math.Sqrt(sxx)
	l.sa = l.sd * math.Sqrt(1/n+mx*mx/sxx)
	l.r2 = 1 - l.rss/syy
	return l
}

// golden narrows a minimum of f between lo and hi by the golden section, so
// many times.
func golden(f func(float64) float64, lo, hi float64, times int) (x, fx float64) {
	const g = 0.6180339887498949
	a, b := hi-g*(hi-lo), lo+g*(hi-lo)
	fa, fb := f(a), f(b)
	for i := 0; i < times; i++ {
		if fa <= fb {
			hi, b, fb = b, a, fa
			a = hi - g*(hi-lo)
			fa = f(a)
		} else {
			lo, a, fa = a, b, fb
			b = lo + g*(hi-lo)
			fb = f(b)
		}
	}
	if fa <= fb {
		return a, fa
	}
	return b, fb
}

// lowest finds the least of f over a grid in order and narrows it down around
// every grid point that is no higher than its neighbours: each is a start of
// its own. at is the grid point from which the least came.
func lowest(f func(float64) float64, grid []float64) (x, fx float64, at int) {
	v := make([]float64, len(grid))
	for i, g := range grid {
		v[i] = f(g)
	}
	fx = math.Inf(1)
	for i := range grid {
		if (i > 0 && v[i-1] < v[i]) || (i+1 < len(grid) && v[i+1] < v[i]) || math.IsNaN(v[i]) {
			continue
		}
		if v[i] < fx {
			x, fx, at = grid[i], v[i], i
		}
		if gx, gf := golden(f, grid[max(i-1, 0)], grid[min(i+1, len(grid)-1)], 70); gf < fx {
			x, fx, at = gx, gf, i
		}
	}
	return x, fx, at
}

// root is where f, which rises from below 0 at lo to above it at hi, is 0: by
// false position in its Illinois form (M. Dowell & P. Jarratt 1971, BIT
// 11:168-174), halving where that is slow.
func root(f func(float64) float64, lo, hi float64) float64 {
	flo, fhi := f(lo), f(hi)
	side := 0
	for i := 0; i < 80 && hi-lo > 1e-10; i++ {
		x := (lo*fhi - hi*flo) / (fhi - flo)
		if i%3 == 0 || !(x > lo && x < hi) {
			x = (lo + hi) / 2
		}
		v := f(x)
		switch {
		case math.Abs(v) < 1e-12:
			return x
		case v < 0:
			lo, flo = x, v
			if side < 0 {
				fhi /= 2
			}
			side = -1
		default:
			hi, fhi = x, v
			if side > 0 {
				flo /= 2
			}
			side = 1
		}
	}
	return (lo + hi) / 2
}
