package rng

import "math/bits"

// halfTables[j] draws from Binomial(64j, 1/2), j = 1 to 7, less halfFrom[j]; what
// lies beyond its 256 values has a chance below 2^-64.
var halfTables, halfFrom = buildHalfTables()

func buildHalfTables() (*[8]alias256, [8]int64) {
	t := new([8]alias256)
	var from [8]int64
	for j := 1; j < len(t); j++ {
		n := 64 * j
		mode := n / 2
		low := max(0, mode-128) // the value of cell 0
		from[j] = int64(low)
		var rel [256]wide
		rel[mode-low] = wide{1 << 40, 0}
		for k := mode; k > low; k-- { // C(n, k-1) = C(n, k) k / (n-k+1)
			rel[k-1-low] = rel[k-low].mulDiv(uint64(k), uint64(n-k+1))
		}
		for k := mode + 1; k <= n && k-low < len(rel); k++ {
			if mirror := n - k - low; mirror >= 0 {
				rel[k-low] = rel[mirror]
			}
		}
		fillAlias(t[j][:], unitWeights(rel[:], mode-low))
	}
	return t, from
}

// halves draws from Binomial(k, 1/2) for k from 0 to 511: by a table for the full
// 64s of trials, by counting the bits of a word for what is left.
func halves(s *Stream, k int64) int64 {
	h := int64(0)
	if j := k >> 6; j > 0 {
		h += halfFrom[j&7] + halfTables[j&7].draw(s.pcg.Uint64())
		k &= 63
	}
	if k > 0 {
		h += int64(bits.OnesCount64(s.pcg.Uint64() << uint(64-k)))
	}
	return h
}
