package rng

import (
	"fmt"
	"testing"
)

// Either side of every part: 1/16, 8, 128, and the crossing to rejection.
var poissonMeans = []float64{
	1e-9, 0.02, 1.0 / 16, 0.9, 7.5, 8, 8.03, 127.99, 128, 150, 1023.9, 1024, 2000, 1e5, 1e9,
}

// Null: each cell has the Poisson law; the smallest bias of the mean that is
// caught is in the log of each cell: 0.0014 of a mean of 150, 0.54e-6 of 1e9.
func TestPoissonHasItsLaw(t *testing.T) {
	n := sampleSize(250000)
	for i, m := range poissonMeans {
		name := fmt.Sprintf("mean=%v", m)
		t.Run(name, func(t *testing.T) {
			s := NewStream(22, uint64(i), Demography)
			shape, rest, mean := fit(t, poissonLaw(m), n, func() int64 { return Poisson(s, m) })
			judge(t, "poisson", name+" shape", shape)
			judge(t, "poisson", name+" remainder", rest)
			judge(t, "poisson", name+" mean", mean)
		})
	}
}
