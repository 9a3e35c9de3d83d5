package rng

import (
	"fmt"
	"math"
	"sort"
	"testing"
)

// Chances on and off the grid of 12 bits, and far below its step.
var eventChances = []float64{0, 1e-9, 1e-5, 0x1p-12, 0.3, 0.5, 0.5 + 0x1p-13, 0.99999, 1}

// Null: waiting times are exponential whether the event happened or not, and it
// happened with its chance: chi-square over the places within layers and beyond
// them, for both, and the exact law of the count. With four million draws at 0.3
// a chance off by a three hundredth of itself is caught.
func TestEvent(t *testing.T) {
	n := sampleSize(4000000)
	cuts := append(even(0, 3, 60), 4, 5, 6, exponentialFrom, exponentialFrom+1)
	for i, p := range eventChances {
		s := NewStream(31, uint64(i), Demography)
		count := make([]int, 2*(len(cuts)+1))
		happened := 0
		for range n {
			w, yes := Event(s, p)
			at := 2 * sort.SearchFloat64s(cuts, w)
			if yes {
				at++
				happened++
			}
			count[at]++
		}
		name := fmt.Sprintf("chance %v", p)
		judge(t, "event", name+" chance", exactBinomialP(happened, n, p))
		// What is seldom is put together: a bin of its own would break the law of chi-square.
		var seen []int
		var expected []float64
		restSeen, rest := 0, 0.0
		done := 0.0
		for k := 0; k <= len(cuts); k++ {
			next := 1.0
			if k < len(cuts) {
				next = -math.Expm1(-cuts[k])
			}
			for side, share := range []float64{1 - p, p} {
				if e := (next - done) * share * float64(n); e >= 25 {
					seen, expected = append(seen, count[2*k+side]), append(expected, e)
				} else {
					restSeen += count[2*k+side]
					rest += e
				}
			}
			done = next
		}
		if rest >= 25 {
			seen, expected = append(seen, restSeen), append(expected, rest)
		}
		judge(t, "event", name+" joint", chiSquare(seen, expected))
	}
}

// TestEventWaitsAsExponential: of the same words Event makes the waiting time
// that Exponential makes, to the width of its coarser grid.
func TestEventWaitsAsExponential(t *testing.T) {
	s := NewStream(32, 0, Demography)
	same := 0
	for range 100000 {
		one, other := *s, *s
		w, _ := Event(&one, 0.5)
		if x := Exponential(&other); math.Abs(w-x) <= exponentialTable.edge[0]*0x1p-44 {
			same++
		}
		s.Uint64()
	}
	// In 1.1 % of draws a second look is needed, and what follows may part.
	if same < 99000 {
		t.Errorf("%d of 100000 waiting times agree", same)
	}
}
