package portable

import "math"

// pair is an unevaluated sum hi + lo of two doubles, about 106 bits. It is
// used to build the tables when the program starts and inside Pow. Every
// product is rounded by an explicit conversion, so that no compiler may fuse
// it with the addition that follows.
type pair struct{ hi, lo float64 }

// twoSum returns a + b exactly (Knuth 1969, The Art of Computer Programming 2).
func twoSum(a, b float64) pair {
	s := a + b
	t := s - a
	return pair{s, (a - (s - t)) + (b - t)}
}

// quickSum is twoSum for |a| >= |b| or a = 0.
func quickSum(a, b float64) pair {
	s := a + b
	return pair{s, b - (s - a)}
}

// split cuts a double into two halves of at most 26 bits (Dekker 1971,
// Numer. Math. 18:224). It overflows above 2^996; nothing here comes near.
func split(a float64) (hi, lo float64) {
	t := float64(134217729 * a)
	hi = t - (t - a)
	return hi, a - hi
}

// twoProd returns a * b exactly (Dekker 1971).
func twoProd(a, b float64) pair {
	p := float64(a * b)
	ah, al := split(a)
	bh, bl := split(b)
	e := float64(ah*bh) - p
	e = e + float64(ah*bl)
	e = e + float64(al*bh)
	e = e + float64(al*bl)
	return pair{p, e}
}

func (x pair) add(y pair) pair {
	s := twoSum(x.hi, y.hi)
	t := twoSum(x.lo, y.lo)
	s = quickSum(s.hi, s.lo+t.hi)
	return quickSum(s.hi, s.lo+t.lo)
}

func (x pair) mul(y pair) pair {
	p := twoProd(x.hi, y.hi)
	c := float64(x.hi*y.lo) + float64(x.lo*y.hi)
	return quickSum(p.hi, p.lo+c)
}

func (x pair) div(y pair) pair {
	q1 := x.hi / y.hi
	r := x.add(y.mul(pair{-q1, 0}))
	q2 := r.hi / y.hi
	r = r.add(y.mul(pair{-q2, 0}))
	q3 := r.hi / y.hi
	q := quickSum(q1, q2)
	return q.add(pair{q3, 0})
}

// ln2Pair is ln 2 to 106 bits; constant arithmetic in Go is exact.
var ln2Pair = pair{ln2Hi53, math.Ln2 - ln2Hi53}

const ln2Hi53 = 0x1.62e42fefa39efp-1

// expPair is exp(x) for |x| < 1 by the Taylor series.
func expPair(x pair) pair {
	sum := pair{1, 0}
	for n := 26; n >= 1; n-- {
		sum = sum.mul(x).div(pair{float64(n), 0}).add(pair{1, 0})
	}
	return sum
}

// logRatioPair is ln(a/b) for whole a and b within a factor of 2 of each
// other, by 2 atanh((a-b)/(a+b)).
func logRatioPair(a, b float64) pair {
	z := pair{a - b, 0}.div(pair{a + b, 0})
	z2 := z.mul(z)
	sum := pair{0, 0}
	for n := 45; n >= 1; n -= 2 {
		sum = sum.mul(z2).add(pair{1, 0}.div(pair{float64(n), 0}))
	}
	sum = sum.mul(z)
	return pair{2 * sum.hi, 2 * sum.lo}
}
