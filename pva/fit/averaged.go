package fit

import (
	"math"
	"sort"

	"gonum.org/v1/gonum/integrate/quad"
)

// Gauss-Legendre nodes of a panel, and how far out the normal law is followed,
// in standard deviations: 1e-18 lies beyond on either side.
const (
	panelNodes = 48
	reach      = 9
)

// ByFrom is the chance of having fallen by time t from a start that is not
// known: its distance is normal with mean Distance and variance spread. A start
// at or below the threshold has fallen already. By Gauss-Legendre quadrature
// over panels that end where the chance bends; good to 1e-10.
func (p Passage) ByFrom(t, spread float64) float64 {
	if spread <= 0 {
		return p.By(t)
	}
	sd := math.Sqrt(spread)
	low, high := math.Max(0, p.Distance-reach*sd), p.Distance+reach*sd
	fallen := math.Exp(logPhi(-p.Distance / sd))
	if high <= low || t <= 0 {
		return fallen
	}
	ends := []float64{low, high}
	bend := func(x float64) {
		if x > low && x < high {
			ends = append(ends, x)
		}
	}
	s := math.Sqrt(p.Variance * math.Max(0, t))
	carried := -p.Mu * t // where a motion without noise just falls
	for _, k := range []float64{-8, -2, 0, 2, 8} {
		bend(carried + k*s)
		bend(math.Abs(k) * s)
		bend(p.Distance + k/2*sd)
	}
	if p.Mu > 0 { // the chance of ever falling goes with exp(-x/scale)
		for _, k := range []float64{2, 10, 40} {
			bend(k * p.Variance / (2 * p.Mu))
		}
	}
	sort.Float64s(ends)
	of := func(x float64) float64 {
		z := (x - p.Distance) / sd
		return Passage{x, p.Mu, p.Variance}.By(t) * math.Exp(-0.5*z*z) / (sd * math.Sqrt(2*math.Pi))
	}
	for i := 1; i < len(ends); i++ {
		if ends[i] > ends[i-1] {
			fallen += quad.Fixed(of, ends[i-1], ends[i], panelNodes, quad.Legendre{}, 0)
		}
	}
	return math.Min(1, fallen)
}
