package exact

import (
	"math"

	"ebbline/pva/rates"
)

// climate is what the weather of a case amounts to.
type climate struct {
	births, deaths bool    // which rates vary between years
	correlation    float64 // of the two normal series, 0 unless both vary
	memory         float64 // 0 unless a rate varies
}

func climateOf(m *rates.Model) climate {
	c := climate{births: m.Birth.Sigma != 0, deaths: m.Death.Varies()}
	if c.births && c.deaths {
		c.correlation = m.Case.Weather.Correlation
	}
	if c.births || c.deaths {
		c.memory = m.Case.Weather.Memory
	}
	return c
}

// still says that no rate varies between years.
func (c climate) still() bool { return !c.births && !c.deaths }

// apart says that births and deaths vary independently of each other, so that
// each can be averaged on its own.
func (c climate) apart() bool { return c.correlation == 0 }

// axes is the number of independent normal numbers behind a year's rates.
func (c climate) axes() int {
	switch {
	case c.still():
		return 0
	case c.births && c.deaths && math.Abs(c.correlation) < 1:
		return 2
	}
	return 1
}

// point is one weather of a grid: the two standard normal numbers and the weight.
type point struct{ births, deaths, weight float64 }

// split is the same grid by the deaths' number first: points[i] of the outer
// rule has the deaths' number outer.at[i], and given it the births' numbers.
type split struct {
	outer nodes
	inner []nodes // births' numbers and weights, given the outer point
}

// grid takes a rule for each axis: the deaths' number is the first axis,
// the births' number is rho times it plus sqrt(1-rho^2) times the second.
func (c climate) grid(rule nodes) split {
	switch {
	case c.still():
		return split{one, []nodes{one}}
	case !c.deaths:
		return split{one, []nodes{rule}}
	}
	g := split{outer: rule}
	for _, e := range rule.at {
		inner := one
		switch {
		case !c.births:
		case math.Abs(c.correlation) == 1:
			inner = nodes{[]float64{c.correlation * e}, []float64{1}}
		default:
			inner = nodes{make([]float64, len(rule.at)), rule.weight}
			for j, z := range rule.at {
				inner.at[j] = c.correlation*e + math.Sqrt(1-c.correlation*c.correlation)*z
			}
		}
		g.inner = append(g.inner, inner)
	}
	return g
}

// points is the grid as one list, outer point by outer point.
func (g split) points() []point {
	var out []point
	for i, e := range g.outer.at {
		for j, f := range g.inner[i].at {
			out = append(out, point{f, e, g.outer.weight[i] * g.inner[i].weight[j]})
		}
	}
	return out
}

// prune leaves out points of a weight below least and divides by what is left.
func prune(points []point, least float64) []point {
	var out []point
	sum := 0.0
	for _, p := range points {
		if p.weight >= least {
			out = append(out, p)
			sum += p.weight
		}
	}
	for i := range out {
		out[i].weight /= sum
	}
	return out
}

// mehler is the chance-like matrix that carries the law of the weather at the
// points of a Gauss-Hermite rule one year on, for a normal series with the
// given memory: the sum over l of memory^l h_l(x) h_l(y), h_l the normalised
// Hermite polynomials (Mehler 1866), cut at the number of points. It is exact
// for polynomials of a degree below that number; entry [i][j] is from i to j.
func mehler(r nodes, memory float64) [][]float64 {
	n := len(r.at)
	h := make([][]float64, n) // h[l][i]
	for l := range h {
		h[l] = make([]float64, n)
		for i, x := range r.at {
			switch l {
			case 0:
				h[l][i] = 1
			case 1:
				h[l][i] = x
			default:
				h[l][i] = (x*h[l-1][i] - math.Sqrt(float64(l-1))*h[l-2][i]) / math.Sqrt(float64(l))
			}
		}
	}
	t := make([][]float64, n)
	for i := range t {
		t[i] = make([]float64, n)
		for j := range t[i] {
			power, sum := 1.0, 0.0
			for l := 0; l < n; l++ {
				sum += power * h[l][i] * h[l][j]
				power *= memory
			}
			t[i][j] = sum * r.weight[j]
		}
	}
	return t
}
