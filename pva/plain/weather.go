package plain

import (
	"math"
	"math/rand/v2"
	"slices"
	"sync"

	"gonum.org/v1/gonum/integrate/quad"

	"ebbline/pva"
)

// weather is the two standard normal series, common to all animals.
type weather struct{ births, deaths float64 }

// next moves both series to the next year, or draws them from their stationary
// law in the first. Both have the same memory, so the correlation of the
// innovations is that of the series too.
func (w *weather) next(p pva.Weather, first bool, src rand.Source) {
	ub, other := normal(src), normal(src)
	ud := p.Correlation*ub + math.Sqrt(1-p.Correlation*p.Correlation)*other
	if first {
		w.births, w.deaths = ub, ud
		return
	}
	fresh := math.Sqrt(1 - p.Memory*p.Memory)
	w.births = p.Memory*w.births + fresh*ub
	w.deaths = p.Memory*w.deaths + fresh*ud
}

// logNormal is a positive quantity with this mean and standard deviation, for
// the standard normal e.
func logNormal(mean, sd, e float64) float64 {
	if sd == 0 || mean == 0 {
		return mean
	}
	v := math.Log1p(sd / mean * (sd / mean))
	return mean * math.Exp(math.Sqrt(v)*e-v/2)
}

func logistic(x float64) float64 { return 1 / (1 + math.Exp(-x)) }

// logit is the u and v of a logit-normal fraction 1/(1 + exp(-(u + v e))).
type logit struct{ u, v float64 }

func (l logit) at(e float64) float64 { return l.u + l.v*e }

// matched keeps each match, as it is the same in every year and replicate.
var matched sync.Map // [2]float64{mean, sd} -> logit

// matchLogit solves u and v so that mean and standard deviation are these.
func matchLogit(mean, sd float64) logit {
	key := [2]float64{mean, sd}
	if l, ok := matched.Load(key); ok {
		return l.(logit)
	}
	withMean := func(v float64) logit {
		far := math.Abs(math.Log(mean/(1-mean))) + v*v + 10*v
		u := bisect(func(u float64) bool { m, _ := (logit{u, v}).moments(mean); return m > mean }, -far, far)
		return logit{u, v}
	}
	wide := func(v float64) bool { _, s := withMean(v).moments(mean); return s > sd }
	hi := 1.0
	for !wide(hi) && hi < 1e9 {
		hi *= 2
	}
	l := withMean(bisect(wide, 0, hi))
	matched.Store(key, l)
	return l
}

// moments is the mean of the fraction and the root of its mean square about
// centre, by Gauss-Legendre rules on panels of length 2 and, around the bend of
// the curve, on panels that shrink with its width.
func (l logit) moments(centre float64) (mean, sd float64) {
	const far = 20 // the normal density beyond is below 1e-87
	var cuts []float64
	for z := -far; z <= far; z += 2 {
		cuts = append(cuts, float64(z))
	}
	bend := -l.u / l.v
	for w := 1 / l.v; w < 2*far; w *= 2 {
		for _, z := range []float64{bend - w, bend, bend + w} {
			if math.Abs(z) < far {
				cuts = append(cuts, z)
			}
		}
	}
	slices.Sort(cuts)
	cuts = slices.Compact(cuts)
	var square float64
	for i := 1; i < len(cuts); i++ {
		middle, half := (cuts[i-1]+cuts[i])/2, (cuts[i]-cuts[i-1])/2
		for j, x := range nodes {
			z := middle + half*x
			w := half * weights[j] * math.Exp(-z*z/2) / math.Sqrt(2*math.Pi)
			f := logistic(l.at(z))
			mean += w * f
			square += w * (f - centre) * (f - centre)
		}
	}
	return mean, math.Sqrt(square)
}

// nodes and weights are the Gauss-Legendre rule on -1 to 1.
var nodes, weights = func() (x, w [16]float64) {
	quad.Legendre{}.FixedLocations(x[:], w[:], -1, 1)
	return x, w
}()
