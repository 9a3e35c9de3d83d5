package portable

import "math"

// SinTurns returns the sine of 2 pi t: t counts whole turns, so that the
// reduction to an eighth of a turn is exact and the multiples of a quarter
// turn give exactly 0, 1 and -1. It is NaN for an infinite t. The polynomials
// are the Taylor series on |angle| <= pi/4; the first terms left out are below
// 2^-58 of the result.
func SinTurns(t float64) float64 {
	if !(t > -0x1p51 && t < 0x1p51) {
		if t-t != 0 {
			return math.NaN()
		}
		t -= math.Floor(t) // exact, and 0 from 2^52 on
	}
	quarter := math.Floor(float64(4*t) + 0.5)
	f := t - float64(quarter*0.25)
	// 2 pi f as head and tail.
	const twoPi = 0x1.921fb54442d18p2
	p := twoProd(f, twoPi)
	p.lo += float64(f * (2*math.Pi - twoPi))
	var y float64
	q := int64(quarter)
	if q&1 == 0 {
		y = sinSmall(p)
	} else {
		y = cosSmall(p)
	}
	if q&2 != 0 {
		y = 0 - y
	}
	return y
}

func sinSmall(x pair) float64 {
	z := float64(x.hi * x.hi)
	s := float64(z * (1.0 / 355687428096000))
	s = float64(z * (s - 1.0/1307674368000))
	s = float64(z * (s + 1.0/6227020800))
	s = float64(z * (s - 1.0/39916800))
	s = float64(z * (s + 1.0/362880))
	s = float64(z * (s - 1.0/5040))
	s = float64(z * (s + 1.0/120))
	s = float64(z * (s - 1.0/6))
	// the derivative of the sine carries the tail
	return x.hi + (float64(x.hi*s) + float64(x.lo*(1-float64(0.5*z))))
}

func cosSmall(x pair) float64 {
	z := float64(x.hi * x.hi)
	c := float64(z * (1.0 / 20922789888000))
	c = float64(z * (c - 1.0/87178291200))
	c = float64(z * (c + 1.0/479001600))
	c = float64(z * (c - 1.0/3628800))
	c = float64(z * (c + 1.0/40320))
	c = float64(z * (c - 1.0/720))
	c = float64(z * (c + 1.0/24))
	half := float64(0.5 * z)
	w := 1 - half
	return w + (((1 - w) - half) + (float64(z*c) - float64(x.hi*x.lo)))
}
