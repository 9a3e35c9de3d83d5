package rng

import "ebbline/rng/portable"

// The probabilities in the acceptance steps are computed as Loader does
// (2000, "Fast and accurate computation of binomial probabilities"):
//
//	ln x! = ln sqrt(2 pi x) + x ln x - x + stirlingTail(x)
//	deviance(x, m) = x ln(x/m) + m - x
//
// so that no two large numbers are subtracted, however large the counts. The
// usual sums of log-factorials lose all their digits from 2^40 on.

// stirlingSize is from where on the series of stirlingTail has full accuracy.
const stirlingSize = 16

var stirlingTable = buildStirlingTable()

// buildStirlingTable goes down from the series by
// tail(k) - tail(k+1) = (k + 1/2) ln(1 + 1/k) - 1 = sum over j >= 1 of
// 1/((2j+1) (2k+1)^2j), all of whose terms are positive.
func buildStirlingTable() (t [stirlingSize]float64) {
	next := stirlingSeries(stirlingSize)
	for k := stirlingSize - 1; k >= 1; k-- {
		z := 1 / float64(float64(2*k+1)*float64(2*k+1))
		sum := 0.0
		for j := 20; j >= 1; j-- {
			sum = float64(z * (1/float64(2*j+1) + sum))
		}
		next += sum
		t[k] = next
	}
	return t
}

// stirlingSeries is the asymptotic series (Abramowitz & Stegun 1964, 6.1.41);
// the first term left out is below 2e-18 for x >= 16.
func stirlingSeries(x float64) float64 {
	y := 1 / x
	z := float64(y * y)
	t := float64(z * (1.0 / 156))
	t = float64(z * (691.0/360360 - t))
	t = float64(z * (1.0/1188 - t))
	t = float64(z * (1.0/1680 - t))
	t = float64(z * (1.0/1260 - t))
	t = float64(z * (1.0/360 - t))
	return float64(y * (1.0/12 - t))
}

// stirlingTail is ln x! - ln sqrt(2 pi x) - x ln x + x for whole x >= 1.
func stirlingTail(x float64) float64 {
	if x < stirlingSize {
		return stirlingTable[int(x)]
	}
	return stirlingSeries(x)
}

// deviance is x ln(x/m) + m - x for x > 0 and m > 0, given dev = x - m; it is
// about dev^2/(2m) where x is near m, and is summed there without loss: with
// v = dev/(x+m) it is dev v + 2 x v (v^2/3 + v^4/5 + ...), Loader's equation.
// The terms left out are below 1e-17 of the first.
func deviance(x, m, dev float64) float64 {
	v := dev / (x + m)
	z := float64(v * v)
	var t float64
	switch {
	case z < 1e-3:
		t = 1.0/3 + float64(z*(1.0/5+float64(z*(1.0/7+float64(z*(1.0/9+float64(z*(1.0/11))))))))
	case z < 1e-2:
		t = 1.0/13 + float64(z*(1.0/15+float64(z*(1.0/17+float64(z*(1.0/19))))))
		t = 1.0/7 + float64(z*(1.0/9+float64(z*(1.0/11+float64(z*t)))))
		t = 1.0/3 + float64(z*(1.0/5+float64(z*t)))
	default:
		return float64(x*portable.Log(x/m)) - dev
	}
	return float64(dev*v) + float64(float64(2*float64(x*v))*float64(z*t))
}
