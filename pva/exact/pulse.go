package exact

import (
	"math"

	"ebbline/pva/rates"
)

// survivorLaw is the law of the survivors of n in a pulse year with death rate
// d: Binomial(n, exp(-d)), crowding seen at n.
func survivorLaw(m *rates.Model, d float64) law {
	if m.DeathCrowding.Form == rates.None {
		s := math.Exp(-d)
		return func(n int, buf []float64) (int, []float64) { return binomial(buf, n, s) }
	}
	return func(n int, buf []float64) (int, []float64) {
		return binomial(buf, n, math.Exp(-m.DeathAt(d, float64(n))))
	}
}

// youngLaw is the law of the young of n parents in a pulse year with birth rate b.
func youngLaw(m *rates.Model, b float64) law {
	size := m.Case.Births.Clumping.Value
	kind := m.Case.Births.Offspring
	return func(n int, buf []float64) (int, []float64) {
		each := m.BirthAt(b, float64(n))
		switch kind {
		case "at-most-one":
			return binomial(buf, n, math.Min(1, each))
		case "clumped":
			return negBinomial(buf, each*float64(n), size*float64(n))
		}
		return poisson(buf, each*float64(n))
	}
}

// grownLaw adds the parents themselves: from S survivors to S + B.
func grownLaw(young law) law {
	return func(n int, buf []float64) (int, []float64) {
		lo, row := young(n, buf)
		return n + lo, row
	}
}

// sumLaw is the law of the sum of two independent laws from the same n.
func sumLaw(a, b law) law {
	return func(n int, buf []float64) (int, []float64) {
		loA, x := a(n, nil)
		loB, y := b(n, nil)
		return convolve(buf, loA, x, loB, y)
	}
}
