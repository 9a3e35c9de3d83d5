package pva

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// Bins follow each other without gap or overlap to 2^62, are one value wide
// below 4,096 and at most 0.05 % wide above.
func TestBinsAreContiguousAndNarrow(t *testing.T) {
	last := BinOf(1 << 62)
	if BinLow(0) != 0 {
		t.Fatalf("the first bin starts at %d", BinLow(0))
	}
	for bin := range last + 1 {
		low, next := BinLow(bin), BinLow(bin+1)
		if next <= low {
			t.Fatalf("bin %d runs from %d to %d", bin, low, next)
		}
		if BinOf(low) != bin || BinOf(next-1) != bin {
			t.Fatalf("bin %d runs from %d to %d, whose bins are %d and %d", bin, low, next-1, BinOf(low), BinOf(next-1))
		}
		if width := next - low; (low < 4096 && width != 1) || float64(width) > 0.0005*float64(max(low, 2000)) {
			t.Fatalf("bin %d from %d is %d wide", bin, low, width)
		}
	}
	if top := int64(math.MaxInt64); BinLow(BinOf(top)+1)-1 != top {
		t.Errorf("the last bin ends at %d, not at the largest number", BinLow(BinOf(top)+1)-1)
	}
}

func TestBinsKeepOrder(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for range 100000 {
		a, b := r.Int64()>>r.IntN(63), r.Int64()>>r.IntN(63)
		if a > b {
			a, b = b, a
		}
		if BinOf(a) > BinOf(b) {
			t.Fatalf("%d is in bin %d, %d in bin %d", a, BinOf(a), b, BinOf(b))
		}
		if bin := BinOf(a); BinLow(bin) > a || BinLow(bin+1)-1 < a {
			t.Fatalf("%d is not in its bin %d", a, bin)
		}
	}
}

func TestNegativeValuesPanic(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("a negative value was counted")
		}
	}()
	new(Histogram).Add(-1)
}

// Ranks and counts are compared with the sorted values themselves.
func TestHistogramAgainstSortedValues(t *testing.T) {
	for i, most := range []int64{1, 50, 4096, 5000, 1e6, 1e9, 1 << 62} {
		r := rand.New(rand.NewPCG(3, uint64(i)))
		var h Histogram
		var values []int64
		for range 700 {
			v := r.Int64N(most) >> r.IntN(8)
			values = append(values, v)
			h.Add(v)
		}
		slices.Sort(values)
		if h.Total() != 700 {
			t.Fatalf("to %d: total is %d", most, h.Total())
		}
		for k := int64(1); k <= 700; k++ {
			got, want := h.Rank(k), values[k-1]
			if BinOf(got) != BinOf(want) || (want < 4096 && got != want) {
				t.Fatalf("to %d: rank %d is %d, want %d", most, k, got, want)
			}
			// Rank and AtOrBelow are each other's inverse.
			low := BinLow(BinOf(got))
			if h.AtOrBelow(got) < k || h.AtOrBelow(low-1) >= k {
				t.Fatalf("to %d: %d at or below rank %d, %d below its bin", most, h.AtOrBelow(got), k, h.AtOrBelow(low-1))
			}
		}
		for range 300 {
			v := r.Int64N(most)
			end := BinLow(BinOf(v)+1) - 1 // the whole bin is counted
			want, _ := slices.BinarySearch(values, end+1)
			if got := h.AtOrBelow(v); got != int64(want) {
				t.Fatalf("to %d: %d at or below %d, want %d", most, got, v, want)
			}
		}
		if h.Rank(701) != -1 {
			t.Errorf("to %d: a rank beyond the total is %d", most, h.Rank(701))
		}
		if h.AtOrBelow(-1) != 0 || h.AtOrBelow(math.MaxInt64) != 700 {
			t.Errorf("to %d: %d below 0, %d at or below the largest number", most, h.AtOrBelow(-1), h.AtOrBelow(math.MaxInt64))
		}
	}
	if (&Histogram{}).Rank(1) != -1 {
		t.Error("an empty histogram has a rank")
	}
}

type binCount struct {
	bin   int
	count int64
}

func contents(h *Histogram) (all []binCount) {
	h.Each(func(bin int, count int64) { all = append(all, binCount{bin, count}) })
	return all
}

// However values are split and in whatever order the parts are joined, the
// counts are those of all values added one by one.
func TestHistogramMergeHasNoOrder(t *testing.T) {
	for seed := range uint64(40) {
		r := rand.New(rand.NewPCG(seed, 4))
		var whole Histogram
		parts := make([]Histogram, 5)
		for range 400 {
			v := r.Int64() >> r.IntN(63)
			whole.Add(v)
			parts[r.IntN(len(parts))].Add(v)
		}
		var joined Histogram
		for _, i := range r.Perm(len(parts)) {
			joined.Merge(&parts[i])
		}
		if !slices.Equal(contents(&joined), contents(&whole)) || joined.Total() != whole.Total() {
			t.Fatalf("seed %d: joined parts differ from the whole", seed)
		}
		if !slices.IsSortedFunc(contents(&whole), func(a, b binCount) int { return a.bin - b.bin }) {
			t.Fatalf("seed %d: bins come out of order", seed)
		}
	}
}

func TestAddBinCountsMany(t *testing.T) {
	var h Histogram
	h.AddBin(7, 4_000_000_000)
	h.AddBin(7, 1)
	if h.Total() != 4_000_000_001 || h.AtOrBelow(7) != 4_000_000_001 || h.AtOrBelow(6) != 0 {
		t.Errorf("total %d, %d at or below 7, %d below", h.Total(), h.AtOrBelow(7), h.AtOrBelow(6))
	}
}
