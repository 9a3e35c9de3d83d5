package pva

import "math/bits"

// Sum is a signed 128-bit integer that only adds, so that the order in which
// replicates are added cannot change a total.
type Sum struct {
	Hi int64
	Lo uint64
}

// Add adds one signed number.
func (s *Sum) Add(v int64) {
	var carry uint64
	s.Lo, carry = bits.Add64(s.Lo, uint64(v), 0)
	s.Hi += v>>63 + int64(carry)
}

// Merge adds another sum.
func (s *Sum) Merge(o Sum) {
	var carry uint64
	s.Lo, carry = bits.Add64(s.Lo, o.Lo, 0)
	s.Hi += o.Hi + int64(carry)
}

// Float is the sum as the nearest double (to within rounding of its two halves).
func (s Sum) Float() float64 {
	if s.Hi < 0 {
		lo, borrow := bits.Sub64(0, s.Lo, 0)
		hi := -s.Hi - int64(borrow)
		return -(float64(hi)*(1<<64) + float64(lo))
	}
	return float64(s.Hi)*(1<<64) + float64(s.Lo)
}

// FixedPoint is the scale of sums of logarithms: a step of 2^-32.
const FixedPoint = 1 << 32
