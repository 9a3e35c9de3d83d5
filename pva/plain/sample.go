package plain

import (
	"fmt"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/stat/distuv"
)

// The samplers of gonum, each kept to where it is right.

// most is beyond every stop_above, and still counts exactly.
const most = 1 << 53

// whole is the largest whole number not above x, within what can be counted.
func whole(x float64) int64 {
	if math.IsNaN(x) {
		panic("plain: a number of animals is not a number")
	}
	return int64(math.Floor(min(max(x, -most), most)))
}

func normal(src rand.Source) float64      { return distuv.Normal{Sigma: 1, Src: src}.Rand() }
func uniform(src rand.Source) float64     { return distuv.Uniform{Max: 1, Src: src}.Rand() }
func exponential(src rand.Source) float64 { return distuv.Exponential{Rate: 1, Src: src}.Rand() }

func happens(p float64, src rand.Source) bool { return uniform(src) < p }

// round rounds at random to one of the two whole numbers beside x, so that the
// mean is x.
func round(x float64, src rand.Source) int64 {
	low := whole(x)
	if happens(x-float64(low), src) && low < most {
		low++
	}
	return low
}

// binomial is how many of n meet a chance of p each. gonum's sampler asks for
// n > 0 and never returns for a p that is not a number.
func binomial(n int64, p float64, src rand.Source) int64 {
	switch {
	case n < 0 || math.IsNaN(p):
		panic(fmt.Sprintf("plain: binomial with n = %d, p = %v", n, p))
	case n == 0 || p <= 0:
		return 0
	case p >= 1:
		return n
	}
	return whole(distuv.Binomial{N: float64(n), P: p, Src: src}.Rand())
}

// poisson is a Poisson number with this mean. From a mean of 10 on gonum's
// sampler never gives 0, so means below 50 are drawn as a sum of two halves; and its log-gamma loses all digits at huge means, where the normal law
// is as good.
func poisson(mean float64, src rand.Source) int64 {
	switch {
	case math.IsNaN(mean) || mean < 0:
		panic(fmt.Sprintf("plain: poisson with mean %v", mean))
	case mean == 0:
		return 0
	case mean >= 10 && mean < 50:
		return poisson(mean/2, src) + poisson(mean/2, src)
	case mean > most:
		return most
	case mean > 1e12:
		return whole(mean + math.Sqrt(mean)*normal(src))
	}
	return whole(distuv.Poisson{Lambda: mean, Src: src}.Rand())
}

// negBinomial has this mean and the variance mean (1 + mean/size): a Poisson
// number whose own mean is gamma distributed.
func negBinomial(mean, size float64, src rand.Source) int64 {
	if mean == 0 {
		return 0
	}
	return poisson(mean*distuv.Gamma{Alpha: size, Beta: size, Src: src}.Rand(), src)
}
