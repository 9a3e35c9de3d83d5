package rng

import (
	"fmt"
	"math"

	"ebbline/rng/portable"
)

// Gamma draws from the gamma law of the given shape, from 1e-6 to 1e15, and
// scale 1. It panics on any other shape.
//
// Marsaglia & Tsang (2000, ACM Trans. Math. Softw. 26:363). A shape below 1 is
// raised by 1 and the draw multiplied by U^(1/shape), their section 6; the
// result may then underflow to 0, as it should.
func Gamma(s *Stream, shape float64) float64 {
	if !(shape >= minShape && shape <= maxShape) {
		panic(fmt.Sprintf("rng: gamma shape %v is not from 1e-6 to 1e15", shape))
	}
	return gammaTimes(s, shape, 1)
}

const (
	minShape = 1e-6
	maxShape = 1e15
)

// gammaTimes is scale times a gamma number; the powers of a small shape are put
// together with the scale before anything underflows.
func gammaTimes(s *Stream, shape, scale float64) float64 {
	if shape >= 1 {
		return gammaLarge(s, shape) * scale
	}
	g := gammaLarge(s, shape+1) * scale
	return g * portable.Exp(-Exponential(s)/shape)
}

func gammaLarge(s *Stream, shape float64) float64 {
	d := shape - 1.0/3
	c := 1 / math.Sqrt(float64(9*d))
	for {
		x := Normal(s)
		t := float64(c * x)
		if t <= -1 {
			continue
		}
		v := 1 + t
		v = float64(float64(v*v) * v)
		u := s.Float64()
		x2 := float64(x * x)
		if u < 1-float64(0.0331*float64(x2*x2)) {
			return d * v
		}
		// ln u < x^2/2 + d (1 - v + ln v), with v = (1+t)^3 and x^2/2 = 9 d t^2/2:
		// all that is left of the right side is 3 d (ln(1+t) - t + t^2/2 - t^3/3),
		// in which large d costs no digits.
		if portable.Log(u) < float64(3*float64(d*logBeyondCube(t))) {
			return d * v
		}
	}
}

// logBeyondCube is ln(1+t) - t + t^2/2 - t^3/3 for t > -1.
func logBeyondCube(t float64) float64 {
	t2 := float64(t * t)
	if t > 0.05 || t < -0.05 {
		return portable.Log1p(t) - t + float64(0.5*t2) - float64(t2*t)/3
	}
	sum := 0.0
	for j := 14; j >= 4; j-- {
		sum = float64(t*sum) + sign(j)/float64(j)
	}
	return float64(float64(t2*t2) * sum)
}

// sign is the sign of the term t^j/j in the series of ln(1+t).
func sign(j int) float64 {
	if j&1 == 0 {
		return -1
	}
	return 1
}
