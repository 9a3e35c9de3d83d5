package rng

import (
	"fmt"
	"testing"
)

var (
	binomialTrials  = []int64{1, 2, 5, 7, 32, 33, 64, 65, 128, 129, 400, 447, 448, 590, 2000, 100000, 1 << 33}
	binomialChances = []float64{1e-9, 1e-3, 0.02, 0.03, 0.1, 0.3, 0.5, 0.9, 1 - 1e-9}
)

func binomialCells() int { return len(binomialTrials) * len(binomialChances) }

// Null: each cell has the binomial law. The smallest bias of the mean that is
// caught is in the log of each cell: for n = 400 and p = 0.3 it is 0.0012 of the
// mean, for n = 2^33 and p = 0.3 a part in 4 million.
func TestBinomialHasItsLaw(t *testing.T) {
	n := sampleSize(250000)
	for i, trials := range binomialTrials {
		for j, p := range binomialChances {
			name := fmt.Sprintf("n=%d,p=%v", trials, p)
			t.Run(name, func(t *testing.T) {
				s := NewStream(21, uint64(100*i+j), Demography)
				shape, rest, mean := fit(t, binomialLaw(trials, p), n, func() int64 { return Binomial(s, trials, p) })
				judge(t, "binomial", name+" shape", shape)
				judge(t, "binomial", name+" remainder", rest)
				judge(t, "binomial", name+" mean", mean)
			})
		}
	}
}
