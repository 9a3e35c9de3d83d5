package rng

import (
	"encoding/binary"
	"math/bits"

	// Its authors have marked this package deprecated in favour of
	// math/rand/v2. This file, and no other, uses it, for its PCG-XSL-RR:
	// a published algorithm with published outputs (O'Neill 2014), fast, and
	// frozen. The generator of math/rand/v2 is another one (PCG-DXSM), slower
	// here; should the package disappear, the thirty lines of its step are in
	// the test of this file.
	"golang.org/x/exp/rand"
)

// Purpose says what the numbers of a stream are for. Purposes have streams of
// their own, so that a case that draws more of one kind leaves the others as
// they are. The values are part of the result of a run: append, never reorder.
type Purpose uint8

// The purposes.
const (
	Start        Purpose = iota + 1 // starting abundance
	Weather                         // good and bad years
	Catastrophes                    // whether they strike
	Demography                      // births and deaths of single animals
	Survey                          // errors of abundance estimates
	Taking                          // errors and rounding of takes
	Stocking                        // animals released
	Inputs                          // outer draws of uncertain inputs
	Resample                        // draws behind the intervals of fitted risks
	Kills                           // how many a catastrophe kills
)

// Stream is a source of random words: PCG-XSL-RR 128/64 (O'Neill 2014,
// HMC-CS-2014-0905), 2^128 long. The zero Stream is not seeded; call Seed
// before use. It satisfies the Source interface of math/rand/v2. A Stream is
// for one goroutine, and copying it copies its place.
type Stream struct {
	pcg rand.PCGSource
}

// NewStream returns a new stream with the given key.
func NewStream(seed, replicate uint64, p Purpose) *Stream {
	s := new(Stream)
	s.Seed(seed, replicate, p)
	return s
}

// Seed puts the stream at the start of the numbers of (seed, replicate,
// purpose). It does not allocate.
//
// The 128 bits of (seed, replicate) go through Philox 2x64-10, keyed by the
// purpose, into the 128 bits of generator state. Philox is a bijection for each
// key, so two keys that differ in seed or replicate never share a state; those
// that differ in purpose do so with the chance of 2^-128. The generator's
// additive constant is fixed in its package, so all streams lie on one cycle of
// 2^128 words at scattered places. Two tempting ways were rejected: adding the
// parts of the key (seed 1, replicate 2 would be seed 2, replicate 1), and using
// them as raw state (neighbours then agree in their low bits: PCG does not mix
// its state before the first word).
func (s *Stream) Seed(seed, replicate uint64, p Purpose) {
	hi, lo := philox(seed, replicate, uint64(p))
	var state [16]byte
	binary.BigEndian.PutUint64(state[:8], hi)
	binary.BigEndian.PutUint64(state[8:], lo)
	if err := s.pcg.UnmarshalBinary(state[:]); err != nil {
		panic("rng: the generator refused a state of 16 bytes: " + err.Error())
	}
}

// philox is Philox 2x64 with ten rounds (Salmon, Moraes, Dror & Shaw 2011,
// SC '11, "Parallel random numbers: as easy as 1, 2, 3").
func philox(c0, c1, key uint64) (uint64, uint64) {
	for range 10 {
		hi, lo := bits.Mul64(c0, 0xd2b74407b1ce6e93)
		c0, c1 = hi^key^c1, lo
		key += 0x9e3779b97f4a7c15
	}
	return c0, c1
}

// Uint64 returns the next word, uniform on all 2^64 values.
func (s *Stream) Uint64() uint64 { return s.pcg.Uint64() }

// Float64 returns a uniform number from the open interval (0, 1): an odd
// multiple of 2^-53, from 2^-53 to 1 - 2^-53, so that its logarithm and that
// of its complement are finite. It uses one word.
func (s *Stream) Float64() float64 {
	return (float64(int64(s.pcg.Uint64()>>12)) + 0.5) * 0x1p-52
}

// fine returns a uniform number from (0, 1) as a double with all its bits: the
// word already drawn is the leading part and a second one follows it. Small
// values keep their relative accuracy, so that an event of chance 1e-15 has
// that chance.
func (s *Stream) fine(word uint64) float64 {
	low := float64(int64(s.pcg.Uint64()>>12)) + 0.5
	return float64(float64(word)*0x1p-64) + float64(low*0x1p-116)
}
