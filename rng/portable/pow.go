package portable

import "math"

// Pow returns x to the power y for x >= 0, within one unit in the last place
// (gradual underflow apart). Special cases are those of math.Pow for x >= 0;
// a negative base gives NaN whatever y is, except that Pow(x, 0) = 1.
func Pow(x, y float64) float64 {
	switch {
	case y == 0 || x == 1:
		return 1
	case x != x || y != y || x < 0:
		return math.NaN()
	case y == 1:
		return x
	case x == 0:
		if y > 0 {
			return 0
		}
		return math.Inf(1)
	case math.IsInf(x, 1):
		if y > 0 {
			return x
		}
		return 0
	case math.IsInf(y, 0):
		if (x > 1) == (y > 0) {
			return math.Inf(1)
		}
		return 0
	}
	l := logPair(x)
	size := float64(l.hi * y)
	switch {
	case size > 710:
		return math.Inf(1)
	case size < -746:
		return 0
	case size > -0x1p-60 && size < 0x1p-60:
		return 1 + size
	}
	p := twoProd(l.hi, y)
	p.lo += float64(l.lo * y)
	p = quickSum(p.hi, p.lo)
	return expSum(p.hi, p.lo)
}
