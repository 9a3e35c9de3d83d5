package rng

import (
	"fmt"
	"testing"
)

var negativeCells = []struct{ mean, size float64 }{
	{1e-9, 1}, {0.02, 0.5}, {1.5, 0.5}, {7.5, 1e-3}, {7.5, 1}, {0.9, 2.5}, {150, 0.05},
	{150, 40}, {150, 1e12}, {2000, 3.3}, {1e5, 0.7}, {1e5, 1e6}, {1e9, 1e9},
}

// Null: each cell has the negative binomial law. At a size below 1/2 the mean is
// far from normal and not judged by z; runs of counts see its bias. Elsewhere
// the log of each cell says the smallest bias that is caught: at mean 2000 and
// size 3.3 it is 0.5 %.
func TestNegativeBinomialHasItsLaw(t *testing.T) {
	n := sampleSize(250000)
	for i, c := range negativeCells {
		name := fmt.Sprintf("mean=%v,size=%v", c.mean, c.size)
		t.Run(name, func(t *testing.T) {
			s := NewStream(23, uint64(i), Demography)
			shape, rest, mean := fit(t, negativeLaw(c.mean, c.size), n, func() int64 { return NegativeBinomial(s, c.mean, c.size) })
			judge(t, "negative", name+" shape", shape)
			judge(t, "negative", name+" remainder", rest)
			if c.size >= 0.5 {
				judge(t, "negative", name+" mean", mean)
			}
		})
	}
}

// Both sides of the crossings from the chain of binomials to gamma and Poisson.
var geometricsCells = []struct {
	k    int64
	beta float64
}{
	{1, 0.5}, {1, 0.99}, {7, 1e-9}, {7, 0.3}, {50, 0.02}, {50, 0.51}, {200, 0.05}, {590, 0.3}, {800, 0.5},
	{4096, 0.04}, {4096, 0.06}, {100000, 0.9}, {1 << 33, 0.1},
}

// Null: k geometrics add up to the negative binomial of size k and mean
// k beta/(1-beta). The log of each cell says the smallest bias of the mean that
// is caught: 1.3 % for one of beta 1/2, 0.027 % for 4096 of 0.06.
func TestBirthGeometricsHasItsLaw(t *testing.T) {
	n := sampleSize(500000)
	for i, c := range geometricsCells {
		name := fmt.Sprintf("k=%v,beta=%v", c.k, c.beta)
		t.Run(name, func(t *testing.T) {
			s := NewStream(24, uint64(i), Demography)
			k := float64(c.k)
			shape, rest, mean := fit(t, negativeLaw(k*c.beta/(1-c.beta), k), n, func() int64 { return BirthGeometrics(s, c.k, c.beta) })
			judge(t, "geometrics", name+" shape", shape)
			judge(t, "geometrics", name+" remainder", rest)
			judge(t, "geometrics", name+" mean", mean)
		})
	}
}
