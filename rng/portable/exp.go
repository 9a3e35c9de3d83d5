package portable

import "math"

// The table-driven exponential of Tang (1989, ACM Trans. Math. Softw. 15:144):
// x = k ln2/128 + r with whole k and |r| <= ln2/256, and
// exp(x) = 2^(k div 128) * 2^((k mod 128)/128) * exp(r).
const (
	expBits = 7
	expSize = 1 << expBits

	// roundShift brings a double below 2^51 to the nearest whole number, which
	// then stands in the low bits.
	roundShift = 0x1.8p52

	perLn2 = expSize / math.Ln2
	// stepHi has 34 bits, so that k*stepHi is exact for every k in use.
	stepHi = 0x1.62e42fefp-8
	stepLo = math.Ln2/expSize - stepHi
)

// expEntry is 2^(i/128): bits of the rounded value less i<<45, so that adding
// k<<45 puts the whole part of k/128 into the exponent; and the relative error
// of the rounding.
type expEntry struct {
	tail float64
	bits uint64
}

var expTable = buildExpTable()

func buildExpTable() (table [expSize]expEntry) {
	for i := range table {
		e := expPair(ln2Pair.mul(pair{float64(i) / expSize, 0}))
		table[i].tail = e.lo / e.hi
		table[i].bits = math.Float64bits(e.hi) - uint64(i)<<(52-expBits)
	}
	return table
}

// Exp returns e to the power x, within 0.51 units in the last place (1 where the
// result is near or below the smallest normal number). It is 0 below -745.14 and +Inf above 709.79.
func Exp(x float64) float64 {
	if !(x > -690 && x < 709) { // below, scale*p may be subnormal
		return expEdge(x)
	}
	k := float64(x*perLn2) + roundShift
	ki := math.Float64bits(k)
	k -= roundShift
	r := x - float64(k*stepHi)
	r -= float64(k * stepLo)
	e := &expTable[ki&(expSize-1)]
	p := e.tail + expTail(r)
	scale := math.Float64frombits(e.bits + ki<<(52-expBits))
	return scale + float64(scale*p)
}

// expTail is exp(r) - 1 for |r| <= ln2/256; the first term left out is r^6/720,
// below 2^-60.
func expTail(r float64) float64 {
	r2 := float64(r * r)
	low := float64(r2 * (1.0/2 + float64(r*(1.0/6))))
	high := float64(float64(r2*r2) * (1.0/24 + float64(r*(1.0/120))))
	return r + (low + high)
}

// expEdge takes over where the result is out of range, subnormal, or near it.
func expEdge(x float64) float64 {
	switch {
	case x != x:
		return x
	case x > 709.79:
		return math.Inf(1)
	case x < -745.14:
		return 0
	}
	return expSum(x, 0)
}

// expSum is exp(hi + lo) for |hi| < 800 and |lo| at most a few units in the
// last place of hi. The power of two is put on in two exact steps, the last of
// which rounds once more if the result is subnormal or overflows.
func expSum(hi, lo float64) float64 {
	k := float64(hi*perLn2) + roundShift
	ki := math.Float64bits(k)
	k -= roundShift
	r := hi - float64(k*stepHi)
	r -= float64(k * stepLo)
	r += lo
	e := &expTable[ki&(expSize-1)]
	p := e.tail + expTail(r)
	n := int64(k)
	base := math.Float64frombits(e.bits + uint64(n&(expSize-1))<<(52-expBits))
	y := base + float64(base*p)
	n >>= expBits
	half := n >> 1
	y *= powerOfTwo(half)
	return y * powerOfTwo(n-half)
}

// powerOfTwo is 2^n for n from -1022 to 1023.
func powerOfTwo(n int64) float64 {
	return math.Float64frombits(uint64(n+1023) << 52)
}

// Expm1 returns e to the power x, less 1, without losing digits near x = 0.
func Expm1(x float64) float64 {
	if !(x > -40 && x < 40) {
		if x <= -40 {
			return -1
		}
		return Exp(x)
	}
	k := float64(x*perLn2) + roundShift
	ki := math.Float64bits(k)
	k -= roundShift
	if k == 0 {
		if x == 0 {
			return x
		}
		return expTail(x)
	}
	r := x - float64(k*stepHi)
	r -= float64(k * stepLo)
	e := &expTable[ki&(expSize-1)]
	scale := math.Float64frombits(e.bits + ki<<(52-expBits))
	s := twoSum(scale, -1)
	return s.hi + (s.lo + float64(scale*(e.tail+expTail(r))))
}

// Logistic returns 1/(1 + exp(-x)), the inverse of the logit.
func Logistic(x float64) float64 {
	return 1 / (1 + Exp(-x))
}
