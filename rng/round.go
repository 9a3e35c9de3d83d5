package rng

import (
	"fmt"
	"math"
)

// Round rounds x at random to the whole number below or above, with the mean x.
// A whole x is returned as it is and uses no word. It panics on NaN and where
// |x| > 2^53.
func Round(s *Stream, x float64) int64 {
	if !(x >= -0x1p53 && x <= 0x1p53) {
		panic(fmt.Sprintf("rng: %v can't be rounded to a whole number of at most 2^53", x))
	}
	low := math.Floor(x)
	part := x - low // exact, except that a tiny negative x gives 1
	if part == 0 {
		return int64(low)
	}
	if part < 1 && s.pcg.Uint64() >= uint64(float64(part*0x1p64)) {
		return int64(low)
	}
	return int64(low) + 1
}
