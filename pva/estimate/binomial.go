package estimate

import (
	"fmt"
	"math"
)

// BinomialTail is the two-sided exact tail probability of x events in n trials
// of chance p: twice the smaller of P(X <= x) and P(X >= x), at most 1. It is
// sound down to 1e-300 and for n to 1e9 (relative error below 1e-9); a smaller
// tail is returned as 0.
func BinomialTail(x, n int64, p float64) float64 {
	lower, upper := tails(x, n, p)
	return math.Min(1, 2*math.Min(lower, upper))
}

// BinomialTailWidened is the largest BinomialTail over chances within err of p,
// for a p that is itself known only to within err.
func BinomialTailWidened(x, n int64, p, err float64) float64 {
	least, most := math.Max(0, p-err), math.Min(1, p+err)
	// P(X <= x) falls and P(X >= x) rises with the chance, so the tail is
	// largest at the end nearer to where they meet, and 1 if they meet between.
	if lower, upper := tails(x, n, least); upper >= lower {
		return math.Min(1, 2*lower)
	}
	if lower, upper := tails(x, n, most); lower >= upper {
		return math.Min(1, 2*upper)
	}
	return 1
}

// tails are P(X <= x) and P(X >= x) for X binomial(n, p). The one on the far
// side of the mean is summed term by term, outwards from x, all terms positive.
func tails(x, n int64, p float64) (lower, upper float64) {
	mustCount(x, n)
	switch {
	case !(p >= 0 && p <= 1):
		panic(fmt.Sprintf("estimate: chance %v is not between 0 and 1", p))
	case p == 0:
		return 1, toFloat(x == 0)
	case p == 1:
		return toFloat(x == n), 1
	}
	at := math.Exp(logBinomial(x, n, p))
	q := 1 - p
	if float64(x) <= float64(n)*p {
		sum, term := at, at
		for k := x; k > 0 && term > sum*1e-18; k-- {
			term *= float64(k) / float64(n-k+1) * (q / p)
			sum += term
		}
		return sum, 1 - sum + at
	}
	sum, term := at, at
	for k := x; k < n && term > sum*1e-18; k++ {
		term *= float64(n-k) / float64(k+1) * (p / q)
		sum += term
	}
	return 1 - sum + at, sum
}

func toFloat(yes bool) float64 {
	if yes {
		return 1
	}
	return 0
}

// logBinomial is ln P(X = x) for X binomial(n, p), 0 < p < 1, in saddle-point
// form, which keeps its accuracy for any n (C. Loader 2000, Fast and Accurate
// Computation of Binomial Probabilities).
func logBinomial(x, n int64, p float64) float64 {
	k, m := float64(x), float64(n)
	switch x {
	case 0:
		return m * math.Log1p(-p)
	case n:
		return m * math.Log(p)
	}
	return stirlingRest(m) - stirlingRest(k) - stirlingRest(m-k) -
		divergence(x, n, p) - 0.5*math.Log(2*math.Pi*k*((m-k)/m))
}

// divergence is n times the Kullback-Leibler divergence of chance p from the
// observed share x/n: x ln(x/(np)) + (n-x) ln((n-x)/(n(1-p))).
func divergence(x, n int64, p float64) float64 {
	return deviance(float64(x), float64(n)*p) + deviance(float64(n-x), float64(n)*(1-p))
}

// deviance is x ln(x/m) + m - x without cancellation near x = m (Loader 2000,
// his function D0): by the series of the inverse hyperbolic tangent there.
func deviance(x, m float64) float64 {
	if x == 0 {
		return m
	}
	if m == 0 {
		return math.Inf(1)
	}
	d := x - m
	if math.Abs(d) >= 0.1*(x+m) {
		return x*math.Log(x/m) - d
	}
	v := d / (x + m)
	sum, term := d*v, 2*x*v
	for j := 3.0; ; j += 2 {
		term *= v * v
		next := sum + term/j
		if next == sum {
			return sum
		}
		sum = next
	}
}

// stirlingRest is what Stirling's formula leaves out of ln Gamma(z+1), z > 0:
// ln Gamma(z+1) - (z + 1/2) ln z + z - ln(2 pi)/2. The series is that of
// Abramowitz & Stegun 1964, 6.1.41.
func stirlingRest(z float64) float64 {
	if z < 16 {
		g, _ := math.Lgamma(z + 1)
		return g - (z+0.5)*math.Log(z) + z - 0.5*math.Log(2*math.Pi)
	}
	w := 1 / (z * z)
	return (1.0/12 - w*(1.0/360-w*(1.0/1260-w*(1.0/1680-w*(1.0/1188))))) / z
}
