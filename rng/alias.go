package rng

import "math/bits"

// Alias tables (Walker 1977, ACM Trans. Math. Softw. 3:253; construction after
// Vose 1991, IEEE Trans. Softw. Eng. 17:972) in whole numbers. A table has
// 2^b cells, b = 6 or 8. An entry holds a threshold in its top 64-b bits and
// the alias in its low b bits. A word chooses a cell by its low b bits and
// compares its top 64-b bits with the threshold, so that one word makes one
// draw and every probability is a whole multiple of 2^-64.

type (
	alias256 [256]uint64
	alias64  [64]uint64
)

func (t *alias256) draw(word uint64) int64 {
	e := t[word&255]
	k := word & 255
	if word>>8 >= e>>8 {
		k = e & 255
	}
	return int64(k)
}

func (t *alias64) draw(word uint64) int64 {
	e := t[word&63]
	k := word & 63
	if word>>6 >= e>>6 {
		k = e & 63
	}
	return int64(k)
}

// fillAlias builds the entries from weights that add up to 2^64 (mod 2^64: to
// 0). len(weight) = len(entry) is a power of two.
func fillAlias(entry, weight []uint64) {
	size := len(entry)
	b := uint(bits.TrailingZeros(uint(size)))
	share := uint64(1) << (64 - b) // the content of a full cell
	rest := append([]uint64(nil), weight...)
	var small, large []int // cells with less than a share, and the others
	for i, w := range rest {
		if w < share {
			small = append(small, i)
		} else {
			large = append(large, i)
		}
	}
	for len(small) > 0 {
		i := small[len(small)-1]
		small = small[:len(small)-1]
		j := large[len(large)-1]
		entry[i] = rest[i]<<b | uint64(j)
		rest[j] -= share - rest[i]
		if rest[j] < share {
			large = large[:len(large)-1]
			small = append(small, j)
		}
	}
	for _, i := range large { // full cells: any alias will do
		entry[i] = (share-1)<<b | uint64(i)
	}
}

// wide is a whole number of 128 bits.
type wide struct{ hi, lo uint64 }

func (x wide) add(y wide) wide {
	lo, c := bits.Add64(x.lo, y.lo, 0)
	hi, _ := bits.Add64(x.hi, y.hi, c)
	return wide{hi, lo}
}

// mulDiv is floor(x a / b) for a product below 2^128 and b > 0.
func (x wide) mulDiv(a, b uint64) wide {
	h, lo := bits.Mul64(x.lo, a)
	hi := x.hi*a + h
	q1, r := hi/b, hi%b
	q0, _ := bits.Div64(r, lo, b)
	return wide{q1, q0}
}

// unitWeights turns relative weights into whole multiples of 2^-64 that add up
// to 1; the sum of the relative weights is 2^64 or more. The rounding, below 2^-62 of each weight plus 2^-64, goes to the cell
// `mode`.
func unitWeights(rel []wide, mode int) []uint64 {
	var sum wide
	for _, w := range rel {
		sum = sum.add(w)
	}
	// the leading 64 bits of the sum, rounded up, so that no quotient is too big
	shift := uint(64 - bits.LeadingZeros64(sum.hi))
	div := sum.hi<<(64-shift) | sum.lo>>shift
	div++
	out := make([]uint64, len(rel))
	left := uint64(0)
	for i, w := range rel {
		hi, lo := w.lo>>shift|w.hi<<(64-shift), w.lo<<(64-shift)
		q, _ := bits.Div64(hi, lo, div)
		out[i] = q
		left -= q
	}
	out[mode] += left
	return out
}
