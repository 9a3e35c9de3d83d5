package exact

import (
	"math"

	"gonum.org/v1/gonum/integrate/quad"
)

// nodes are points and weights that integrate against the standard normal law.
type nodes struct{ at, weight []float64 }

// one is the rule for a quantity that does not vary.
var one = nodes{[]float64{0}, []float64{1}}

// normalNodes is a rule of n points: Gauss-Hermite for few, and from 30 on the
// trapezoid rule on -8.4 to 8.4, which then resolves finer detail with the same
// number (Trefethen & Weideman 2014, SIAM Review 56:385).
func normalNodes(n int) nodes {
	if n < 30 {
		return gauss(n).drop()
	}
	r := nodes{make([]float64, n), make([]float64, n)}
	for i := range r.at {
		e := -8.4 + 16.8*float64(i)/float64(n-1)
		r.at[i], r.weight[i] = e, math.Exp(-e*e/2)
	}
	return r.normal().drop()
}

// gauss is the Gauss-Hermite rule of n points, all of them.
func gauss(n int) nodes {
	r := nodes{make([]float64, n), make([]float64, n)}
	quad.Hermite{}.FixedLocations(r.at, r.weight, math.Inf(-1), math.Inf(1))
	for i := range r.at {
		r.at[i] *= math.Sqrt2
	}
	return r.normal()
}

// normal divides the weights by their sum.
func (r nodes) normal() nodes {
	sum := 0.0
	for _, w := range r.weight {
		sum += w
	}
	for i := range r.weight {
		r.weight[i] /= sum
	}
	return r
}

// drop leaves out points of a weight below 1e-17.
func (r nodes) drop() nodes {
	var out nodes
	for i, w := range r.weight {
		if w >= 1e-17 {
			out.at, out.weight = append(out.at, r.at[i]), append(out.weight, w)
		}
	}
	return out
}

// straightNodes is the Gauss-Legendre rule of n points between a and b.
func straightNodes(n int, a, b float64) nodes {
	r := nodes{make([]float64, n), make([]float64, n)}
	quad.Legendre{}.FixedLocations(r.at, r.weight, a, b)
	return r
}
