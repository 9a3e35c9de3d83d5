package rng

import "math/bits"

// halfTable draws from Binomial(256, 1/2), less what lies beyond 0 and 255
// (2^-256 each).
var halfTable = buildHalfTable()

func buildHalfTable() *alias256 {
	var rel [256]wide
	rel[128] = wide{1 << 40, 0}
	for k := 128; k > 0; k-- { // C(256, k-1) = C(256, k) k / (257-k)
		rel[k-1] = rel[k].mulDiv(uint64(k), uint64(257-k))
	}
	for k := 129; k < 256; k++ {
		rel[k] = rel[256-k]
	}
	t := new(alias256)
	fillAlias(t[:], unitWeights(rel[:], 128))
	return t
}

// halves draws from Binomial(k, 1/2) for k >= 0: by the table for each full
// 256 trials, by counting the bits of words for what is left.
func halves(s *Stream, k int64) int64 {
	h := int64(0)
	for ; k >= 256; k -= 256 {
		h += halfTable.draw(s.pcg.Uint64())
	}
	for ; k >= 64; k -= 64 {
		h += int64(bits.OnesCount64(s.pcg.Uint64()))
	}
	if k > 0 {
		h += int64(bits.OnesCount64(s.pcg.Uint64() << uint(64-k)))
	}
	return h
}
