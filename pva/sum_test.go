package pva

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
)

// big128 is a sum as a big integer.
func big128(s Sum) *big.Int {
	v := new(big.Int).Lsh(big.NewInt(s.Hi), 64)
	return v.Add(v, new(big.Int).SetUint64(s.Lo))
}

// Sums are compared with arbitrary long integers, over numbers of either sign
// and every size, well past 64 bits.
func TestSumAgainstLongIntegers(t *testing.T) {
	for seed := range uint64(50) {
		r := rand.New(rand.NewPCG(seed, 5))
		var s Sum
		want := new(big.Int)
		for range 2000 {
			v := int64(r.Uint64()) >> r.IntN(64)
			switch r.IntN(20) {
			case 0:
				v = math.MaxInt64
			case 1:
				v = math.MinInt64
			case 2:
				v = -1
			}
			s.Add(v)
			want.Add(want, big.NewInt(v))
			if big128(s).Cmp(want) != 0 {
				t.Fatalf("seed %d: the sum is %v, want %v", seed, big128(s), want)
			}
		}
		exact, _ := new(big.Float).SetInt(want).Float64()
		if got := s.Float(); math.Abs(got-exact) > math.Abs(exact)*0x1p-52 {
			t.Errorf("seed %d: the nearest double is %v, want %v", seed, got, exact)
		}
	}
}

func TestSumOfHugeNumbers(t *testing.T) {
	var up, down Sum
	for range 1000 {
		up.Add(math.MaxInt64)
		down.Add(math.MinInt64)
	}
	if got, want := up.Float(), 1000*0x1p63; math.Abs(got-want) > want*0x1p-52 {
		t.Errorf("a thousand largest numbers are %v, want %v", got, want)
	}
	if got, want := down.Float(), -1000*0x1p63; got != want {
		t.Errorf("a thousand smallest numbers are %v, want %v", got, want)
	}
	up.Merge(down)
	if up.Float() != -1000 {
		t.Errorf("together they are %v, want -1000", up.Float())
	}
	if (Sum{}).Float() != 0 {
		t.Error("an empty sum is not 0")
	}
}

func TestSumMergeHasNoOrder(t *testing.T) {
	for seed := range uint64(50) {
		r := rand.New(rand.NewPCG(seed, 6))
		var whole Sum
		parts := make([]Sum, 7)
		for range 500 {
			v := int64(r.Uint64()) >> r.IntN(8)
			whole.Add(v)
			parts[r.IntN(len(parts))].Add(v)
		}
		var joined Sum
		for _, i := range r.Perm(len(parts)) {
			joined.Merge(parts[i])
		}
		if joined != whole {
			t.Fatalf("seed %d: joined parts are %v, the whole %v", seed, joined, whole)
		}
	}
}
