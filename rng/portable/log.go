package portable

import "math"

// The table-driven logarithm of Tang (1990, ACM Trans. Math. Softw. 16:378),
// with a reciprocal of ten bits in place of his division: x = 2^k z with z from
// 0.703 to 1.406; the table holds c of the form j/512 near 1/z and ln(1/c);
// r = z c - 1 is formed from two exact products; and
// ln x = k ln2 + ln(1/c) + ln(1 + r), |r| < 1/128.
const (
	logBits = 7
	logSize = 1 << logBits
	// logFrom is the bits of 0.703125, the low end of z. The two cells that
	// meet at z = 1 have c = 1, so that r is exact there and the result keeps
	// its relative accuracy.
	logFrom = 0x3fe6800000000000

	// ln2Top is a multiple of 2^-42, so that k*ln2Top and the sums with the
	// high parts of the table are exact.
	ln2Top = 0x1.62e42fefa38p-1
	ln2Low = math.Ln2 - ln2Top

	smallestNormal = 0x0010000000000000
	infinityBits   = 0x7ff0000000000000
)

// logEntry is c, and ln(1/c) as a multiple of 2^-42 and the rest.
type logEntry struct{ c, hi, lo float64 }

var logTable = buildLogTable()

func buildLogTable() (table [logSize]logEntry) {
	for i := range table {
		from := math.Float64frombits(logFrom + uint64(i)<<(52-logBits))
		to := math.Float64frombits(logFrom + uint64(i+1)<<(52-logBits))
		j := math.Floor(1024/(from+to) + 0.5)
		if from == 1 || to == 1 {
			j = 512
		}
		l := logRatioPair(512, j)
		hi := math.Floor(float64(l.hi*0x1p42)+0.5) * 0x1p-42
		rest := l.add(pair{-hi, 0})
		table[i] = logEntry{j / 512, hi, rest.hi}
	}
	return table
}

// Log returns the natural logarithm of x, within one unit in the last place:
// -Inf at 0 and NaN below.
func Log(x float64) float64 {
	ix := math.Float64bits(x)
	k := 0.0
	if ix-smallestNormal >= infinityBits-smallestNormal {
		if !(x > 0 && x < math.Inf(1)) {
			return logEdge(x)
		}
		ix = math.Float64bits(x * 0x1p54) // subnormal: exact
		k = -54
	}
	t := ix - logFrom
	k += float64(int64(t) >> 52)
	iz := ix - t&(0xfff<<52)
	e := &logTable[t>>(52-logBits)&(logSize-1)]
	z := math.Float64frombits(iz)
	zh := math.Float64frombits(iz &^ (1<<21 - 1))
	r := (float64(zh*e.c) - 1) + float64((z-zh)*e.c)

	w := float64(k*ln2Top) + e.hi
	hi := w + r
	lo := (w - hi) + r + (float64(k*ln2Low) + e.lo)
	r2 := float64(r * r)
	return hi + (lo + float64(r2*logTail(r, r2)))
}

// logTail is (ln(1+r) - r)/r^2 for |r| < 1/128; the first term left out is
// r^7/9, below 2^-52 of the leading -1/2.
func logTail(r, r2 float64) float64 {
	a := -1.0/2 + float64(r*(1.0/3))
	b := -1.0/4 + float64(r*(1.0/5))
	c := -1.0/6 + float64(r*(1.0/7))
	return a + float64(r2*(b+float64(r2*(c-float64(r2*(1.0/8))))))
}

func logEdge(x float64) float64 {
	switch {
	case x == 0:
		return math.Inf(-1)
	case x > 0 || x != x:
		return x
	}
	return math.NaN()
}

// Log1p returns the natural logarithm of 1 + x without losing digits near
// x = 0: -Inf at -1 and NaN below.
func Log1p(x float64) float64 {
	if x > -0x1p-54 && x < 0x1p-54 || !(x > -1 && x < math.Inf(1)) {
		if x < -1 {
			return math.NaN()
		}
		if x == -1 {
			return math.Inf(-1)
		}
		return x
	}
	// 1 + x = u + d exactly, and ln(u + d) = ln u + d/u to well past a double.
	u := twoSum(1, x)
	return Log(u.hi) + u.lo/u.hi
}

// logPair is ln x for a positive normal or subnormal x to about 66 bits.
func logPair(x float64) pair {
	ix := math.Float64bits(x)
	k := 0.0
	if ix < smallestNormal {
		ix = math.Float64bits(x * 0x1p54)
		k = -54
	}
	t := ix - logFrom
	k += float64(int64(t) >> 52)
	iz := ix - t&(0xfff<<52)
	e := &logTable[t>>(52-logBits)&(logSize-1)]
	z := math.Float64frombits(iz)
	zh := math.Float64frombits(iz &^ (1<<21 - 1))
	r := twoSum(float64(zh*e.c)-1, float64((z-zh)*e.c))

	sq := twoProd(r.hi, r.hi)
	sq.lo += float64(2 * float64(r.hi*r.lo))
	r2 := sq.hi
	tail := logTail(r.hi, r2) + 0.5
	// r - r^2/2 in two doubles, the cubic and later terms in one.
	cubic := float64(r2 * tail)
	sum := twoSum(float64(k*ln2Top)+e.hi, r.hi)
	sum = sum.add(pair{-0.5 * sq.hi, -0.5 * sq.lo})
	sum.lo += r.lo + cubic + (float64(k*ln2Low) + e.lo)
	return quickSum(sum.hi, sum.lo)
}
