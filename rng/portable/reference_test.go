package portable

import (
	"math"
	"math/big"
)

// The reference: plain series in 256-bit arithmetic.
const referenceBits = 256

func bigOf(x float64) *big.Float { return new(big.Float).SetPrec(referenceBits).SetFloat64(x) }

func newBig() *big.Float { return new(big.Float).SetPrec(referenceBits) }

// bigExp halves x until it is small, sums the Taylor series and squares back.
func bigExp(x *big.Float) *big.Float {
	halvings := 0
	y := newBig().Set(x)
	if y.Sign() != 0 {
		halvings = max(0, y.MantExp(nil)+10)
		y.SetMantExp(y, -halvings)
	}
	sum, term := bigOf(1), bigOf(1)
	for n := 1; n < 40; n++ {
		term.Mul(term, y)
		term.Quo(term, bigOf(float64(n)))
		sum.Add(sum, term)
	}
	for range halvings {
		sum.Mul(sum, sum)
	}
	return sum
}

// bigLog solves exp(y) = x by Newton's method from a double: 50, 100, 200 bits
// and on.
func bigLog(x *big.Float) *big.Float {
	m := newBig()
	e := x.MantExp(m)
	f, _ := m.Float64()
	y := newBig().Add(bigOf(math.Log(f)), newBig().Mul(bigOf(float64(e)), bigLn2Value))
	for range 3 {
		q := newBig().Mul(x, bigExp(newBig().Neg(y))) // x exp(-y)
		y.Add(y, q.Sub(q, bigOf(1)))
	}
	return y
}

// bigLn2 is the sum of 1/(n 2^n).
func bigLn2() *big.Float {
	sum := newBig()
	for n := 1; n < referenceBits; n++ {
		sum.Add(sum, newBig().SetMantExp(newBig().Quo(bigOf(1), bigOf(float64(n))), -n))
	}
	return sum
}

// bigPi is Machin's 16 atan(1/5) - 4 atan(1/239).
func bigPi() *big.Float {
	atan := func(d float64) *big.Float {
		sum := newBig()
		power := newBig().Quo(bigOf(1), bigOf(d))
		square := newBig().Mul(power, power)
		for n := 1; n < 2*referenceBits; n += 2 {
			t := newBig().Quo(power, bigOf(float64(n)))
			if n%4 == 3 {
				t.Neg(t)
			}
			sum.Add(sum, t)
			power.Mul(power, square)
		}
		return sum
	}
	p := newBig().Mul(bigOf(16), atan(5))
	return p.Sub(p, newBig().Mul(bigOf(4), atan(239)))
}

var bigPiValue, bigLn2Value = bigPi(), bigLn2()

// bigSin is the Taylor series at a few turns at most.
func bigSin(x *big.Float) *big.Float {
	square := newBig().Mul(x, x)
	term := newBig().Set(x)
	sum := newBig().Set(x)
	for n := 2; n < 120; n += 2 {
		term.Mul(term, square)
		term.Quo(term, bigOf(-float64(n*(n+1))))
		sum.Add(sum, term)
	}
	return sum
}

// ulps is the distance of got from want in units of the last place of want;
// below the normal range the unit is that of the smallest normal numbers.
func ulps(got float64, want *big.Float) float64 {
	w, _ := want.Float64()
	if math.IsInf(w, 0) || math.IsInf(got, 0) || got != got {
		if got == w {
			return 0
		}
		return math.Inf(1)
	}
	_, e := math.Frexp(w)
	unit := math.Ldexp(1, max(e, -1021)-53)
	d := newBig().Sub(bigOf(got), want)
	f, _ := d.Quo(d, bigOf(unit)).Float64()
	return math.Abs(f)
}
